"""Damped Newton on small systems whose roots are known."""

import numpy as np
import pytest

from porkgrid.handoff.newton import Linear, solve


def sizes(value):
    return tuple(float(number) for number in np.abs(value))


def circle_and_line(x):
    """x² + y² = 2 and x = y: a root at (1, 1)."""
    a, b = x
    return Linear(np.array([a * a + b * b - 2.0, a - b]), np.array([[2.0 * a, 2.0 * b], [1.0, -1.0]]))


def steep(x):
    """arctan has its root at 0; undamped, Newton's method flees from starts beyond 1.39."""
    return Linear(np.arctan(x), np.diag(1.0 / (1.0 + x * x)))


def test_it_finds_the_root_in_few_steps_and_tells_the_way():
    solution = solve(circle_and_line, sizes, np.array([3.0, 0.5]), (1e-6, 1e-6), 10)
    assert solution.converged
    np.testing.assert_allclose(solution.x, [1.0, 1.0], rtol=0.0, atol=1e-12)
    first, last = solution.history[0], solution.history[-1]
    assert first.misses == (3.0**2 + 0.5**2 - 2.0, 2.5)
    assert first.damping == 1.0
    assert max(last.misses) <= 1e-6
    assert last.damping == 0.0
    assert len(solution.history) <= 7


def test_after_the_tolerance_one_step_more_is_taken():
    """From 2e-4 of the root, which the tolerance is content with, Newton's next step reaches 1e-8."""
    solution = solve(circle_and_line, sizes, np.array([1.0002, 1.0002]), (1e-2, 1e-2), 10)
    assert len(solution.history) == 1
    assert np.abs(solution.x - 1.0).max() <= 1e-7


@pytest.mark.parametrize("start", [0.5, 3.0, 30.0])
def test_steps_are_shortened_where_whole_ones_lead_away(start):
    solution = solve(steep, sizes, np.array([start]), (1e-9,), 40)
    assert solution.converged
    assert abs(solution.x[0]) <= 1e-9
    assert (min(step.damping for step in solution.history[:-1]) < 1.0) == (start > 1.0)


def test_equations_without_a_root_end_with_what_was_reached():
    solution = solve(lambda x: Linear(x * x + 1.0, np.diag(2.0 * x)), sizes, np.array([2.0]), (1e-9,), 12)
    assert not solution.converged
    assert solution.history[-1].misses[0] >= 1.0
    assert "converged" in solution.ended or "no step" in solution.ended


def test_a_start_that_is_not_defined_is_said_to_be_so():
    solution = solve(lambda x: None, sizes, np.array([1.0]), (1e-9,), 5)
    assert (solution.converged, solution.history) == (False, ())
    assert "first guess" in solution.ended


def test_a_step_into_where_nothing_is_defined_is_shortened():
    """ln has its root at 1; a whole step from 4 leads to −1.5."""

    def logarithm(x):
        return Linear(np.log(x), np.diag(1.0 / x)) if x[0] > 0.0 else None

    solution = solve(logarithm, sizes, np.array([4.0]), (1e-10,), 20)
    assert solution.converged
    assert solution.history[0].damping < 1.0
    assert solution.x[0] == pytest.approx(1.0, abs=1e-10)

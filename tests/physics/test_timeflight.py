"""The time equation: its shape function, its starting values and its steps, against mpmath at 80 digits."""

import numpy as np
import pytest
from mpmath import mp, mpf

from porkgrid.physics.timeflight import (
    LEAST_P_ROW,
    SETTLED,
    U_MAX_WIDE,
    first_step_row,
    last_step_row,
    shape_function,
    start_row,
)

EPS = float(np.finfo(float).eps)


def exact_shape(q):
    """F(u) at u = q − 1 from its definition."""
    u = mpf(q) - 1
    if u == 1:
        return mpf(2) / 3
    w = 1 - u * u
    arc = mp.acos(u) / mp.sqrt(w) if u < 1 else mp.acosh(u) / mp.sqrt(-w)
    return (arc - u) / w


def exact_time(sigma, delta, q):
    """Scaled flight time from its definition, p from σ and δ as the code has it."""
    sigma, q = mpf(sigma), mpf(q)
    p = (1 + sigma if sigma > 0 else mpf(delta)) - sigma * q
    return mp.sqrt(p) * (sigma + p * exact_shape(q))


@pytest.fixture(autouse=True)
def many_digits():
    with mp.workdps(80):  # near the parabola the definition of F loses half of them
        yield


def relative_errors(function, points):
    return [abs(float(function(x) / exact_shape(x) - 1)) for x in points]


def test_the_shape_function_keeps_its_digits_from_the_longest_ellipse_to_the_fastest_hyperbola():
    rng = np.random.default_rng(1)
    near_parabola = 2.0 + rng.uniform(-1e-3, 1e-3, 200)
    edges = [2.0, np.nextafter(2.0, 3.0), 1.0, 1.0 + U_MAX_WIDE, 1.001 * (1.0 + U_MAX_WIDE)]
    points = [*10.0 ** rng.uniform(-14.0, 8.0, 1500), *near_parabola, *edges]
    assert max(relative_errors(shape_function, points)) < 8e-16


def test_the_rows_shape_function_keeps_its_digits_evenly_over_the_range_of_its_polynomial():
    """It takes what two half-angle steps leave: v = sqrt(q/2), then w = sqrt((1 + v)/2)."""
    widest = np.sqrt(0.5 + 0.5 * np.sqrt(0.5 * (1.0 + U_MAX_WIDE)))
    w = np.linspace(np.sqrt(0.5), widest, 2000)[1:-1]
    assert max(relative_errors(shape_function, 2.0 * (2.0 * w * w - 1.0) ** 2)) < 8e-16


def test_narrow_and_wide_rows_agree_where_both_reach(problems):
    sigma, delta, t = problems
    q = np.empty_like(t)
    start_row(sigma, delta, t, q)
    sigma, delta, t, q = (each[q < 16.0] for each in (sigma, delta, t, q))
    answers = []
    for wide in (False, True):
        stepped = q.copy()
        first_step_row(sigma, delta, t, stepped, wide)
        answers.append(stepped)
    np.testing.assert_allclose(*answers, rtol=1e-13)


@pytest.fixture(scope="module")
def problems():
    """σ, δ and t of 2000 flights without revolutions, from a third of the parabolic time to thirty of it."""
    rng = np.random.default_rng(2)
    sigma = np.sqrt(rng.uniform(0.0, 1.0, 2000)) * rng.choice([-1.0, 1.0], 2000)
    delta = 1.0 - np.abs(sigma)
    parabolic = np.sqrt(1.0 - sigma) * (2.0 + sigma) / 3.0
    return sigma, delta, parabolic * 10.0 ** rng.uniform(-0.5, 1.5, 2000)


def last_step(problems, q):
    """q after the last step, the error of the time before it, and how many it calls unsettled."""
    sigma, delta, t = problems
    error, p, h = np.empty_like(t), np.empty_like(t), np.empty_like(t)
    unsettled = last_step_row(sigma, delta, t, q, error, p, h, True)
    after = above_less(h, sigma, delta)
    np.testing.assert_allclose(p, np.where(sigma > 0.0, 1.0 + sigma, delta) - sigma * after, atol=1e-12)
    return after, np.abs(error), unsettled


def above_less(h, sigma, delta):
    """q from h = σ − u = a − q."""
    return np.where(sigma > 0.0, 1.0 + sigma, delta) - h


def steps(problems):
    """q after the start and both steps, with the error of the time before each of them."""
    sigma, delta, t = problems
    q = np.empty_like(t)
    start_row(sigma, delta, t, q)
    _, first, _ = last_step(problems, q)
    first_step_row(sigma, delta, t, q, True)
    q, second, _ = last_step(problems, q)
    return q, first, second


def test_starting_values_are_within_a_few_per_cent_of_the_flight_time(problems):
    _, start, _ = steps(problems)
    assert np.median(start) < 0.01
    assert np.quantile(start, 0.99) < 0.06


def test_the_error_a_step_reports_is_that_of_the_time_before_it(problems):
    sigma, delta, t = (each[:100] for each in problems)
    q = np.empty_like(t)
    start_row(sigma, delta, t, q)
    times = [exact_time(*each) for each in zip(sigma, delta, q, strict=True)]
    exact = [float(mpf(wanted) / time - 1) for wanted, time in zip(t, times, strict=True)]
    _, reported, _ = last_step((sigma, delta, t), q)
    in_reach = q < 1.0 + U_MAX_WIDE
    assert np.mean(in_reach) > 0.9
    np.testing.assert_allclose(reported[in_reach], np.abs(exact)[in_reach], rtol=1e-9, atol=1e-12)


def test_the_last_step_counts_what_it_leaves_unsettled(problems):
    sigma, delta, t = problems
    q = np.empty_like(t)
    start_row(sigma, delta, t, q)
    first_step_row(sigma, delta, t, q, True)
    after, error, unsettled = last_step(problems, q)
    p = np.where(sigma > 0.0, 1.0 + sigma, delta) - sigma * after
    expected = ~((error < SETTLED) & (after < 1.0 + U_MAX_WIDE) & (p > LEAST_P_ROW))
    assert unsettled == np.count_nonzero(expected)


def test_steps_are_cubic(problems):
    """Where the first error is large enough for the second to show above rounding."""
    _, first, second = steps(problems)
    seen = (first > 1e-3) & (first < 0.03)
    assert np.count_nonzero(seen) > 500
    assert np.median(second[seen] / first[seen] ** 3) < 1.0
    assert np.quantile(second[seen] / first[seen] ** 3, 0.98) < 10.0


def test_what_counts_as_settled_has_the_right_flight_time(problems):
    sigma, delta, t = problems
    q, _, second = steps(problems)
    p = np.where(sigma > 0.0, 1.0 + sigma, delta) - sigma * q
    settled = (second < SETTLED) & (q < 1.0 + U_MAX_WIDE) & (p > LEAST_P_ROW)
    assert np.mean(settled) > 0.95
    for j in np.flatnonzero(settled)[np.argsort(-second[settled])[:500]]:  # those that were settled barely
        miss = abs(float(exact_time(sigma[j], delta[j], q[j]) / mpf(t[j]) - 1))
        # what subtraction makes small has the rounding of its terms: p = a − σq, and t/√p = σ + pF
        assert miss < 1e-14 + 4.0 * EPS * (1.0 / p[j] + np.sqrt(p[j]) / t[j])

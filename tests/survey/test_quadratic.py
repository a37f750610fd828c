"""The quadratic program, against its optimality conditions and against problems solved by hand."""

from __future__ import annotations

import numpy as np
import pytest

from porkgrid.survey.quadratic import least_quadratic


def test_without_limits_in_the_way_it_is_the_newton_step():
    bend = np.array([[2.0, 0.5], [0.5, 1.0]])
    slope = np.array([1.0, -2.0])
    step, multipliers = least_quadratic(slope, bend, np.eye(2), np.array([-50.0, -50.0]))
    assert step == pytest.approx(-np.linalg.solve(bend, slope))
    assert not multipliers.any()


def test_a_flat_cost_goes_to_the_corner():
    rows = np.array([[1.0, 0.0], [-1.0, 0.0], [0.0, 1.0], [0.0, -1.0], [-1.0, -1.0]])
    step, multipliers = least_quadratic(
        np.array([-1.0, -2.0]), np.zeros((2, 2)), rows, np.array([-1.0, -1.0, -1.0, -1.0, -1.5])
    )
    assert step == pytest.approx([0.5, 1.0], abs=1e-9)
    assert multipliers == pytest.approx([0.0, 0.0, 0.0, 1.0, 1.0], abs=1e-5)


def test_limits_that_cannot_all_be_kept_are_reported():
    rows = np.array([[1.0, 0.0], [-1.0, 0.0]])
    assert least_quadratic(np.ones(2), np.eye(2), rows, np.array([1.0, 1.0])) is None


@pytest.mark.parametrize("n", [2, 3, 6, 10])
def test_random_programs_meet_the_optimality_conditions(n):
    rng = np.random.default_rng(n)
    for _ in range(100):
        root = rng.normal(size=(n, n))
        bend = root @ root.T + 1e-3 * np.eye(n)
        slope = 10.0 ** rng.uniform(-3, 3) * rng.normal(size=n)
        rows = np.vstack([rng.normal(size=(n + 4, n)), np.eye(n), -np.eye(n)])
        least = np.r_[rng.uniform(-1.0, 0.0, n + 4), np.full(2 * n, -1.0)]  # zero keeps them all
        step, multipliers = least_quadratic(slope, bend, rows, least)
        scale = np.linalg.norm(slope)
        assert (rows @ step - least).min() > -1e-8
        assert multipliers.min() >= 0.0
        assert np.abs(slope + bend @ step - rows.T @ multipliers).max() < 1e-7 * (1.0 + scale)
        assert np.abs(multipliers * (rows @ step - least)).max() < 1e-6 * (1.0 + scale)

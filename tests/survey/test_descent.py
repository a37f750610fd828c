"""The local search on costs made up so that the answer is known."""

from __future__ import annotations

import numpy as np
import pytest

from porkgrid.survey.descent import Box, descend


def box(n: int, room: float = 10.0) -> Box:
    return Box(np.full(n, -room), np.full(n, room), np.ones(n), np.full(n, 1e-3))


def one_search(cost, slacks, burns, start, bounds=None):
    """Search with cost(x, burns), slacks(x) and signed burns(x) of points x (variables, p)."""
    flybys = len(burns(np.array(start)[:, None]))

    def evaluate(which, points, sides):
        values = []
        for x, side in zip(points, sides, strict=True):
            signed = np.array(burns(x)).reshape(flybys, x.shape[1]) * side[:, None]
            kept = np.array(slacks(x)).reshape(-1, x.shape[1])
            values.append(np.vstack([cost(x, signed)[None], kept, signed]))
        return np.array(values)

    (found,) = descend(evaluate, [np.array(start, dtype=float)], [bounds or box(len(start))], flybys)
    return found


def none(x):
    return []


def test_a_curved_valley_is_walked_to_its_lowest_point():
    found = one_search(
        lambda x, _: (1.0 - x[0]) ** 2 + 100.0 * (x[1] - x[0] ** 2) ** 2, none, none, [-1.2, 1.0]
    )
    assert found.settled
    assert found.point == pytest.approx([1.0, 1.0], abs=1e-3)


def test_a_kink_between_two_sides_is_an_optimum():
    found = one_search(
        lambda x, burn: 0.3 * (x[0] - 2.0) ** 2 + (x[1] - 1.0) ** 2 + 5.0 * burn[0],
        none,
        lambda x: [x[0] + 0.2 * x[1] ** 2],
        [1.3, -0.4],
    )
    assert found.settled
    x, y = found.point
    assert abs(x + 0.2 * y**2) < 1e-5
    along = np.roots([0.048, 0.0, 2.48, -2.0])  # where 0.3 (0.2 y² + 2)² + (y − 1)² is level
    assert y == pytest.approx(along[np.isreal(along)].real[0], abs=1e-5)


def test_a_kink_is_crossed_where_the_far_side_is_better():
    found = one_search(
        lambda x, burn: (x[0] + 2.0) ** 2 + x[1] ** 2 + 0.5 * burn[0], none, lambda x: [x[0]], [1.5, 1.0]
    )
    assert found.settled
    assert found.point == pytest.approx([-1.75, 0.0], abs=1e-5)


def test_several_kinks_close_at_once():
    found = one_search(
        lambda x, burn: 0.1 * np.sum((x - 3.0) ** 2, axis=0) + 3.0 * burn.sum(axis=0),
        none,
        lambda x: [x[0] - 0.5 * x[1], x[1] - x[2] ** 2],
        [1.0, 1.2, 0.8],
    )
    assert found.settled
    x, y, z = found.point
    assert abs(x - 0.5 * y) < 1e-5
    assert abs(y - z * z) < 1e-5


def test_limits_hold_at_the_optimum():
    found = one_search(
        lambda x, _: x[0] + x[1], lambda x: [4.0 - x[0] ** 2 - x[1] ** 2, x[1] + 0.5], none, [0.5, 0.5]
    )
    assert found.settled
    assert found.point == pytest.approx([-np.sqrt(3.75), -0.5], abs=1e-5)
    assert found.point[1] >= -0.5


def test_where_nothing_flies_is_not_entered():
    with np.errstate(invalid="ignore"):
        found = one_search(
            lambda x, _: np.where(x[0] > 1.0, x[0] + x[1] ** 2, np.nan), none, none, [1.7, 0.4]
        )
    assert found.point[0] > 1.0
    assert found.point[0] < 1.2


def test_a_valley_beyond_a_ridge_is_not_leapt_into():
    found = one_search(lambda x, _: np.cos(3.0 * x[0]) - 0.2 * x[0], none, none, [0.9])
    assert found.settled
    assert found.point[0] == pytest.approx((np.pi + np.arcsin(0.2 / 3.0)) / 3.0, abs=1e-3)


def test_the_bounds_hold():
    found = one_search(lambda x, _: x[0] ** 2 - x[1], none, none, [2.0, 0.0], box(2, 3.0))
    assert found.settled
    assert found.point == pytest.approx([0.0, 3.0], abs=1e-5)
    assert found.point[1] <= 3.0


def test_a_start_that_is_the_optimum_stays():
    found = one_search(lambda x, _: np.sum(x * x, axis=0), none, none, [0.0, 0.0])
    assert found.settled
    assert not found.point.any()

"""Differences on a stencil, against functions whose derivatives are known."""

from __future__ import annotations

import numpy as np
import pytest

from porkgrid.survey.stencil import derivatives, stencil


@pytest.mark.parametrize("n", [1, 2, 5])
def test_slopes_and_curvatures_of_a_quadratic_are_exact(n):
    rng = np.random.default_rng(n)
    bend = rng.normal(size=(n, n))
    bend = bend + bend.T
    slope = rng.normal(size=n)
    points = stencil(n)
    assert points.shape == (n, 1 + n + n * n)
    values = 3.0 + slope @ points + 0.5 * np.einsum("ip,ij,jp->p", points, bend, points)
    slopes, curvatures = derivatives(np.stack([values, -2.0 * values]), n)
    assert slopes[0] == pytest.approx(slope, abs=1e-12)
    assert curvatures[0] == pytest.approx(bend, abs=1e-12)
    assert slopes[1] == pytest.approx(-2.0 * slope, abs=1e-12)
    assert curvatures[1] == pytest.approx(-2.0 * bend, abs=1e-12)


def test_a_slope_beside_what_is_no_number_is_one_sided():
    points = stencil(2)
    values = 5.0 * points[0] - 7.0 * points[1]
    values[(points[0] == 1.0) & (points[1] == 0.0)] = np.nan
    slopes, curvatures = derivatives(values[None], 2)
    assert slopes[0] == pytest.approx([5.0, -7.0])
    assert curvatures[0] == pytest.approx(np.zeros((2, 2)))


def test_where_nothing_is_a_number_the_derivatives_are_zero():
    slopes, curvatures = derivatives(np.full((1, 7), np.nan), 2)
    assert not slopes.any()
    assert not curvatures.any()

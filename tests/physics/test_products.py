"""Products that keep their digits where plain arithmetic loses them, against exact rationals."""

import math
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numba import njit

from porkgrid.physics.products import cross, difference_of_products, fma

# Far from overflow and underflow, where the bounds hold
FACTOR = st.floats(-1e8, 1e8).filter(lambda x: x == 0.0 or abs(x) > 1e-8)
NUDGE = st.floats(-1e-12, 1e-12)


@njit
def fused(a, b, c):
    return fma(a, b, c)


@pytest.fixture(scope="module", autouse=True)
def compiled():
    """Compile before hypothesis times the first example."""
    fused(1.0, 1.0, 1.0)
    cross(1.0, 0.0, 0.0, 0.0, 1.0, 0.0)
    difference_of_products(1.0, 1.0, 1.0, 1.0)


def within_two_ulps(found, exact):
    return abs(Fraction(found) - exact) <= 2 * Fraction(math.ulp(float(exact)))


@given(FACTOR, FACTOR, NUDGE, NUDGE)
def test_the_difference_of_nearly_equal_products_is_right_to_two_ulps(a, b, more, less):
    c, d = a * (1.0 + more), b * (1.0 + less)
    exact = Fraction(a) * Fraction(b) - Fraction(c) * Fraction(d)
    assert within_two_ulps(difference_of_products(a, b, c, d), exact)


@given(*[FACTOR] * 4)
def test_the_difference_of_any_products_is_right_to_two_ulps(a, b, c, d):
    exact = Fraction(a) * Fraction(b) - Fraction(c) * Fraction(d)
    assert within_two_ulps(difference_of_products(a, b, c, d), exact)


@given(FACTOR, FACTOR)
def test_a_fused_product_is_rounded_once(a, b):
    assert Fraction(fused(a, b, -(a * b))) == Fraction(a) * Fraction(b) - Fraction(a * b)


@given(st.tuples(*[FACTOR] * 3), FACTOR, st.tuples(*[NUDGE] * 3))
def test_every_component_of_the_cross_product_of_near_parallels_is_right_to_two_ulps(a, scale, nudges):
    b = [x * scale * 1e-8 * (1.0 + nudge) for x, nudge in zip(a, nudges, strict=True)]
    for axis, found in enumerate(cross(*a, *b)):
        i, j = (axis + 1) % 3, (axis + 2) % 3
        exact = Fraction(a[i]) * Fraction(b[j]) - Fraction(a[j]) * Fraction(b[i])
        assert within_two_ulps(found, exact)


def test_plain_arithmetic_would_not_do():
    a, b = 1.0 + 2.0**-30, 1.0 - 2.0**-30
    assert np.float64(a) * np.float64(b) - 1.0 == 0.0
    assert difference_of_products(a, b, 1.0, 1.0) == -(2.0**-60)

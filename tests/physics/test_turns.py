"""The kernels of the flyby's periapsis, against exact turns at 50 digits."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st
from mpmath import mp, mpf
from numba import njit

from porkgrid.physics import turns
from porkgrid.physics.timeflight import PLAIN

EPS = 2.0**-52
SPEED2 = st.floats(0.01, 400.0)  # km²/s²: v∞ from 0.1 to 20 km/s
WITHIN_TWO = st.floats(0.5, 2.0)
TURN = st.floats(1e-3, 3.13)


@njit(**PLAIN)
def step(a2, b2, per_sine, y):
    return turns.periapsis_step(a2, b2, per_sine, y)


@njit(**PLAIN)
def periapsis(a2, b2, cosine):
    return turns.periapsis(a2, b2, cosine)


@njit(**PLAIN)
def far(a2, b2, cosine):
    return turns.periapsis_far(a2, b2, cosine, turns.periapsis(a2, b2, cosine))


@njit(**PLAIN)
def burn_at(a2, b2, y):
    return turns.burn_at(a2, b2, y)


@pytest.fixture(scope="module", autouse=True)
def compiled():
    """Compile before hypothesis times the first example."""
    step(1.0, 1.0, 2.0, 1.0)
    periapsis(1.0, 1.0, 0.0)
    far(1.0, 1.0, 0.0)
    burn_at(1.0, 1.0, 1.0)


def exact_turn(a2, b2, y):
    return mp.asin(1 / (1 + mpf(a2) * y)) + mp.asin(1 / (1 + mpf(b2) * y))


@given(SPEED2, st.floats(1e-4, 1e4), TURN)
def test_the_far_form_finds_the_root_for_speeds_however_different(a2, ratio, turn):
    b2 = a2 * ratio
    y = far(a2, b2, math.cos(turn))
    with mp.workdps(50):
        assert float(exact_turn(a2, b2, y)) == pytest.approx(turn, rel=1e-8)


@given(SPEED2, WITHIN_TWO, TURN)
def test_the_one_root_lies_within_rounding_of_the_periapsis_for_speeds_within_a_factor_of_two(
    a2, ratio, turn
):
    """The turn falls with y, so a change of sign between two neighbours encloses the only root.

    A cosine summed with errors of 4 EPS holds 1 − |cos δ|, and y with it near 180°, to 8 EPS/sin²δ.
    """
    b2, cosine = a2 * ratio * ratio, math.cos(turn)
    y = periapsis(a2, b2, cosine)
    off = 1e-13 + 8 * EPS / math.sin(turn) ** 2
    with mp.workdps(50):
        wanted = mp.acos(mpf(cosine))
        assert exact_turn(a2, b2, mpf(y) * (1 + mpf(off))) < wanted
        assert exact_turn(a2, b2, mpf(y) * (1 - mpf(off))) > wanted


@given(SPEED2, st.floats(0.1, 3.0), st.floats(0.2, 5.0))
def test_one_step_from_afar_is_the_answer_for_equal_speeds(v2, turn, away):
    per_sine = 1.0 / math.sin(0.5 * turn)
    y = (per_sine - 1.0) / v2  # 1/sin(δ/2) = 1 + v∞² y
    assert step(v2, v2, per_sine, away * y) == pytest.approx(y, rel=1e-10)


@given(SPEED2, WITHIN_TWO, TURN, st.floats(1e-3, 0.5))
def test_a_sharper_turn_needs_a_lower_periapsis(a2, ratio, turn, sharper):
    b2 = a2 * ratio * ratio
    y_sharp = periapsis(a2, b2, math.cos(min(turn + sharper, math.pi - 1e-3)))
    y_mild = periapsis(a2, b2, math.cos(min(turn, math.pi - 2e-3)))
    assert 0.0 < y_sharp < y_mild


@given(SPEED2, WITHIN_TWO)
def test_no_turn_at_all_is_passed_farther_out_than_any_sphere_of_influence(a2, ratio):
    """10⁷ units of GM/v∞²: at Jupiter and 6 km/s that is 3.5·10¹³ km."""
    y = periapsis(a2, a2 * ratio * ratio, 1.0)
    assert math.isfinite(y)
    assert y * a2 > 1e7


@given(SPEED2, WITHIN_TWO)
def test_a_full_reversal_never_has_a_periapsis_above_zero(a2, ratio):
    assert not periapsis(a2, a2 * ratio * ratio, -1.0) > 0.0


@given(SPEED2, SPEED2, st.floats(1e-8, 1e4))
def test_the_burn_is_the_difference_of_the_speeds_at_periapsis(a2, b2, y):
    with mp.workdps(50):
        exact = abs(mp.sqrt(mpf(b2) + 2 / mpf(y)) - mp.sqrt(mpf(a2) + 2 / mpf(y)))
    assert burn_at(a2, b2, y) == pytest.approx(float(exact), rel=8 * EPS, abs=0.0)


@given(SPEED2, st.floats(1.01, 2.0), st.floats(1e-6, 1e3))
def test_the_burn_grows_with_the_periapsis_towards_the_difference_of_the_excess_speeds(a2, ratio, y):
    b2 = a2 * ratio * ratio
    apart = math.sqrt(b2) - math.sqrt(a2)
    assert 0.0 < burn_at(a2, b2, y) < burn_at(a2, b2, 2.0 * y) < apart
    assert burn_at(a2, b2, 1e12) == pytest.approx(apart, rel=1e-8)

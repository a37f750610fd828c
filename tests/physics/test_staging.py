"""Propellant of burns and of stages, against the rocket equation and the closed form of equal stages."""

import math
import warnings

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from porkgrid.physics.staging import (
    exhaust_speed_km_s,
    mass_ratio,
    propellant_after,
    stage_dv_limit,
    stage_propellant,
    stage_structure,
)

G0_M_S2 = 9.80665  # standard gravity, BIPM (The International System of Units, 3rd CGPM 1901)
MASS = st.floats(1.0, 1e6)
DV = st.floats(1e-9, 12.0)
ISP = st.floats(150.0, 5000.0)
FRACTION = st.floats(0.0, 0.9)


def test_a_second_of_specific_impulse_is_standard_gravity_of_exhaust_speed():
    assert exhaust_speed_km_s([1.0, 450.0]) == pytest.approx(
        [G0_M_S2 / 1e3, 450.0 * G0_M_S2 / 1e3], rel=1e-15
    )


@given(MASS, DV, ISP)
def test_before_a_burn_there_is_what_is_left_and_its_propellant(mass, dv, isp):
    propellant = float(propellant_after(mass, dv, isp))
    assert propellant > 0.0
    assert mass + propellant == pytest.approx(mass * float(mass_ratio(dv, isp)), rel=1e-12)


@given(MASS, DV, ISP)
def test_the_propellant_of_a_burn_gives_its_speed_back_by_the_rocket_equation(mass, dv, isp):
    propellant = float(propellant_after(mass, dv, isp))
    assert isp * G0_M_S2 / 1e3 * math.log1p(propellant / mass) == pytest.approx(dv, rel=1e-12)


@given(MASS, DV, DV, ISP)
def test_two_burns_in_a_row_take_what_one_of_their_sum_takes(mass, first, second, isp):
    last = propellant_after(mass, second, isp)
    both = last + propellant_after(mass + last, first, isp)
    assert float(both) == pytest.approx(float(propellant_after(mass, first + second, isp)), rel=1e-12)


@given(MASS, DV, ISP, FRACTION)
def test_a_stage_gives_its_speed_to_its_load_and_to_its_own_structure(above, dv, isp, fraction):
    limit = float(stage_dv_limit(isp, fraction)) if fraction else math.inf
    assume(dv < 0.999 * limit)
    propellant = float(stage_propellant(above, dv, isp, fraction))
    structure = float(stage_structure(propellant, fraction))
    assert structure == pytest.approx(fraction * (structure + propellant), rel=1e-12)
    flown = isp * G0_M_S2 / 1e3 * math.log1p(propellant / (above + structure))
    assert flown == pytest.approx(dv, rel=1e-9)


@given(MASS, ISP, st.floats(0.01, 0.9), st.floats(1e-9, 3.0))
def test_a_stage_asked_for_more_than_it_gives_itself_has_no_propellant_load(above, isp, fraction, excess):
    limit = float(stage_dv_limit(isp, fraction))
    assert float(mass_ratio(limit, isp)) == pytest.approx(1.0 / fraction, rel=1e-12)
    assert math.isnan(stage_propellant(above, limit * (1.0 + excess), isp, fraction))
    assert float(stage_propellant(above, limit * (1.0 - 1e-9), isp, fraction)) > 1e3 * above


@given(st.integers(1, 6), st.floats(0.005, 0.5), st.floats(0.02, 0.3), st.floats(200.0, 500.0), MASS)
def test_equal_stages_reach_the_speed_of_the_closed_form(stages, payload_fraction, fraction, isp, payload):
    """Restricted staging: each of n stages of like ε and payload ratio π^(1/n) gives
    Δv = c ln(1/(ε + (1 − ε) π^(1/n))) (Curtis, section 11.4).
    """
    share = payload_fraction ** (1.0 / stages)
    dv = -isp * G0_M_S2 / 1e3 * math.log(fraction + (1.0 - fraction) * share)
    above = payload
    for _ in range(stages):
        propellant = float(stage_propellant(above, dv, isp, fraction))
        above += propellant + float(stage_structure(propellant, fraction))
    assert payload / above == pytest.approx(payload_fraction, rel=1e-9)


def test_without_structure_a_stage_is_a_burn_and_has_no_limit():
    assert stage_propellant(500.0, 3.0, 320.0, 0.0) == propellant_after(500.0, 3.0, 320.0)
    assert math.isinf(stage_dv_limit(320.0, 0.0))


def test_burns_that_a_double_cannot_hold_and_unknown_burns_pass_without_a_warning():
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        assert math.isinf(propellant_after(1.0, 1e6, 100.0))
        assert math.isinf(mass_ratio(1e6, 100.0))
        masses = stage_propellant(1.0, [0.0, np.nan, 1e6], 300.0, [[0.0], [0.1]])
    np.testing.assert_array_equal(masses[:, 0], 0.0)
    assert np.isnan(masses[:, 1:]).all()


def test_loads_burns_and_stages_broadcast():
    above, dv = np.array([[1000.0], [2000.0]]), np.array([1.0, 2.0, 9.0])
    masses = stage_propellant(above, dv, 320.0, 0.1)
    assert masses.shape == (2, 3)
    assert masses[1, :2] == pytest.approx(2.0 * masses[0, :2], rel=1e-15)
    assert masses[0, 1] == stage_propellant(1000.0, 2.0, 320.0, 0.1)
    assert np.isnan(masses[:, 2]).all()  # 320 s and 10 % end at 7.2 km/s

"""Textbook examples of staging.

Values from Curtis, Orbital Mechanics for Engineering Students (memory), chapter 11; he takes standard gravity
as 9.81 m/s². Each is checked twice: his figure, and the same figure from the definitions alone.
"""

import math

import pytest
from scipy.optimize import brentq

from porkgrid.physics.constants import G0_KM_S2
from porkgrid.physics.staging import stage_propellant, stage_structure

HIS_G0_KM_S2 = 0.00981
PAYLOAD_KG = 10_000.0
PAYLOAD_FRACTION, STRUCTURAL_FRACTION, ISP_S = 0.05, 0.15, 350.0


def our_isp(isp_s):
    """Specific impulse that has the exhaust speed of his."""
    return isp_s * HIS_G0_KM_S2 / G0_KM_S2


def load(above_kg, dv_km_s, isp_s, fraction):
    propellant = float(stage_propellant(above_kg, dv_km_s, our_isp(isp_s), fraction))
    return propellant, float(stage_structure(propellant, fraction))


def dv_of_restricted(stages):
    """Δv of n like stages for the payload fraction, solved from the masses, not from his formula."""

    def payload_fraction(dv_km_s):
        mass = PAYLOAD_KG
        for _ in range(stages):
            mass += sum(load(mass, dv_km_s / stages, ISP_S, STRUCTURAL_FRACTION))
        return PAYLOAD_KG / mass

    reach = stages * ISP_S * HIS_G0_KM_S2 * math.log(1.0 / STRUCTURAL_FRACTION)
    return brentq(lambda dv: payload_fraction(dv) - PAYLOAD_FRACTION, 0.01, 0.999 * reach, xtol=1e-12)


@pytest.mark.parametrize(("stages", "burnout_km_s"), [(1, 5.657), (2, 7.407), (3, 7.928)])
def test_a_payload_of_a_twentieth_goes_faster_with_more_like_stages(stages, burnout_km_s):
    """Payload 10 t of 200 t, ε = 0.15, 350 s: 5.657 km/s in one stage, 7.407 in two, 7.928 in three."""
    assert dv_of_restricted(stages) == pytest.approx(burnout_km_s, abs=0.0006)


def test_the_single_stage_holds_161_5_t_of_propellant_in_28_5_t_of_structure():
    """Of 200 t 10 t are payload; 15 % of the other 190 t is structure."""
    propellant, structure = load(PAYLOAD_KG, dv_of_restricted(1), ISP_S, STRUCTURAL_FRACTION)
    assert structure == pytest.approx(28_500.0, rel=1e-9)
    assert propellant == pytest.approx(161_500.0, rel=1e-9)


def test_the_two_like_stages_weigh_as_in_the_example():
    """Empty 23 292 kg and 5208 kg; propellant from the definitions: ε and √0.05 of the mass above."""
    dv = dv_of_restricted(2) / 2.0
    upper, upper_structure = load(PAYLOAD_KG, dv, ISP_S, STRUCTURAL_FRACTION)
    lower, lower_structure = load(PAYLOAD_KG + upper + upper_structure, dv, ISP_S, STRUCTURAL_FRACTION)
    assert upper_structure == pytest.approx(5208.0, abs=0.5)
    assert lower_structure == pytest.approx(23_292.0, abs=0.5)
    stages_kg = 200_000.0 * (1.0 - math.sqrt(0.05)), PAYLOAD_KG * (1.0 / math.sqrt(0.05) - 1.0)
    assert (lower, upper) == pytest.approx([0.85 * mass for mass in stages_kg], rel=1e-9)


def test_the_lightest_three_unlike_stages_for_10_km_s_weigh_as_in_the_example():
    """Isp 400, 350, 300 s; ε 0.10, 0.15, 0.20; payload 5000 kg. The step masses 165 700, 18 070 and 2477 kg
    are the lightest: mass ratios 4.541, 2.507, 1.361, by a Lagrange multiplier η = 0.4668.
    """
    isps, fractions = (400.0, 350.0, 300.0), (0.10, 0.15, 0.20)
    speeds = [isp * HIS_G0_KM_S2 for isp in isps]

    def ratios(eta):
        return [(c * eta - 1.0) / (c * eps * eta) for c, eps in zip(speeds, fractions, strict=True)]

    def burnout(eta):
        return sum(c * math.log(ratio) for c, ratio in zip(speeds, ratios(eta), strict=True))

    eta = brentq(lambda eta: burnout(eta) - 10.0, 0.42, 2.0)
    assert eta == pytest.approx(0.4668, abs=0.0001)
    assert ratios(eta) == pytest.approx([4.541, 2.507, 1.361], abs=0.0006)

    def step_masses(dvs):
        above, steps = 5000.0, []
        for dv, isp, fraction in zip(dvs[::-1], isps[::-1], fractions[::-1], strict=True):
            steps.insert(0, sum(load(above, dv, isp, fraction)))
            above += steps[0]
        return steps

    dvs = [c * math.log(ratio) for c, ratio in zip(speeds, ratios(eta), strict=True)]
    lightest = step_masses(dvs)
    assert lightest == pytest.approx([165_700.0, 18_070.0, 2477.0], rel=1e-3)
    for move in ((0.05, -0.05, 0.0), (-0.05, 0.05, 0.0), (0.0, 0.05, -0.05), (0.0, -0.05, 0.05)):
        assert sum(step_masses([dv + shift for dv, shift in zip(dvs, move, strict=True)])) > sum(lightest)

"""What a flyby holds, and where stops begin and end."""

from dataclasses import replace

import numpy as np
import pytest

from porkgrid.handoff.stops import (
    End,
    Hold,
    Pass,
    arriving,
    epoch_s,
    free_numbers,
    leaving,
    off_condition,
    signed_burn,
)
from porkgrid.physics.flyby import burn, periapsis_radius
from porkgrid.sky.bodies import BODIES

VENUS = BODIES["venus"]
PASSED = Pass(VENUS, 1000.0, 0.05, 6351.8, Hold.BURN)
SPEEDING = np.array([2.0, -5.0, 1.0, 4.0, -3.6, 1.5, 0.25])
SLOWING = np.concatenate([SPEEDING[3:6], SPEEDING[:3], [0.25]])
POLE = np.array([0.0, 0.0, 1.0])


def test_a_burn_is_positive_where_it_speeds_up():
    size = float(burn(SPEEDING[:3], SPEEDING[3:6], VENUS.gm_km3_s2))
    assert signed_burn(PASSED, SPEEDING) == pytest.approx(size, rel=1e-12)
    assert signed_burn(PASSED, SLOWING) == pytest.approx(-size, rel=1e-12)
    assert size > 0.01


def test_each_condition_is_what_lacks_to_it():
    burning = replace(PASSED, burn_km_s=signed_burn(PASSED, SPEEDING) - 0.02)
    assert off_condition(burning, SPEEDING) == pytest.approx(0.02, abs=1e-12)
    radius = float(periapsis_radius(SPEEDING[:3], SPEEDING[3:6], VENUS.gm_km3_s2))
    low = replace(PASSED, hold=Hold.RADIUS, least_radius_km=radius / 1.1)
    assert off_condition(low, SPEEDING) == pytest.approx(0.1, rel=1e-9)
    assert off_condition(replace(PASSED, hold=Hold.EPOCH), SPEEDING) == 0.25


def test_the_seventh_number_of_a_flyby_moves_its_epoch_by_days():
    assert free_numbers(PASSED) == 7
    assert epoch_s(PASSED, SPEEDING) == 1000.0 + 21_600.0


def test_an_end_keeps_its_epoch_and_radius():
    end = End(VENUS, 500.0, 6500.0, POLE, 0.2)
    free = np.array([1.0, 3.0, -2.0])
    assert (free_numbers(end), epoch_s(end, free)) == (3, 500.0)
    for state in (leaving(end, free), arriving(end, free)):
        assert np.linalg.norm(state[:3]) == pytest.approx(6500.0, rel=1e-14)
        assert np.linalg.norm(state[3:]) > np.linalg.norm(free)


def test_a_body_without_gm_is_left_and_met_at_its_centre():
    end = End(replace(VENUS, gm_km3_s2=None), 0.0, 0.0, POLE, 0.0)
    free = np.array([1.0, 3.0, -2.0])
    expected = np.concatenate([np.zeros(3), free])
    np.testing.assert_array_equal(leaving(end, free), expected)
    np.testing.assert_array_equal(arriving(end, free), expected)

"""Periapsis states against the two-body motion that they start: far out it has the asked-for v∞."""

import math

import numpy as np
import pytest

from porkgrid.physics.conics import propagate
from porkgrid.physics.flyby import aim_plane, burn, periapsis_radius
from porkgrid.physics.periapsis import (
    arrival_state,
    departure_state,
    flyby_states,
    plane_normal,
    tilt_for_inclination,
)

GM = 398_600.435507
POLE = np.array([0.0, 0.0, 1.0])
V_INF = np.array([2.0, -1.5, 1.2])
RADIUS = 6_578.0
FAR_S = 1e10  # by then the speed is within 1e-5 of v∞, and so is the direction


def normal(tilt=0.4):
    return plane_normal(V_INF, POLE, tilt)


def test_a_departure_flies_out_along_its_v_infinity():
    place, velocity = departure_state(V_INF, RADIUS, normal(), GM)
    _, far = propagate(place, velocity, FAR_S, GM)
    np.testing.assert_allclose(far, V_INF, rtol=0.0, atol=1e-4)


def test_an_arrival_has_come_in_along_its_v_infinity():
    place, velocity = arrival_state(V_INF, RADIUS, normal(), GM)
    _, far = propagate(place, velocity, -FAR_S, GM)
    np.testing.assert_allclose(far, V_INF, rtol=0.0, atol=1e-4)


@pytest.mark.parametrize("state", [departure_state, arrival_state])
def test_both_are_at_periapsis_and_in_the_plane(state):
    place, velocity = state(V_INF, RADIUS, normal(), GM)
    assert np.linalg.norm(place) == pytest.approx(RADIUS, rel=1e-14)
    assert place @ velocity == pytest.approx(0.0, abs=1e-9)
    np.testing.assert_allclose(
        np.cross(place, velocity) / (RADIUS * np.linalg.norm(velocity)), normal(), atol=1e-14
    )


def test_a_flyby_joins_v_infinity_in_to_v_infinity_out_by_a_burn_along_the_velocity():
    out = np.array([2.6, 0.9, -0.4])
    place, before, after = flyby_states(V_INF, out, GM)
    np.testing.assert_allclose(propagate(place, before, -FAR_S, GM)[1], V_INF, rtol=0.0, atol=1e-4)
    np.testing.assert_allclose(propagate(place, after, FAR_S, GM)[1], out, rtol=0.0, atol=1e-4)
    assert np.linalg.norm(place) == pytest.approx(float(periapsis_radius(V_INF, out, GM)), rel=1e-13)
    assert np.linalg.norm(after - before) == pytest.approx(float(burn(V_INF, out, GM)), rel=1e-9)
    np.testing.assert_allclose(np.cross(before, after), 0.0, atol=1e-12)


@pytest.mark.parametrize("inclination_deg", [40.0, 60.0, 90.0, 120.0, 139.0])
def test_the_tilt_gives_the_plane_its_inclination(inclination_deg):
    tilt = tilt_for_inclination(V_INF, POLE, math.radians(inclination_deg))
    found = plane_normal(V_INF, POLE, tilt)
    assert found @ V_INF == pytest.approx(0.0, abs=1e-14)
    assert math.degrees(math.acos(found @ POLE)) == pytest.approx(inclination_deg, rel=1e-12)


@pytest.mark.parametrize(("inclination_deg", "nearest"), [(0.0, 1.0), (10.0, 1.0), (175.0, -1.0)])
def test_an_inclination_under_the_asymptotes_declination_gives_the_flattest_plane(inclination_deg, nearest):
    tilt = tilt_for_inclination(V_INF, POLE, math.radians(inclination_deg))
    declination = math.asin(V_INF[2] / np.linalg.norm(V_INF))
    assert plane_normal(V_INF, POLE, tilt) @ POLE == pytest.approx(nearest * math.cos(declination), rel=1e-12)


def test_the_flattest_plane_is_passed_on_the_side_of_t():
    """B·R = 0 and B·T > 0 for the flyby that an untilted arrival is the first half of."""
    place, velocity = arrival_state(V_INF, RADIUS, normal(0.0), GM)
    _, out = propagate(place, velocity, FAR_S, GM)
    b_t, b_r = aim_plane(V_INF, out, GM, POLE)
    assert b_t > 0.0
    assert abs(b_r) <= 1e-4 * b_t

"""Burns of parking, capture and entry, against vector sums and energies."""

import math
import warnings

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from mpmath import mp, mpf
from scipy.optimize import minimize_scalar

from porkgrid.physics.burns import (
    apsis_burn,
    cheapest_periapsis,
    departure_burn,
    hyperbola_speed,
    periapsis_speed,
    shape_burn,
)

GM_EARTH = 398_600.4418
EARTH_KM = 6378.0
V_INF = st.floats(0.0, 15.0)
DECLINATION = st.floats(-0.5 * math.pi, 0.5 * math.pi)
INCLINATION = st.floats(0.0, math.pi)
PERIAPSIS = st.floats(6500.0, 40_000.0)
STRETCH = st.floats(1.0, 30.0)
ECCENTRICITY = st.floats(0.0, 0.95)
FAST = st.floats(0.3, 15.0)  # v∞ at which an optimum stands out


@given(V_INF, PERIAPSIS)
def test_the_hyperbola_keeps_its_energy_from_infinity_to_periapsis(v_inf, radius):
    speed = float(hyperbola_speed(v_inf, radius, GM_EARTH))
    assert 0.5 * speed**2 - GM_EARTH / radius == pytest.approx(0.5 * v_inf**2, abs=1e-12 * speed**2)


@given(PERIAPSIS, STRETCH)
def test_a_closed_orbit_has_the_energy_of_its_axis_and_equal_momentum_at_both_apsides(periapsis, stretch):
    apoapsis = periapsis * stretch
    low = periapsis_speed(periapsis, apoapsis, GM_EARTH)
    high = periapsis_speed(apoapsis, periapsis, GM_EARTH)
    assert low * periapsis == pytest.approx(high * apoapsis, rel=1e-13)
    assert 0.5 * low**2 - GM_EARTH / periapsis == pytest.approx(-GM_EARTH / (periapsis + apoapsis), rel=1e-11)


@given(PERIAPSIS)
def test_barely_leaving_a_circular_orbit_costs_the_root_of_two_less_one_of_its_speed(radius):
    burn = float(apsis_burn(0.0, radius, radius, GM_EARTH))
    assert burn == pytest.approx((math.sqrt(2.0) - 1.0) * math.sqrt(GM_EARTH / radius), rel=1e-13)


@given(V_INF, PERIAPSIS, STRETCH)
def test_a_longer_capture_ellipse_costs_less_but_never_nothing(v_inf, periapsis, stretch):
    into_ellipse = apsis_burn(v_inf, periapsis, periapsis * stretch, GM_EARTH)
    assert 0.0 < into_ellipse <= apsis_burn(v_inf, periapsis, periapsis, GM_EARTH)


@given(V_INF, DECLINATION, PERIAPSIS, STRETCH, INCLINATION)
def test_departure_never_costs_less_than_in_plane(v_inf, declination, periapsis, stretch, inclination):
    orbit = (periapsis, periapsis * stretch)
    planar = float(apsis_burn(v_inf, *orbit, GM_EARTH))
    burn = float(departure_burn(v_inf, declination, *orbit, inclination, GM_EARTH))
    assert burn >= planar * (1.0 - 1e-12)
    reach = min(inclination, math.pi - inclination)
    if abs(declination) <= reach:
        assert burn == pytest.approx(planar, rel=1e-12)


@given(V_INF, DECLINATION, PERIAPSIS, STRETCH, INCLINATION)
def test_the_departure_burn_is_the_difference_of_two_velocities_at_the_angle_of_the_turn(
    v_inf, declination, periapsis, stretch, inclination
):
    turn = max(abs(declination) - min(inclination, math.pi - inclination), 0.0)
    fast = float(hyperbola_speed(v_inf, periapsis, GM_EARTH))
    slow = periapsis_speed(periapsis, periapsis * stretch, GM_EARTH)
    difference = np.array([fast * math.cos(turn) - slow, fast * math.sin(turn)])
    burn = departure_burn(v_inf, declination, periapsis, periapsis * stretch, inclination, GM_EARTH)
    assert float(burn) == pytest.approx(float(np.linalg.norm(difference)), abs=1e-11)


def test_an_asymptote_beyond_the_inclination_costs_more_the_farther_it_lies():
    declinations = np.radians([-60.0, -40.0, -28.5, 0.0, 28.5, 28.6, 40.0, 60.0])
    burns = departure_burn(3.0, declinations, 6578.0, 6578.0, math.radians(28.5), GM_EARTH)
    assert burns[2] == burns[3] == burns[4]
    assert np.all(np.diff(burns[4:]) > 0.0)
    assert np.all(np.diff(burns[:3]) < 0.0)


@given(V_INF, DECLINATION, INCLINATION)
def test_a_retrograde_orbit_reaches_as_far_as_its_prograde_mirror(v_inf, declination, inclination):
    one, other = (
        float(departure_burn(v_inf, declination, 6578.0, 6578.0, each, GM_EARTH))
        for each in (inclination, math.pi - inclination)
    )
    assert one == pytest.approx(other, rel=1e-9)


def test_a_small_turn_between_like_speeds_keeps_its_digits():
    """An orbit so long that it nearly escapes: the speeds differ in the seventh digit."""
    periapsis, apoapsis, declination = 6578.0, 1e10, 1e-9
    burn = float(departure_burn(1e-4, declination, periapsis, apoapsis, 0.0, GM_EARTH))
    with mp.workdps(40):
        gm, near, far = mpf(GM_EARTH), mpf(periapsis), mpf(apoapsis)
        fast = mp.sqrt(mpf(1e-4) ** 2 + 2 * gm / near)
        slow = mp.sqrt(2 * gm * far / (near * (near + far)))
        exact = mp.sqrt(fast**2 + slow**2 - 2 * fast * slow * mp.cos(mpf(declination)))
    assert burn == pytest.approx(float(exact), rel=1e-7)  # 1e-16 of 11 km/s in a burn of 4e-6 km/s is 4e-10


@given(V_INF, PERIAPSIS, STRETCH)
def test_an_orbit_by_its_shape_costs_what_it_costs_by_its_apsides(v_inf, periapsis, stretch):
    eccentricity = (stretch - 1.0) / (stretch + 1.0)
    by_shape = float(shape_burn(v_inf, periapsis, eccentricity, GM_EARTH))
    by_apsides = float(apsis_burn(v_inf, periapsis, periapsis * stretch, GM_EARTH))
    assert by_shape == pytest.approx(by_apsides, abs=1e-13 * 20.0)  # rounding of speeds up to 20 km/s


@given(FAST, ECCENTRICITY)
def test_no_periapsis_is_cheaper_than_the_closed_form_says(v_inf, eccentricity):
    cheapest = float(cheapest_periapsis(v_inf, eccentricity, GM_EARTH))

    def burn(log_ratio):
        return float(shape_burn(v_inf, cheapest * math.exp(log_ratio), eccentricity, GM_EARTH))

    found = minimize_scalar(burn, bounds=(-4.0, 4.0), method="bounded", options={"xatol": 1e-9})
    assert math.exp(found.x) == pytest.approx(1.0, rel=1e-5)  # a minimum is flat: half the digits of the burn
    assert burn(0.0) <= found.fun + 1e-14 * v_inf


@given(FAST, ECCENTRICITY)
def test_the_burn_at_the_cheapest_periapsis_is_that_of_the_textbook(v_inf, eccentricity):
    """Δv = v∞ √((1 − e)/2) (Curtis, section 8.8, memory)."""
    burn = shape_burn(v_inf, cheapest_periapsis(v_inf, eccentricity, GM_EARTH), eccentricity, GM_EARTH)
    assert float(burn) == pytest.approx(v_inf * math.sqrt(0.5 * (1.0 - eccentricity)), rel=1e-12)


@given(FAST, ECCENTRICITY, st.floats(0.1, 10.0), st.floats(1.001, 3.0))
def test_the_burn_rises_on_either_side_of_the_cheapest_periapsis(v_inf, eccentricity, ratio, further):
    cheapest = float(cheapest_periapsis(v_inf, eccentricity, GM_EARTH))
    farther = ratio * further if ratio >= 1.0 else ratio / further
    near, far = shape_burn(v_inf, cheapest * np.array([ratio, farther]), eccentricity, GM_EARTH)
    assert near < far


@given(V_INF, PERIAPSIS, STRETCH, st.floats(1.001, 30.0))
def test_to_a_given_apoapsis_the_lowest_periapsis_is_the_cheapest(v_inf, apoapsis, stretch, lower):
    high = apoapsis / stretch
    low = high / lower
    assert apsis_burn(v_inf, low, apoapsis, GM_EARTH) < apsis_burn(v_inf, high, apoapsis, GM_EARTH)


@given(V_INF, PERIAPSIS, ECCENTRICITY, st.floats(1.001, 30.0))
def test_to_a_given_period_the_lowest_periapsis_is_the_cheapest(v_inf, axis, eccentricity, lower):
    high = axis * (1.0 - eccentricity)
    low = high / lower
    burn_low, burn_high = (
        float(apsis_burn(v_inf, each, 2.0 * axis - each, GM_EARTH)) for each in (low, high)
    )
    assert burn_low < burn_high


def test_with_no_excess_speed_the_cheapest_periapsis_is_infinitely_far_and_free():
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        periapsis = cheapest_periapsis([0.0, 1e-200, np.nan, 3.0], 0.5, GM_EARTH)
        burn = shape_burn([0.0, 1e-200, np.nan, 3.0], periapsis, 0.5, GM_EARTH)
        clipped = shape_burn(0.0, np.clip(periapsis, 6578.0, 9000.0), 0.5, GM_EARTH)
    np.testing.assert_array_equal(np.isinf(periapsis), [True, True, False, False])
    np.testing.assert_array_equal(np.isnan(burn), [False, False, True, False])
    assert burn[0] == 0.0
    assert 0.0 <= burn[1] <= 1e-200  # its square is below the least double
    assert 0.0 < clipped[0] == clipped[1]


def test_shapes_and_speeds_broadcast():
    v_inf, eccentricity = np.array([[2.0], [3.0]]), np.array([0.0, 0.3, 0.6])
    periapsis = cheapest_periapsis(v_inf, eccentricity, GM_EARTH)
    burns = shape_burn(v_inf, periapsis, eccentricity, GM_EARTH)
    assert periapsis.shape == burns.shape == (2, 3)
    assert periapsis[:, 0] == pytest.approx(2.0 * GM_EARTH / v_inf[:, 0] ** 2, rel=1e-15)

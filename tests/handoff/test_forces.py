"""The field of the check: who is in it, and that its tracks are the kernel's."""

import numpy as np
import pytest

from porkgrid.errors import RequestError
from porkgrid.handoff.forces import PULLING, WORST_FIT_KM, forces_over
from porkgrid.physics.tracks import state_on_track
from porkgrid.sky.bodies import BODIES, Body
from porkgrid.sky.elements import Elements
from porkgrid.sky.kernel import open_ephemeris

FIRST, LAST = 2462098.5, 2462398.5
ROCK = Body(
    "rock", None, None, None, None, None, None, Elements(2462000.5, 0.9, 0.3, 5.0, 10.0, 20.0, 2461900.5)
)


@pytest.fixture(scope="module")
def ephemeris():
    return open_ephemeris()


@pytest.fixture(scope="module")
def forces(ephemeris):
    return forces_over(ephemeris, [BODIES["mars"], ROCK], FIRST, LAST)


def test_the_sun_the_planets_the_moon_and_pluto_pull(forces):
    assert forces.names == ("Sun", *(name.title() for name in PULLING))
    assert len(PULLING) == 10
    for number, name in enumerate(PULLING):
        assert forces.field.gm[number] == BODIES[name].gm_km3_s2


def test_a_body_met_is_on_a_track_once_and_pulls_only_if_its_gm_is_known(forces):
    assert forces.bodies[-1] is ROCK
    assert forces.bodies.count(BODIES["mars"]) == 1
    assert forces.field.gm[forces.index(ROCK)] == 0.0


def test_tracks_keep_to_the_kernel_within_a_metre_and_a_micrometre_a_second(forces, ephemeris):
    dates = np.rint(np.random.default_rng(5).uniform(FIRST, LAST, 40) * 4096.0) / 4096.0
    for number, body in enumerate(forces.bodies):
        place, velocity = ephemeris.states(body, dates)
        tracks = [state_on_track(forces.field.tracks, number, forces.seconds(jd)) for jd in dates]
        assert np.linalg.norm(np.array([r for r, _, _ in tracks]).T - place, axis=0).max() <= 1e-3
        assert np.linalg.norm(np.array([v for _, v, _ in tracks]).T - velocity, axis=0).max() <= 1e-9
    assert forces.worst_fit_km <= WORST_FIT_KM


def test_seconds_and_julian_dates_are_each_others_inverse(forces):
    assert forces.seconds(FIRST) == 0.0
    assert forces.seconds(FIRST + 1.5) == 129_600.0
    assert forces.jd(129_600.0) == FIRST + 1.5


def test_dates_outside_the_kernel_are_refused_by_name(ephemeris):
    with pytest.raises(RequestError, match=r"mercury: .* is outside the ephemeris"):
        forces_over(ephemeris, [], 2688900.5, 2689100.5)

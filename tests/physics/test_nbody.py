"""Motion among point masses: limits known in closed form, and what must hold between ways to tell it."""

import numpy as np
import pytest

from porkgrid.physics.conics import propagate
from porkgrid.physics.nbody import CENTRE, Field, FlightError, acceleration, fly, fly_with_sensitivity
from porkgrid.physics.tracks import fit_tracks, sample_times, state_on_track

GM_SUN = 132_712_440_041.279_419
GM_EARTH, GM_GIANT = 398_600.435507, 126_712_764.1
DAY = 86_400.0
SPAN_S = 400 * DAY
# An Earth-like and a Jupiter-like body about the Sun, on conics.
BODIES = [
    (np.array([1.496e8, 0.0, 0.0]), np.array([0.0, 29.8, 0.0])),
    (np.array([0.0, 7.8e8, 1.0e7]), np.array([-13.0, 0.0, 0.3])),
]


def field_of(*gm):
    times = sample_times(0.0, SPAN_S, 4 * DAY, 14)
    places = np.stack([np.moveaxis(propagate(r, v, times, GM_SUN)[0], -1, 0) for r, v in BODIES])
    return Field(GM_SUN, np.array(gm), fit_tracks(0.0, SPAN_S, times, places))


@pytest.fixture(scope="module")
def field():
    return field_of(GM_EARTH, GM_GIANT)


@pytest.fixture(scope="module")
def empty():
    return field_of(0.0, 0.0)


# States from the Sun: near circle, long ellipse, hyperbola.
STATES = [
    np.array([1.5e8, 0.0, 1.0e7, 1.0, 31.0, 2.0]),
    np.array([6.0e7, 2.0e7, 0.0, -5.0, 60.0, 4.0]),
    np.array([1.5e8, 2.0e7, 0.0, 10.0, 45.0, 3.0]),
]
# A low perigee with 3.3 km/s to spare, from the first body.
DEPARTURE = np.array([0.0, -6578.0, 0.0, 11.5, 0.0, 0.4])


def energy(state):
    return 0.5 * state[3:] @ state[3:] - GM_SUN / np.linalg.norm(state[:3])


@pytest.mark.parametrize("state", STATES, ids=["near circle", "long ellipse", "hyperbola"])
def test_two_body_motion_keeps_its_energy_to_a_part_in_a_million_million(empty, state):
    arc = fly(empty, 0.0, SPAN_S, state, CENTRE)
    energies = np.array([energy(one) for one in arc.states.T])
    # of the kinetic part, which is what rounding acts on where the two parts all but cancel
    assert np.abs(energies - energies[0]).max() <= 1e-12 * 0.5 * (state[3:] @ state[3:])


@pytest.mark.parametrize("state", STATES, ids=["near circle", "long ellipse", "hyperbola"])
@pytest.mark.parametrize("days", [30.0, 400.0])
def test_without_planets_the_path_is_the_conic_to_a_metre(empty, state, days):
    arc = fly(empty, 0.0, days * DAY, state, CENTRE)
    expected, _ = propagate(state[:3], state[3:], arc.t_s, GM_SUN)
    assert np.linalg.norm(arc.states[:3].T - expected, axis=1).max() <= 1e-3


def test_a_body_without_gm_may_be_flown_through(empty):
    place, velocity, _ = state_on_track(empty.tracks, 0, 0.0)
    state = np.concatenate([place, velocity + np.array([0.0, 0.0, 3.0])])
    end = fly(empty, 0.0, 20 * DAY, state, CENTRE).states[:, -1]
    expected, _ = propagate(state[:3], state[3:], 20 * DAY, GM_SUN)
    np.testing.assert_allclose(end[:3], expected, rtol=0.0, atol=1e-3)


def test_near_one_body_alone_the_path_is_its_hyperbola():
    """The Sun's tide over half an hour at perigee is some millimetres."""
    field = field_of(GM_EARTH, 0.0)
    end = fly(field, 0.0, 1800.0, DEPARTURE, 0).states[:, -1]
    place, velocity = propagate(DEPARTURE[:3], DEPARTURE[3:], 1800.0, GM_EARTH)
    np.testing.assert_allclose(end[:3], place, rtol=0.0, atol=2e-3)
    assert np.linalg.norm(end[:3] - place) > 0.0
    np.testing.assert_allclose(end[3:], velocity, rtol=0.0, atol=2e-6)


def test_acceleration_is_the_pulls_on_the_probe_less_those_on_the_centre(field):
    t, r = 50 * DAY, np.array([1.2e8, 9.0e7, -2.0e6])
    expected = -GM_SUN * r / np.linalg.norm(r) ** 3
    for number, gm in enumerate(field.gm):
        body = state_on_track(field.tracks, number, t)[0]
        away = body - r
        expected = expected + gm * (away / np.linalg.norm(away) ** 3 - body / np.linalg.norm(body) ** 3)
    found = acceleration(field, t, np.concatenate([r, np.zeros(3)]), CENTRE)
    np.testing.assert_allclose(found, expected, rtol=1e-13)


def test_the_same_motion_is_told_from_a_body_as_from_the_sun(field):
    place, velocity, _ = state_on_track(field.tracks, 0, 10 * DAY)
    from_body = fly(field, 10 * DAY, 13 * DAY, DEPARTURE, 0).states[:, -1]
    start = DEPARTURE + np.concatenate([place, velocity])
    from_sun = fly(field, 10 * DAY, 13 * DAY, start, CENTRE).states[:, -1]
    place, velocity, _ = state_on_track(field.tracks, 0, 13 * DAY)
    difference = from_body + np.concatenate([place, velocity]) - from_sun
    # what the Sun's story loses at perigee, in digits of 1.5e8 km
    assert np.linalg.norm(difference[:3]) <= 0.01
    assert np.linalg.norm(difference[3:]) <= 1e-7


def test_a_flight_there_and_back_ends_where_it_began(field):
    there = fly(field, 0.0, 2 * DAY, DEPARTURE, 0).states[:, -1]
    back = fly(field, 2 * DAY, 0.0, there, 0).states[:, -1]
    assert np.linalg.norm(back[:3] - DEPARTURE[:3]) <= 1e-5
    assert np.linalg.norm(back[3:] - DEPARTURE[3:]) <= 1e-8


@pytest.mark.parametrize("origin", [CENTRE, 0])
def test_sensitivity_is_what_neighbouring_flights_show(field, origin):
    start = STATES[0] if origin == CENTRE else DEPARTURE
    span = 100 * DAY if origin == CENTRE else 1 * DAY
    end, sensitivity = fly_with_sensitivity(field, 0.0, span, start, origin)
    alone = fly(field, 0.0, span, start, origin).states[:, -1]
    assert np.linalg.norm(end[:3] - alone[:3]) <= 1e-3
    for k in range(6):
        step = np.zeros(6)
        step[k] = 1e-7 * np.linalg.norm(start[:3] if k < 3 else start[3:])
        ahead = fly(field, 0.0, span, start + step, origin).states[:, -1]
        behind = fly(field, 0.0, span, start - step, origin).states[:, -1]
        slope = (ahead - behind) / (2.0 * step[k])
        for part in (slice(0, 3), slice(3, 6)):
            size = np.linalg.norm(sensitivity[part, k])
            assert np.linalg.norm(sensitivity[part, k] - slope[part]) <= 1e-4 * size


def test_a_fall_into_a_centre_is_refused(field):
    with pytest.raises(FlightError):
        fly(field, 0.0, 100 * DAY, np.array([1.0e8, 0.0, 0.0, 0.0, 0.0, 0.0]), CENTRE)


@pytest.mark.parametrize("flight", [fly, fly_with_sensitivity])
def test_a_state_that_is_not_known_is_refused(field, flight):
    with pytest.raises(FlightError, match="not known"):
        flight(field, 0.0, DAY, np.full(6, np.nan), CENTRE)


def test_between_its_steps_an_arc_is_where_a_flight_to_there_comes_to(field):
    arc = fly(field, 0.0, 100 * DAY, STATES[1], CENTRE)
    for k in range(0, len(arc.t_s) - 1, 10):
        then = 0.6 * arc.t_s[k] + 0.4 * arc.t_s[k + 1]
        expected = fly(field, arc.t_s[k], then, arc.states[:, k], CENTRE).states[:, -1]
        found = arc.between(np.array([then]))[:, 0]
        assert np.linalg.norm(found[:3] - expected[:3]) <= 1e-4
        assert np.linalg.norm(found[3:] - expected[3:]) <= 1e-10

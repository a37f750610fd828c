"""Chebyshev tracks against the motion they are fitted to: two-body motion, known in closed form."""

import numpy as np
import pytest

from porkgrid.physics.conics import propagate
from porkgrid.physics.tracks import (
    fill_acceleration,
    fill_positions,
    fit_tracks,
    sample_times,
    state_on_track,
)

GM = 132_712_440_041.279_419
R0, V0 = np.array([1.4e8, 3.0e7, -1.0e7]), np.array([-7.0, 28.0, 3.0])
START_S, END_S = -1.0e6, 9.0e6
PIECE_S = 4 * 86_400.0


def motion(t_s):
    return propagate(R0, V0, np.asarray(t_s, dtype=float), GM)


def two_tracks(times_s):
    """The motion, and its mirror image in the centre."""
    place = np.moveaxis(motion(times_s)[0], -1, 0)
    return fit_tracks(START_S, END_S, times_s, np.stack([place, -place]))


@pytest.fixture(scope="module")
def tracks():
    return two_tracks(sample_times(START_S, END_S, PIECE_S, 14))


TIMES_S = np.linspace(START_S, END_S, 61)


def test_pieces_are_no_longer_than_asked_and_cover_the_span(tracks):
    pieces, bodies, axes, terms = tracks.coefficients.shape
    assert (bodies, axes, terms) == (2, 3, 14)
    assert tracks.piece_s <= PIECE_S
    assert tracks.piece_s * pieces == pytest.approx(END_S - START_S)


def test_a_track_has_place_velocity_and_acceleration_of_the_motion(tracks):
    for t in TIMES_S:
        r, v = motion(t)
        place, velocity, acceleration = state_on_track(tracks, 0, t)
        np.testing.assert_allclose(place, r, rtol=0.0, atol=1e-6)
        np.testing.assert_allclose(velocity, v, rtol=0.0, atol=1e-10)
        np.testing.assert_allclose(acceleration, -GM * r / np.linalg.norm(r) ** 3, rtol=0.0, atol=1e-13)


def test_samples_off_the_nodes_make_the_same_track():
    nodes = sample_times(START_S, END_S, PIECE_S, 14)
    off = nodes + np.random.default_rng(1).uniform(-20.0, 20.0, nodes.shape)
    for t in TIMES_S:
        place, _, _ = state_on_track(two_tracks(off), 0, t)
        np.testing.assert_allclose(place, motion(t)[0], rtol=0.0, atol=1e-6)


def test_the_compiled_look_up_equals_the_plain_one_for_every_body(tracks):
    places, pull = np.empty((2, 3)), np.empty(3)
    for t in TIMES_S:
        fill_positions(t, *tracks, places)
        for body in range(2):
            place, _, acceleration = state_on_track(tracks, body, t)
            np.testing.assert_allclose(places[body], place, rtol=1e-15, atol=1e-7)
            fill_acceleration(t, *tracks, body, pull)
            np.testing.assert_allclose(pull, acceleration, rtol=0.0, atol=1e-14)


def test_a_span_shorter_than_a_piece_is_one_piece():
    times = sample_times(0.0, 3600.0, PIECE_S, 6)
    assert times.shape == (1, 6)
    tracks = fit_tracks(0.0, 3600.0, times, np.moveaxis(motion(times)[0], -1, 0)[None])
    np.testing.assert_allclose(state_on_track(tracks, 0, 1234.5)[0], motion(1234.5)[0], atol=1e-6, rtol=0.0)

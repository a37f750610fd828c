"""Angles swept and distances passed, against arcs whose every point is known."""

import math

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from porkgrid.physics.arcs import distance_range, transfer_angle
from porkgrid.physics.conics import propagate
from porkgrid.physics.constants import AU_KM, DAY_S, GM_SUN_KM3_S2

TURN = 2.0 * math.pi
ANGLE = st.floats(0.0, TURN)
PERIAPSIS_AU = st.floats(0.2, 3.0)
ECCENTRICITY = st.floats(0.0, 0.9)
POINTS = 4001


def rotation(node, inclination, argument):
    """Columns: the perifocal axes in the reference axes."""

    def about(axis, angle):
        c, s = math.cos(angle), math.sin(angle)
        i, j = [(1, 2), (2, 0), (0, 1)][axis]
        matrix = np.eye(3)
        matrix[i, i] = matrix[j, j] = c
        matrix[i, j], matrix[j, i] = -s, s
        return matrix

    return about(2, node) @ about(0, inclination) @ about(2, argument)


def state(q_au, e, anomaly, axes):
    """Position and velocity (3,) on a conic at a true anomaly, from the polar equation."""
    p = q_au * AU_KM * (1.0 + e)
    r = p / (1.0 + e * math.cos(anomaly)) * np.array([math.cos(anomaly), math.sin(anomaly), 0.0])
    v = math.sqrt(GM_SUN_KM3_S2 / p) * np.array([-math.sin(anomaly), e + math.cos(anomaly), 0.0])
    return axes @ r, axes @ v


def sampled_range(q_au, e, start, sweep):
    anomalies = start + np.linspace(0.0, sweep, POINTS)
    distances = q_au * AU_KM * (1.0 + e) / (1.0 + e * np.cos(anomalies))
    return distances.min(), distances.max()


def range_of(q_au, e, start, sweep, axes, full_turn=False):
    ends = [*state(q_au, e, start, axes), *state(q_au, e, start + sweep, axes)]
    return [float(each) for each in distance_range(*ends, np.array(full_turn), GM_SUN_KM3_S2)]


def assert_encloses(found, sampled):
    """The range holds every sample and is no wider than the samples' spacing leaves room for."""
    (least, greatest), (lowest, highest) = found, sampled
    assert least == pytest.approx(lowest, rel=3e-5)  # (2π/4000)²/8 · e/(1 − e), and rounding
    assert greatest == pytest.approx(highest, rel=3e-5)
    assert least <= lowest * (1.0 + 1e-12)
    assert greatest >= highest * (1.0 - 1e-10)


@given(PERIAPSIS_AU, ECCENTRICITY, ANGLE, st.floats(0.01, TURN - 0.01), ANGLE, ANGLE)
def test_the_range_on_an_ellipse_is_that_of_the_points_flown(q_au, e, start, sweep, node, argument):
    axes = rotation(node, node / 2.0, argument)
    assert_encloses(range_of(q_au, e, start, sweep, axes), sampled_range(q_au, e, start, sweep))


@given(PERIAPSIS_AU, st.floats(1.0, 5.0), st.floats(-0.95, 0.95), st.floats(-0.95, 0.95))
def test_the_range_on_a_hyperbola_is_that_of_the_points_flown(q_au, e, one, other):
    asymptote = math.acos(-1.0 / e)
    start, end = sorted([one * asymptote, other * asymptote])
    assume(end - start > 0.01)
    found = range_of(q_au, e, start, end - start, rotation(0.3, 0.1, 1.0))
    assert_encloses(found, sampled_range(q_au, e, start, end - start))


@given(PERIAPSIS_AU, st.floats(0.05, 0.9), ANGLE, st.floats(0.01, TURN - 0.01))
def test_an_arc_with_whole_revolutions_passes_both_apsides(q_au, e, start, sweep):
    least, greatest = range_of(q_au, e, start, sweep, np.eye(3), full_turn=True)
    assert least == pytest.approx(q_au * AU_KM, rel=1e-12)
    assert greatest == pytest.approx(q_au * AU_KM * (1.0 + e) / (1.0 - e), rel=1e-11)


@pytest.mark.parametrize("days", [100.0, 500.0, 800.0, 1050.0])
def test_the_range_holds_for_an_arc_propagated_in_time(days):
    r0, v0 = state(1.0, 0.4, 2.0, rotation(1.0, 0.2, 0.5))  # a year of 785 days
    times = np.linspace(0.0, days, POINTS) * DAY_S
    r, v = propagate(r0, v0, times, GM_SUN_KM3_S2)
    distances = np.linalg.norm(r, axis=-1)
    full_turn = np.array(days > 786.0)
    found = distance_range(r0, v0, r[-1], v[-1], full_turn, GM_SUN_KM3_S2)
    assert_encloses([float(each) for each in found], (distances.min(), distances.max()))


@given(ANGLE, st.floats(1e-3, TURN - 1e-3), ANGLE, ANGLE, ANGLE)
def test_the_transfer_angle_is_the_one_swept_whichever_way_the_plane_lies(start, sweep, node, incl, argument):
    assume(abs(sweep - math.pi) > 1e-6)
    axes = rotation(node, incl / 2.0, argument)
    r1, v1 = state(1.0, 0.3, start, axes)
    r2, _ = state(1.0, 0.3, start + sweep, axes)
    assert float(transfer_angle(r1, r2, v1)) == pytest.approx(sweep, abs=1e-8)


def test_the_angle_is_counted_along_the_flight_also_when_it_is_retrograde():
    east, north = np.array([1.0, 0.0, 0.0]), np.array([0.0, 1.0, 0.0])
    assert float(transfer_angle(east, north, north)) == pytest.approx(0.5 * math.pi)
    assert float(transfer_angle(east, north, -north)) == pytest.approx(1.5 * math.pi)


def test_grids_of_dates_broadcast_and_cells_that_cannot_be_flown_stay_nan():
    rng = np.random.default_rng(3)
    r1, r2 = rng.normal(size=(3, 4, 1)) * AU_KM, rng.normal(size=(3, 1, 5)) * AU_KM
    v1, v2 = rng.normal(size=(2, 3, 4, 5)) * 20.0
    v1[:, 2, 3] = v2[:, 2, 3] = np.nan
    results = [
        transfer_angle(r1, r2, v1),
        *distance_range(r1, v1, r2, v2, np.zeros((4, 5), bool), GM_SUN_KM3_S2),
    ]
    for result in results:
        assert result.shape == (4, 5)
        assert np.argwhere(np.isnan(result)).tolist() == [[2, 3]]

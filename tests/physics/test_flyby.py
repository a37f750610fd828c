"""Flybys: the one root over the whole domain, and the hyperbola's elements, against mpmath at 50 digits."""

import math

import numpy as np
import pytest
from exact_flyby import PARTS, SPEED, exact, exact_angle, exact_cross, exact_turn, steepness, velocities
from hypothesis import assume, given
from hypothesis import strategies as st
from mpmath import mp, mpf
from numba import njit

from porkgrid.physics import turns
from porkgrid.physics.flyby import (
    aim_distance,
    aim_plane,
    burn,
    eccentricity,
    gain,
    heliocentric_turn,
    periapsis_radius,
    periapsis_speeds,
    turn,
    turn_angle,
)
from porkgrid.physics.timeflight import PLAIN

EPS = 2.0**-52
GM = 324_858.592  # Venus, DE440


def across(speed_in, speed_out, angle):
    """Two velocities in the plane of x and y, the first along x."""
    angle = np.asarray(angle, dtype=float)
    zero = np.zeros_like(angle)
    return (
        np.stack([speed_in + zero, zero, zero]),
        np.stack([speed_out * np.cos(angle), speed_out * np.sin(angle), zero]),
    )


@given(velocities())
def test_the_turn_keeps_its_digits_from_the_tiniest_to_nearly_180_degrees(pair):
    with mp.workdps(50):
        expected = float(exact_angle(*pair)[0])
    assert turn_angle(*pair) == pytest.approx(expected, rel=4 * EPS, abs=0.0)


@given(velocities())
def test_the_one_root_lies_within_rounding_of_the_periapsis_radius_for_any_speeds_and_turn(pair):
    """The turn falls with the radius: a change of sign between neighbours encloses the only root.

    How near the neighbours may be is what a rounding of the turn moves the root by.
    """
    with np.errstate(all="raise", under="ignore"):
        radius = float(periapsis_radius(*pair, GM))
    with mp.workdps(50):
        y = mpf(radius) / mpf(GM)
        angle, rest = exact_angle(*pair)
        off = 16 * EPS * (1 + min(angle, rest) / steepness(*pair, y))
        assert off < 1e-8
        assert exact_turn(*pair, y * (1 + off)) < angle < exact_turn(*pair, y * (1 - off))


@given(SPEED, st.floats(0.5, 2.0), st.floats(1e-3, 3.13))
def test_the_kernel_of_the_joins_agrees_for_speeds_within_a_factor_of_two(speed, ratio, angle):
    radius = float(periapsis_radius(*across(speed, ratio * speed, angle), GM))
    quick = GM * joins_periapsis(speed**2, (ratio * speed) ** 2, math.cos(angle))
    assert quick == pytest.approx(radius, rel=1e-12 + 8 * EPS / math.sin(angle) ** 2)


@njit(**PLAIN)
def joins_periapsis(a2, b2, cosine):
    return turns.periapsis(a2, b2, cosine)


@pytest.fixture(scope="module", autouse=True)
def compiled():
    """Compile before hypothesis times the first example."""
    joins_periapsis(1.0, 1.0, 0.0)
    periapsis_radius([1.0, 0.0, 0.0], [0.0, 1.0, 0.0], GM)


@given(SPEED, st.floats(1.0, 1e9), st.floats(1.0, 1e9))
def test_the_radius_that_turned_an_unpowered_flyby_is_found_again(speed, radius, gm):
    angle = float(turn(speed, radius, gm))
    assume(angle < math.pi - 1e-3 and angle > 1e-12)
    found = float(periapsis_radius(*across(speed, speed, angle), gm))
    assert found == pytest.approx(radius, rel=32 * EPS / (math.pi - angle) + 32 * EPS)


@given(SPEED, SPEED, st.floats(1e-3, 3.0), st.floats(1e-3, 0.1))
def test_a_sharper_turn_needs_a_lower_periapsis(a, b, angle, sharper):
    sharp, mild = periapsis_radius(*across(a, b, np.array([angle + sharper, angle])), GM)
    assert 0.0 < sharp < mild


def test_a_quarter_turn_at_equal_speeds_needs_an_eccentricity_of_the_root_of_two():
    """1/sin 45°, so r = (√2 − 1) GM/v∞²."""
    expected = (math.sqrt(2.0) - 1.0) * GM / 25.0
    assert periapsis_radius([5.0, 0.0, 0.0], [0.0, 0.0, -5.0], GM) == pytest.approx(expected, rel=1e-15)


def test_no_turn_is_passed_at_infinity_where_the_burn_is_the_difference_of_speeds():
    v_in, v_out = [1.2, -0.4, 0.8], [2.4, -0.8, 1.6]
    assert periapsis_radius(v_in, v_out, GM) == math.inf
    assert burn(v_in, v_out, GM) == pytest.approx(float(np.linalg.norm(v_in)), rel=1e-15)


def test_a_full_reversal_would_go_through_the_centre():
    assert periapsis_radius([3.0, 1.0, -2.0], [-6.0, -2.0, 4.0], GM) == 0.0


@pytest.mark.parametrize(
    ("v_in", "v_out", "gm"),
    [
        ([0.0, 0.0, 0.0], [0.0, 3.0, 0.0], GM),
        ([3.0, 0.0, 0.0], [0.0, 0.0, 0.0], GM),
        ([math.nan, 0.0, 0.0], [0.0, 3.0, 0.0], GM),
        ([3.0, 0.0, 0.0], [0.0, math.inf, 0.0], GM),
        ([3.0, 0.0, 0.0], [0.0, 3.0, 0.0], 0.0),
        ([3.0, 0.0, 0.0], [0.0, 3.0, 0.0], -GM),
        ([3.0, 0.0, 0.0], [0.0, 3.0, 0.0], math.inf),
    ],
)
@pytest.mark.filterwarnings("error")
def test_what_has_no_flyby_is_nan_without_a_warning(v_in, v_out, gm):
    assert math.isnan(periapsis_radius(v_in, v_out, gm))
    assert math.isnan(burn(v_in, v_out, gm))
    assert all(math.isnan(speed) for speed in periapsis_speeds(v_in, v_out, gm))


@given(velocities())
def test_the_burn_is_the_difference_of_the_speeds_at_periapsis(pair):
    radius = periapsis_radius(*pair, GM)
    before, after = (float(speed) for speed in periapsis_speeds(*pair, GM))
    with mp.workdps(50):
        escape2 = 2 * mpf(GM) / mpf(float(radius))
        slow, fast = (mp.sqrt(mp.fdot(exact(v), exact(v)) + escape2) for v in pair)
        expected = float(abs(fast - slow))
        a, b = (float(mp.norm(exact(v))) for v in pair)
        slow, fast = float(slow), float(fast)
    assert (before, after) == pytest.approx((slow, fast), rel=8 * EPS)
    rounding = (a + b) ** 2 / (slow + fast)  # b² − a² is a difference of doubles of size a² and b²
    assert burn(*pair, GM) == pytest.approx(expected, rel=16 * EPS, abs=16 * EPS * rounding)


@given(velocities())
def test_both_halves_keep_the_angular_momentum_of_their_asymptote(pair):
    """B v∞ = r w on either side, w the speed at periapsis: the two hyperbolas share only r."""
    radius = periapsis_radius(*pair, GM)
    for v, at_periapsis in zip(pair, periapsis_speeds(*pair, GM), strict=True):
        speed = np.linalg.norm(v)
        assert aim_distance(speed, radius, GM) * speed == pytest.approx(
            float(radius * at_periapsis), rel=1e-14
        )


@given(velocities())
def test_the_burn_hangs_on_the_velocities_and_not_on_the_pull_of_the_body(pair):
    """A weaker body is passed as much lower as it is weaker."""
    assert burn(*pair, 1e-3 * GM) == pytest.approx(float(burn(*pair, GM)), rel=1e-13)
    assert periapsis_radius(*pair, 1e-3 * GM) == pytest.approx(1e-3 * float(periapsis_radius(*pair, GM)))


@given(SPEED, st.floats(1e-3, 1e9), st.floats(1.0, 1e9))
def test_turn_eccentricity_and_aim_distance_are_those_of_the_hyperbola(speed, radius, gm):
    with mp.workdps(50):
        axis = mpf(gm) / mpf(speed) ** 2
        e = 1 + mpf(radius) / axis
        expected_turn, expected_aim = float(2 * mp.asin(1 / e)), float(axis * mp.sqrt(e * e - 1))
        e = float(e)
    assert eccentricity(speed, radius, gm) == pytest.approx(e, rel=4 * EPS)
    assert turn(speed, radius, gm) == pytest.approx(expected_turn, rel=8 * EPS, abs=0.0)
    assert aim_distance(speed, radius, gm) == pytest.approx(expected_aim, rel=8 * EPS, abs=0.0)


def test_elements_take_arrays_and_their_limits():
    radius = np.array([0.0, 7000.0, np.inf])
    assert turn(3.0, radius, GM)[[0, 2]] == pytest.approx([math.pi, 0.0], abs=0.0)
    assert aim_distance(3.0, radius, GM)[[0, 2]].tolist() == [0.0, math.inf]
    assert eccentricity(3.0, radius, GM)[[0, 2]].tolist() == [1.0, math.inf]
    speeds = np.array([[0.0], [3.0]])
    assert np.isnan(aim_distance(speeds, radius, GM)).tolist() == [[True] * 3, [False] * 3]


@given(velocities(), PARTS)
def test_the_aim_point_is_as_far_from_the_centre_as_the_asymptote_and_opposite_the_turn(pair, pole):
    assume(np.linalg.norm(np.cross(pair[0], pole)) > 1e-3 * np.linalg.norm(pair[0]))
    b_t, b_r = aim_plane(*pair, GM, pole)
    speed = np.linalg.norm(pair[0])
    distance = float(aim_distance(speed, periapsis_radius(*pair, GM), GM))
    assert math.hypot(b_t, b_r) == pytest.approx(distance, rel=1e-14)
    with mp.workdps(50):
        s, n, out = exact(pair[0]), exact(pole), exact(pair[1])
        t = exact_cross(s, n)
        aside = out - s * (mp.fdot(out, s) / mp.fdot(s, s))
        along_t = -mp.fdot(aside, t) / (mp.norm(aside) * mp.norm(t))
    assert b_t == pytest.approx(distance * float(along_t), abs=1e-12 * distance)


@pytest.mark.parametrize(
    ("v_out", "side"),
    [([0, 4, 0], (1, 0)), ([0, -4, 0], (-1, 0)), ([0, 0, 4], (0, 1)), ([0, 0, -4], (0, -1))],
)
def test_b_r_counts_to_the_south_and_b_t_along_the_equator(v_out, side):
    """In along x with the pole z, T = −y and R = −z; who turns to +y passes at −y."""
    b_t, b_r = aim_plane([4.0, 0.0, 0.0], v_out, GM, [0.0, 0.0, 7.0])
    distance = (GM / 16.0) * 1.0  # GM/v∞² sqrt(e² − 1) with e = √2
    assert (b_t, b_r) == pytest.approx((distance * side[0], distance * side[1]), abs=1e-10 * distance)


@pytest.mark.parametrize(
    ("v_out", "pole"), [([8, 0, 0], [0, 0, 1]), ([-4, 0, 0], [0, 0, 1]), ([0, 4, 0], [-2, 0, 0])]
)
@pytest.mark.filterwarnings("error")
def test_the_aim_point_is_nan_where_no_plane_or_no_axis_is_defined(v_out, pole):
    assert np.isnan(aim_plane([4.0, 0.0, 0.0], v_out, GM, pole)).all()


BODY_SPEED = st.tuples(*[st.floats(-50.0, 50.0)] * 3)


@given(velocities(), BODY_SPEED)
def test_the_gain_is_the_change_of_heliocentric_speed_with_its_digits(pair, body):
    with mp.workdps(50):
        before, after = (mp.norm(exact(v) + exact(body)) for v in pair)
        expected, total = float(after - before), float(after + before)
        # Rounded sums of the body's velocity and v∞, and the rounded difference of the two v∞
        size = float(mp.norm(exact(body)) + mp.norm(exact(pair[0])) + mp.norm(exact(pair[1])))
        change = float(mp.norm(exact(pair[1]) - exact(pair[0])))
    rounding = 8 * EPS * size * change / total if total else 0.0
    assert gain(*pair, body) == pytest.approx(expected, rel=16 * EPS, abs=rounding)


@given(velocities(), BODY_SPEED)
def test_the_heliocentric_turn_is_the_angle_between_the_sums_of_velocities(pair, body):
    sums = [np.array(body) + v for v in pair]
    assume(all(np.linalg.norm(v) > 0.0 for v in sums))
    with mp.workdps(50):
        expected = float(exact_angle(*sums)[0])
    assert heliocentric_turn(*pair, body) == pytest.approx(expected, rel=4 * EPS, abs=0.0)


def test_no_gain_and_no_direction_at_rest_in_the_sun_frame():
    v, body = [3.0, 0.0, 0.0], [-3.0, 0.0, 0.0]
    assert gain(v, v, body) == 0.0
    assert math.isnan(heliocentric_turn(v, v, body))


def test_legs_in_and_legs_out_broadcast_to_the_pairs_of_them():
    rng = np.random.default_rng(5)
    v_in, v_out, body = rng.normal(size=(3, 4, 1)), rng.normal(size=(3, 1, 5)), rng.normal(size=3)
    tables = [
        turn_angle(v_in, v_out),
        periapsis_radius(v_in, v_out, GM),
        burn(v_in, v_out, GM),
        gain(v_in, v_out, body),
        heliocentric_turn(v_in, v_out, body),
    ]
    for i in range(4):
        for j in range(5):
            a, b = v_in[:, i, 0], v_out[:, 0, j]
            alone = [turn_angle(a, b), periapsis_radius(a, b, GM), burn(a, b, GM)]
            alone += [gain(a, b, body), heliocentric_turn(a, b, body)]
            assert [table[i, j] for table in tables] == alone
    assert all(table.shape == (4, 5) for table in tables)


def test_one_vector_goes_with_three_without_mistaking_its_components_for_rows():
    v_out = np.eye(3) + 0.1
    table = periapsis_radius([1.0, 2.0, 3.0], v_out, np.array([GM, 2.0 * GM, 3.0 * GM]))
    rows = [periapsis_radius([1.0, 2.0, 3.0], v_out[:, k], (k + 1) * GM) for k in range(3)]
    assert table.tolist() == pytest.approx(rows, rel=1e-15)


def test_a_row_that_is_not_finite_leaves_the_others_alone():
    v_out = np.array([[0.0, np.nan, 0.0], [2.0, 2.0, 0.0], [0.0, 0.0, 1.0]])
    radius = periapsis_radius([1.0, 0.0, 0.0], v_out, GM)
    assert np.isnan(radius).tolist() == [False, True, False]


@pytest.mark.parametrize("shape", [(), (2,), (5, 3)])
def test_a_vector_of_other_than_three_components_is_refused(shape):
    with pytest.raises(ValueError, match="axis of 3 components"):
        turn_angle(np.ones(shape), np.ones(3))

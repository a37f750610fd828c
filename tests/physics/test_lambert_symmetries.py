"""What every Lambert solver must have, whatever the problem: symmetries, units, landing on the target."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from lambert_problems import POLE
from scipy.spatial.transform import Rotation

from porkgrid.physics.conics import propagate
from porkgrid.physics.constants import AU_KM, GM_SUN_KM3_S2
from porkgrid.physics.lambert import lambert

YEAR_RATE = np.sqrt(GM_SUN_KM3_S2)
CLOSE = 1e-10  # rounding, amplified by the conditioning of the flights drawn here (below 1e4)


@st.composite
def flights(draw):
    """A moderate problem (r1, r2, tof): ratio 0.1..10, θ at least 5° from the corners, both ways round."""
    degrees = draw(st.one_of(st.floats(5, 175), st.floats(185, 355)))
    theta, ratio = np.deg2rad(degrees), 10 ** draw(st.floats(-1, 1))
    turn = Rotation.from_euler(
        "zxz", [draw(st.floats(0, 6.28)), draw(st.floats(0, 1.0)), draw(st.floats(0, 6.28))]
    )
    r1 = turn.apply([AU_KM, 0.0, 0.0])
    r2 = turn.apply(AU_KM * ratio * np.array([np.cos(theta), np.sin(theta), 0.0]))
    chord = np.linalg.norm(r2 - r1)
    flight = ((AU_KM * (1 + ratio) + chord) / 2) ** 1.5 / YEAR_RATE
    return r1, r2, flight * 10 ** draw(st.floats(-1, 1))


def solve(r1, r2, tof, revs=0, **kind):
    """Solve about the Sun; with revolutions, in a time that surely holds them."""
    return lambert(
        r1, r2, tof if revs == 0 else (tof + flight_for(r1, r2, revs)), GM_SUN_KM3_S2, revs=revs, **kind
    )


def flight_for(r1, r2, revs):
    """A time longer than the least for N: that of N + 1 turns on the ellipse of least energy."""
    a = (np.linalg.norm(r1) + np.linalg.norm(r2) + np.linalg.norm(r2 - r1)) / 4
    return 2 * np.pi * (revs + 1) * a**1.5 / YEAR_RATE


def same(found, wanted) -> bool:
    return all(np.linalg.norm(f - w) <= CLOSE * np.linalg.norm(w) for f, w in zip(found, wanted, strict=True))


kinds = given(flights(), st.integers(0, 3), st.sampled_from(["left", "right"]), st.booleans())
thorough = settings(max_examples=150, deadline=None)


@thorough
@kinds
def test_flying_back_in_the_same_time_reverses_the_velocities(flight, revs, branch, retrograde):
    r1, r2, tof = flight
    out = solve(r1, r2, tof, revs, branch=branch, retrograde=retrograde)
    back = solve(r2, r1, tof, revs, branch=branch, retrograde=not retrograde)
    assert same(back, (-out[1], -out[0]))


@thorough
@kinds
def test_turning_the_axes_turns_the_velocities(flight, revs, branch, retrograde):
    r1, r2, tof = flight
    turn = Rotation.from_euler("xyz", [0.7, -1.9, 2.6])
    plain = solve(r1, r2, tof, revs, branch=branch, retrograde=retrograde, pole=POLE)
    turned = solve(
        turn.apply(r1), turn.apply(r2), tof, revs, branch=branch, retrograde=retrograde, pole=turn.apply(POLE)
    )
    assert same(turned, [turn.apply(v) for v in plain])


@thorough
@kinds
def test_a_mirror_image_is_flown_with_mirrored_velocities(flight, revs, branch, retrograde):
    r1, r2, tof = flight
    mirror = np.array([1.0, -1.0, 1.0])
    plain = solve(r1, r2, tof, revs, branch=branch, retrograde=retrograde, pole=POLE)
    image = solve(
        mirror * r1, mirror * r2, tof, revs, branch=branch, retrograde=retrograde, pole=-mirror * POLE
    )  # r1 × r2 is an axial vector: it mirrors with the opposite sign
    assert same(image, [mirror * v for v in plain])


@thorough
@kinds
def test_retrograde_is_prograde_about_the_opposite_pole(flight, revs, branch, retrograde):
    r1, r2, tof = flight
    one = solve(r1, r2, tof, revs, branch=branch, retrograde=retrograde, pole=POLE)
    other = solve(r1, r2, tof, revs, branch=branch, retrograde=not retrograde, pole=-POLE)
    assert same(one, other)


@thorough
@given(flights(), st.sampled_from([(1e3, 1.0), (1 / AU_KM, 86400.0), (6378.0, 3.3e-4)]))
def test_units_of_length_and_time_do_not_matter(flight, units):
    r1, r2, tof = flight
    length, time = units
    plain = lambert(r1, r2, tof, GM_SUN_KM3_S2)
    scaled = lambert(length * r1, length * r2, time * tof, GM_SUN_KM3_S2 * length**3 / time**2)
    assert same(scaled, [v * length / time for v in plain])


@thorough
@kinds
def test_kepler_motion_from_the_departure_lands_on_the_target(flight, revs, branch, retrograde):
    r1, r2, tof = flight
    v1, v2 = solve(r1, r2, tof, revs, branch=branch, retrograde=retrograde)
    flown = tof if revs == 0 else tof + flight_for(r1, r2, revs)
    reached, speed = propagate(r1, v1, flown, GM_SUN_KM3_S2)
    assert same((reached, speed), (r2, v2))
    assert np.sign(np.cross(r1, v1) @ POLE) == (-1 if retrograde else 1)


def test_an_unknown_branch_is_refused():
    with pytest.raises(ValueError, match="left"):
        lambert([AU_KM, 0, 0], [0, AU_KM, 0], 1e8, GM_SUN_KM3_S2, revs=1, branch="middle")

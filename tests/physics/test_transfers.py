"""Transfers by tangent burns, against energies, momenta and the Lambert solver."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from mpmath import mp, mpf

from porkgrid import lambert
from porkgrid.physics.transfers import bielliptic, bielliptic_mid_radius, hohmann

GM = 132_712_440_041.279_419
RADIUS = st.floats(3e7, 5e9)
STRETCH = st.floats(1.0, 300.0)


@given(RADIUS, RADIUS)
def test_a_hohmann_transfer_takes_the_same_burns_and_time_there_and_back(r1, r2):
    there, back = hohmann(r1, r2, GM), hohmann(r2, r1, GM)
    assert there.departure_km_s == back.arrival_km_s
    assert there.arrival_km_s == back.departure_km_s
    assert there.tof_s == back.tof_s
    assert there.total_km_s == pytest.approx(float(there.departure_km_s + there.arrival_km_s))


@given(RADIUS, STRETCH)
def test_the_burn_out_of_a_circle_raises_the_energy_to_that_of_the_ellipse(r1, stretch):
    r2 = r1 * stretch
    speed = math.sqrt(GM / r1) + float(hohmann(r1, r2, GM).departure_km_s)
    assert 0.5 * speed**2 - GM / r1 == pytest.approx(-GM / (r1 + r2), rel=1e-12 * (1.0 + stretch))


@given(RADIUS, RADIUS, st.floats(1.0, 100.0))
def test_both_half_ellipses_keep_their_momentum_and_meet_the_circles(r1, r2, stretch):
    r_mid = max(r1, r2) * stretch
    flight = bielliptic(r1, r2, r_mid, GM)
    outward = (math.sqrt(GM / r1) + float(flight.departure_km_s)) * r1 / r_mid
    inward = outward + math.copysign(float(flight.middle_km_s), r2 - r1)
    arriving = inward * r_mid / r2
    # going in, the target's circle is slower than the ellipse that comes down to it
    assert arriving - float(flight.arrival_km_s) == pytest.approx(math.sqrt(GM / r2), rel=1e-9)


@given(RADIUS, RADIUS)
def test_at_the_larger_radius_the_bielliptic_is_hohmanns_with_half_a_circle_more(r1, r2):
    larger = max(r1, r2)
    flight, plain = bielliptic(r1, r2, larger, GM), hohmann(r1, r2, GM)
    assert float(flight.total_km_s) == pytest.approx(float(plain.total_km_s), rel=1e-9, abs=1e-12)
    half_circle = math.pi * math.sqrt(larger**3 / GM)
    assert float(flight.tof_s - plain.tof_s) == pytest.approx(half_circle, rel=1e-9)


@given(RADIUS, RADIUS, st.floats(1.0, 1e6))
def test_the_mid_radius_of_a_flight_time_gives_that_time_back(r1, r2, stretch):
    r_mid = max(r1, r2) * stretch
    found = float(bielliptic_mid_radius(float(bielliptic(r1, r2, r_mid, GM).tof_s), r1, r2, GM))
    if math.isnan(found):  # the time of the least radius, rounded down
        assert stretch == pytest.approx(1.0, abs=1e-9)
    else:
        assert found == pytest.approx(r_mid, rel=1e-13)


@settings(max_examples=30, deadline=None)
@given(RADIUS, RADIUS, st.floats(1.0, 1e4))
def test_the_mid_radius_agrees_with_fifty_digits(r1, r2, stretch):
    tof = float(bielliptic(r1, r2, max(r1, r2) * (1.0 + 1e-9) * stretch, GM).tof_s)
    found = bielliptic_mid_radius(tof, r1, r2, GM)
    with mp.workdps(50):

        def late(r_mid):
            halves = (((r + r_mid) / 2) ** 3 / mpf(GM) for r in (mpf(r1), mpf(r2)))
            return mp.pi * sum(mp.sqrt(half) for half in halves) - mpf(tof)

        exact = mp.findroot(late, mpf(float(found)) * mpf("1.001"))
        assert float(found) == pytest.approx(float(exact), rel=1e-14)


def test_a_time_too_short_for_two_half_ellipses_has_no_mid_radius():
    least = float(bielliptic(1.5e8, 2.3e8, 2.3e8, GM).tof_s)
    times = np.array([-1.0, 0.0, 0.5 * least, least * (1.0 - 1e-12), np.nan, np.inf])
    assert np.isnan(bielliptic_mid_radius(times, 1.5e8, 2.3e8, GM)).all()
    assert bielliptic_mid_radius(least * (1.0 + 1e-12), 1.5e8, 2.3e8, GM) == pytest.approx(2.3e8, rel=1e-9)


def test_transfers_of_arrays_are_those_of_their_elements():
    r1, r2 = np.array([[1.0e8], [2.0e8]]), np.array([1.5e8, 3.0e8, 9.0e8])
    r_mid = bielliptic_mid_radius(1e9, r1, r2, GM)
    flight = bielliptic(r1, r2, r_mid, GM)
    assert flight.total_km_s.shape == (2, 3)
    for i in range(2):
        for j in range(3):
            alone = bielliptic_mid_radius(1e9, r1[i, 0], r2[j], GM)
            assert r_mid[i, j] == pytest.approx(float(alone), rel=1e-14)
            total = float(bielliptic(r1[i, 0], r2[j], alone, GM).total_km_s)
            assert flight.total_km_s[i, j] == pytest.approx(total, rel=1e-13)


@settings(max_examples=300, deadline=None)  # the first call compiles
@given(st.floats(0.2, 12.0), st.floats(0.01, 2.0 * math.pi - 0.01), st.floats(0.05, 6.0), st.integers(0, 2))
def test_no_two_impulse_flight_between_circles_beats_the_hohmann_floor(ratio, angle, time, revs):
    """Neither in the sum of both burns nor in either one, whatever angle, time and revolutions."""
    r1 = np.array([1.496e8, 0.0, 0.0])
    r2 = 1.496e8 * ratio * np.array([math.cos(angle), math.sin(angle), 0.0])
    floor = hohmann(1.496e8, 1.496e8 * ratio, GM)
    tof = time * (1 + revs) * float(floor.tof_s)
    circle1 = math.sqrt(GM / 1.496e8) * np.array([0.0, 1.0, 0.0])
    circle2 = math.sqrt(GM / (1.496e8 * ratio)) * np.array([-math.sin(angle), math.cos(angle), 0.0])
    for branch in ("left", "right") if revs else ("left",):
        v1, v2 = lambert(r1, r2, tof, GM, revs=revs, branch=branch, pole=(0.0, 0.0, 1.0))
        if np.isnan(v1).any():
            continue
        departure, arrival = np.linalg.norm(v1 - circle1), np.linalg.norm(v2 - circle2)
        assert departure >= float(floor.departure_km_s) - 1e-9
        assert arrival >= float(floor.arrival_km_s) - 1e-9
        assert departure + arrival >= float(floor.total_km_s) - 1e-9

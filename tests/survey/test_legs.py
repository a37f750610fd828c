"""Legs over grids of dates, against one-at-a-time solutions and two-body motion."""

import numpy as np
import pytest

from porkgrid import lambert
from porkgrid.physics.conics import propagate
from porkgrid.physics.constants import DAY_S, GM_SUN_KM3_S2
from porkgrid.physics.lambert import ECLIPTIC_POLE_ICRF, FLOWN, NO_TRANSFER, NOT_AFTER
from porkgrid.survey.legs import LegOption, energy_and_arrival_speed, leg_options, solve_leg

OPTIONS = [
    LegOption(),
    LegOption(retrograde=True),
    LegOption(1, False),
    LegOption(1, True),
    LegOption(1, True, retrograde=True),
]


@pytest.fixture(params=OPTIONS, ids=str)
def option(request):
    return request.param


@pytest.fixture
def leg(loops, option):
    return solve_leg(*loops.tables, option)


def test_a_leg_without_revolutions_has_one_option():
    assert leg_options(0, retrograde=False) == [LegOption(0, False, False)]


def test_every_revolution_adds_both_branches_in_the_leg_s_direction():
    found = leg_options(2, retrograde=True)
    assert [(each.revs, each.branch) for each in found] == [(0, 0), (1, -1), (1, 1), (2, -1), (2, 1)]
    assert all(each.retrograde for each in found)


def test_every_cell_is_the_flight_between_its_own_two_dates(loops, leg, option):
    departure, arrival = loops.tables
    v1, v2 = lambert(
        departure.position.T[:, None],
        arrival.position.T[None, :],
        (arrival.jd[None, :] - departure.jd[:, None]) * DAY_S,
        GM_SUN_KM3_S2,
        revs=option.revs,
        branch="right" if option.right else "left",
        retrograde=option.retrograde,
    )
    out = v1 - departure.velocity.T[:, None]
    into = v2 - arrival.velocity.T[None, :]
    np.testing.assert_allclose(leg.v_inf_out, np.moveaxis(out, -1, 0), rtol=1e-9, atol=1e-9)
    np.testing.assert_allclose(leg.v_inf_in, np.moveaxis(into, -1, 0), rtol=1e-9, atol=1e-9)


def test_two_body_motion_from_departure_meets_the_body_at_arrival(loops, leg):
    i, j = np.nonzero(leg.status == FLOWN)
    assert len(i) > 100
    departure, arrival = loops.tables
    v1 = leg.v_inf_out[:, i, j] + departure.velocity[:, i]
    r2, v2 = propagate(departure.position[:, i].T, v1.T, leg.tof_days[i, j] * DAY_S, GM_SUN_KM3_S2)
    miss = np.linalg.norm(r2 - arrival.position[:, j].T, axis=1)
    assert miss.max() < 1.0  # km, after up to three years: 1e-8 of the distance
    np.testing.assert_allclose(v2.T - arrival.velocity[:, j], leg.v_inf_in[:, i, j], rtol=0.0, atol=1e-6)


def test_cells_say_how_they_are_flown(leg, option):
    assert np.all(leg.revs == option.revs)
    assert np.all(leg.branch == option.branch)


def test_too_short_for_a_revolution_is_no_transfer_and_not_a_number(loops):
    leg = solve_leg(*loops.tables, LegOption(1, False))
    short = leg.status == NO_TRANSFER
    assert short.any()
    assert not short.all()
    assert leg.tof_days[short].min() < leg.tof_days[leg.status == FLOWN].min()
    assert np.array_equal(np.isnan(leg.v_inf_out).all(axis=0), leg.status != FLOWN)
    assert np.array_equal(np.isnan(leg.v_inf_in).all(axis=0), leg.status != FLOWN)
    assert np.array_equal(np.isnan(leg.transfer_angle_rad), leg.status != FLOWN)


def test_arrival_before_or_at_departure_is_no_flight(rook):
    leg = solve_leg(*rook.tables, LegOption())
    backward = leg.tof_days <= 0.0
    assert backward.any()
    assert np.array_equal(leg.status == NOT_AFTER, backward)
    assert np.isnan(leg.v_inf_out[:, backward]).all()


def test_an_arc_with_a_revolution_reaches_both_apsides_of_its_ellipse(loops):
    leg = solve_leg(*loops.tables, LegOption(1, False))
    least, greatest = leg.sun_range_km
    flown = leg.status == FLOWN
    v1 = (leg.v_inf_out + leg.body_velocity1)[:, flown]
    r1 = np.broadcast_to(leg.r1, leg.v_inf_out.shape)[:, flown]
    energy = 0.5 * np.sum(v1**2, axis=0) - GM_SUN_KM3_S2 / np.linalg.norm(r1, axis=0)
    np.testing.assert_allclose(least[flown] + greatest[flown], -GM_SUN_KM3_S2 / energy, rtol=1e-9)


def test_the_lean_grid_has_the_energies_and_speeds_of_the_full_one(rook):
    departure, arrival = rook.tables
    c3, speed = np.empty(rook.shape), np.empty(rook.shape)
    energy_and_arrival_speed(
        departure.jd, departure.position, departure.velocity,
        arrival.jd, arrival.position, arrival.velocity,
        GM_SUN_KM3_S2, np.array(ECLIPTIC_POLE_ICRF), 1.0, c3, speed,
    )  # fmt: skip
    leg = solve_leg(departure, arrival, LegOption())
    np.testing.assert_allclose(c3, np.sum(leg.v_inf_out**2, axis=0), rtol=1e-12)
    np.testing.assert_allclose(speed, np.sqrt(np.sum(leg.v_inf_in**2, axis=0)), rtol=1e-12)

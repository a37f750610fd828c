"""Leg tables: what limits allow of a leg and what it costs, and legs that come back to their own body."""

from dataclasses import replace

import numpy as np
import pytest
from survey_scenarios import limited

from porkgrid.physics.conics import propagate
from porkgrid.physics.constants import DAY_S, GM_SUN_KM3_S2
from porkgrid.physics.lambert import FLOWN, NO_PLANE
from porkgrid.sky.bodies import BODIES
from porkgrid.sky.states import StateTable
from porkgrid.survey.legs import LegOption, leg_options, solve_leg
from porkgrid.survey.legtables import PASSED, concerns, ends_failed, leg_table
from porkgrid.survey.limits import REASONS, flag_names

# Venus twice and the Earth twice, so that legs 2 and 4 come back to their own body.
LOOPING = """
name = "Dotterel round and round"

[[encounter]]
body = "earth"
first = 2031-05-01
last = 2031-06-30
step_days = 20.0
parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200 }

[[encounter]]
body = "venus"
first = 2031-10-01
last = 2031-12-31
step_days = 15.0

[[encounter]]
body = "venus"
first = 2032-08-01
last = 2033-06-30
step_days = 11.0

[[encounter]]
body = "earth"
first = 2033-09-01
last = 2034-05-31
step_days = 30.0

[[encounter]]
body = "earth"
first = 2035-12-01
last = 2036-11-30
step_days = 24.0

[[encounter]]
body = "jupiter"
first = 2038-06-01
last = 2040-06-30
step_days = 90.0
capture = { periapsis_altitude_km = 300_000, apoapsis_altitude_km = 20_000_000 }

[[leg]]
[[leg]]
max_revs = 1
[[leg]]
[[leg]]
max_revs = 2
[[leg]]

[limits]
c3_km2_s2 = { max = 30 }
leg2_tof_days = { min = 300 }
sun_min_au = { min = 0.5 }
tof_days = { max = 3000 }
v_inf_arrival_km_s = { max = 8 }
"""
YEAR_DAYS = {"venus": 224.701, "earth": 365.256}  # sidereal; NASA planetary fact sheets (memory)


@pytest.fixture(scope="module")
def looping(plan_of):
    return plan_of(LOOPING)


def tables(plan):
    return [leg_table(plan, n, *plan.tables[n - 1 : n + 1]) for n in range(1, len(plan.options) + 1)]


@pytest.fixture(scope="module")
def legs(looping):
    return tables(looping)


# From a body back to itself


@pytest.fixture(params=[2, 4], ids=["Venus to Venus", "Earth to Earth"])
def loop(request, looping, legs):
    """The plan's tables at both ends of the leg, and its options."""
    number = request.param
    return *looping.tables[number - 1 : number + 1], legs[number - 1]


def turns_of_the_body(here, there):
    """(a, b) revolutions that the body itself makes between the dates."""
    return (there.jd[None, :] - here.jd[:, None]) / YEAR_DAYS[here.body.name]


def test_a_leg_back_to_its_own_body_meets_it_with_any_number_of_revolutions(loop):
    here, there, table = loop
    for leg in table.options:
        i, j = np.nonzero(leg.status == FLOWN)
        assert len(i) > 50
        r, v = propagate(
            here.position[:, i].T,
            (leg.v_inf_out[:, i, j] + here.velocity[:, i]).T,
            (there.jd[j] - here.jd[i]) * DAY_S,
            GM_SUN_KM3_S2,
        )
        np.testing.assert_allclose(r.T, there.position[:, j], rtol=0, atol=1.0)  # km
        np.testing.assert_allclose(v.T - there.velocity[:, j], leg.v_inf_in[:, i, j], atol=1e-6)


def test_one_of_the_ways_back_is_the_bodys_own_orbit_and_the_others_leave_it(loop):
    """With as many revolutions as the body makes. Its orbit is nearly two-body motion, so v∞ is nearly 0."""
    here, there, table = loop
    turns = turns_of_the_body(here, there)
    away = np.abs(turns - np.round(2.0 * turns) / 2.0) > 0.1  # from resonance, and from half a turn
    speeds = np.array([np.linalg.norm(leg.v_inf_out, axis=0) for leg in table.options])
    same = np.array([leg.revs == np.floor(turns) for leg in table.options])
    assert (away & same.any(axis=0)).sum() > 20
    own = np.nanmin(np.where(same, speeds, np.nan)[:, away & same.any(axis=0)], axis=0)
    assert own.max() < 0.1  # km/s
    second = np.sort(speeds[:, away & same.any(axis=0)], axis=0)[1]
    assert np.nanmin(second) > 0.3


def exactly_back(turns: int, off_km: float = 0.0) -> tuple[StateTable, StateTable]:
    """Tables of a Venus that moves on a circle, and is where it was after some whole turns."""
    venus = BODIES["venus"]
    radius = 1.08e8
    speed = np.sqrt(GM_SUN_KM3_S2 / radius)
    period = 2.0 * np.pi * radius / speed / DAY_S
    angle = np.radians([10.0, 100.0, 200.0, 300.0])
    position = radius * np.array([np.cos(angle), np.sin(angle), 0.0 * angle])
    velocity = speed * np.array([-np.sin(angle), np.cos(angle), 0.0 * angle])
    jd = 2463000.5 + angle / (2.0 * np.pi) * period
    return (
        StateTable(venus, jd, position, velocity),
        StateTable(venus, jd + turns * period, position + off_km * velocity / speed, velocity),
    )


@pytest.mark.parametrize("option", leg_options(2, retrograde=False), ids=str)
def test_at_an_exact_resonance_the_plane_is_said_to_be_undefined(option):
    """Every plane through the Sun and the one point holds a flight: none of them is the answer."""
    leg = solve_leg(*exactly_back(2), option)
    np.testing.assert_array_equal(np.diagonal(leg.status), NO_PLANE)
    assert np.isnan(np.diagonal(leg.v_inf_out, axis1=1, axis2=2)).all()
    others = ~np.eye(4, dtype=bool)
    assert not np.any(leg.status[others] == NO_PLANE)


def test_a_resonance_is_undefined_in_the_table_whatever_the_limits(looping):
    plan = looping
    here, there = exactly_back(3)
    for number in (2, 4):
        failed = leg_table(plan, number, here, there).failed
        assert np.all(np.diagonal(failed, axis1=1, axis2=2) == list(REASONS).index("plane_undefined"))


def test_close_to_a_resonance_there_is_a_flight():
    """A thousand kilometres off are two seconds of arc, and the plane is that of the two positions."""
    here, there = exactly_back(1, off_km=1000.0)
    leg = solve_leg(here, there, LegOption(1, False))
    assert np.all(np.diagonal(leg.status) == FLOWN)


# What limits allow, and what it costs


def test_the_first_reason_or_limit_that_forbids_a_leg_is_kept(looping, legs):
    names = flag_names(looping.bounds)
    for number, table in enumerate(legs, start=1):
        for leg, failed in zip(table.options, table.failed, strict=True):
            flown = leg.status == FLOWN
            assert np.all(failed[~flown] < len(REASONS))
            expected = np.where(flown, PASSED, failed)
            for bound in reversed(looping.bounds):
                values = of_leg(looping, number, bound.measure.name, leg)
                if values is not None:
                    expected = np.where(
                        flown & bound.forbids(values), names.index(bound.measure.name), expected
                    )
            np.testing.assert_array_equal(failed, expected)
            assert np.array_equal(table.valid, table.failed == PASSED)


def of_leg(plan, number, name, leg):
    """A limited measure as leg `number` alone has it, from the leg's own vectors; None where it has none."""
    if name == "c3_km2_s2" and number == 1:
        return np.sum(leg.v_inf_out**2, axis=0)
    if name == "leg2_tof_days" and number == 2:
        return leg.tof_days
    if name == "v_inf_arrival_km_s" and number == len(plan.options):
        return np.linalg.norm(leg.v_inf_in, axis=0)
    if name == "sun_min_au":
        return leg.sun_range_km[0] / 149_597_870.7
    return None


def test_each_limit_forbids_some_leg(looping, legs):
    """Else the test above would compare nothing."""
    names = np.array(flag_names(looping.bounds))
    found = {name for table in legs for name in names[np.unique(table.failed[~table.valid])]}
    assert {"c3_km2_s2", "leg2_tof_days", "v_inf_arrival_km_s", "sun_min_au"} <= found


def test_only_the_first_leg_pays_for_departure_and_only_the_last_for_capture(looping, legs):
    departure, capture = (looping.measures[name] for name in ("dv_departure_km_s", "dv_capture_km_s"))
    assert concerns(departure, 1, 5)
    assert not concerns(departure, 5, 5)
    assert concerns(capture, 5, 5)
    for table in legs[1:-1]:
        assert not table.cost.any()
        assert not table.dv.any()
    for table in (legs[0], legs[-1]):
        np.testing.assert_array_equal(table.cost, table.dv)  # ranked by the total
        assert np.all(table.dv[table.valid] > 0.3)


def test_a_search_for_the_most_has_costs_of_the_opposite_sign(plan_of):
    ranked = LOOPING + '\n[rank]\nby = "v_inf_arrival_km_s"\norder = "most"\n'
    plan = plan_of(limited(ranked, ""))
    last = leg_table(plan, 5, *plan.tables[4:6])
    flown = last.options[0].status == FLOWN
    speed = np.linalg.norm(last.options[0].v_inf_in, axis=0)
    np.testing.assert_allclose(last.cost[0][flown], -speed[flown], rtol=1e-14)


def test_legs_that_are_the_same_are_flown_once(looping):
    ends = looping.tables[1:3]
    one, again = leg_table(looping, 2, *ends), leg_table(looping, 2, *ends)
    assert all(a is b for a, b in zip(one.options, again.options, strict=True))


def test_fields_are_gathered_at_each_cells_own_option_and_dates(legs):
    table = legs[1]
    option, i, j = np.array([[0, 1], [2, 1]]), np.array([[0], [3]]), np.array([[4, 7]])
    for name in ("v_inf_out", "v_inf_in", "revs", "branch"):
        found = table.gather(name, option, i, j)
        for row, column in np.ndindex(2, 2):
            field = getattr(table.options[option[row, column]], name)
            expected = field[..., i[row, 0], j[0, column]]
            np.testing.assert_array_equal(found[..., row, column], expected)


def test_limits_on_both_ends_forbid_cells_not_legs(looping):
    departure, arrival = looping.tables[0].jd, looping.tables[-1].jd
    failed = ends_failed(looping, departure, arrival)
    late = arrival[None, :] - departure[:, None] > 3000.0
    assert late.any()
    assert not late.all()
    np.testing.assert_array_equal(
        failed, np.where(late, flag_names(looping.bounds).index("tof_days"), PASSED)
    )


def test_without_limits_every_leg_that_can_be_flown_is_valid(looping):
    free = replace(looping, bounds=())
    for table in tables(free):
        for leg, valid in zip(table.options, table.valid, strict=True):
            np.testing.assert_array_equal(valid, leg.status == FLOWN)

"""Cells of routes with flybys: what is stored of the route chosen, and what is blamed where there is none."""

import numpy as np
import pytest
from flyby_ways import every_way
from survey_scenarios import changed, limited

from porkgrid.physics.lambert import FLOWN
from porkgrid.survey.candidates import Picked, measures_at
from porkgrid.survey.limits import REASON_OF_STATUS, REASONS, flag_names
from porkgrid.survey.measures import ARRIVAL, DEPARTURE, ENDS, EVERY_LEG, LEG
from porkgrid.survey.routes import route_cells

# Limits of every kind that a search applies, each of which costs some cells their last route.
GODWIT = """
name = "Godwit by Venus"

[[encounter]]
body = "earth"
first = 2033-08-01
last = 2034-12-31
step_days = 10.0
parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200 }

[[encounter]]
body = "venus"
first = 2034-09-01
last = 2035-03-31
step_days = 3.0
flyby = { min_altitude_km = 300, max_burn_km_s = 1.5 }

[[encounter]]
body = "mars"
first = 2034-08-01
last = 2037-03-31
step_days = 20.0
capture = { periapsis_altitude_km = 400, apoapsis_altitude_km = 33000 }

[[leg]]
max_revs = 1

[[leg]]
max_revs = 0

[limits]
c3_km2_s2 = { max = 60 }
tof_days = { max = 900 }
flyby1_turn_deg = { max = 50 }
leg2_tof_days = { min = 90 }
v_inf_arrival_km_s = { max = 15 }
sun_min_au = { min = 0.55 }
flyby1_gain_km_s = { min = 1, max = 5 }
dv_total_km_s = { max = 12 }
"""

CHAIN = """
name = "Gannet by Venus and Earth"

[[encounter]]
body = "earth"
first = 2037-09-01
last = 2037-11-15
step_days = 5.0
parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200 }

[[encounter]]
body = "venus"
first = 2038-01-04
last = 2038-02-04
step_days = 2.0
flyby = { min_altitude_km = 300, max_burn_km_s = 0.6 }

[[encounter]]
body = "earth"
first = 2040-11-01
last = 2040-12-01
step_days = 2.0
flyby = { min_altitude_km = 300, max_burn_km_s = 1.0 }

[[encounter]]
body = "jupiter"
first = 2043-06-01
last = 2044-08-31
step_days = 40.0

[[leg]]
[[leg]]
max_revs = 1
[[leg]]

[limits]
c3_km2_s2 = { max = 25 }
tof_days = { max = 2600 }
v_inf_arrival_km_s = { max = 8 }
"""


def swept(plan):
    return route_cells(plan, slice(None), slice(None))


@pytest.fixture(scope="module")
def godwit(plan_of):
    return plan_of(GODWIT)


@pytest.fixture(scope="module")
def chain(plan_of):
    return plan_of(CHAIN)


@pytest.fixture(scope="module")
def godwit_cells(godwit):
    return swept(godwit)


@pytest.fixture(scope="module", params=["godwit", "chain"])
def route(request):
    """A plan of one flyby and one of two, with their cells and what blocks them."""
    plan = request.getfixturevalue(request.param)
    return plan, *swept(plan)


def in_documented_order(plan):
    """Bits of the limits in the order in which they are looked at, after the reasons."""
    bits = list(enumerate(plan.bounds, start=len(REASONS)))
    of_legs = [bit for bit, b in bits if b.measure.scope in (DEPARTURE, ARRIVAL, LEG, EVERY_LEG)]
    of_ends = [bit for bit, b in bits if b.measure.scope == ENDS]
    names = flag_names(plan.bounds)
    last = ["flyby1_altitude_km", "flyby1_turn_deg", "flyby1_burn_km_s", "flyby1_gain_km_s", "dv_total_km_s"]
    return of_legs + of_ends + [names.index(name) for name in last if name in names]


def blamed_by_hand(plan):
    """For every cell the bit of the limit at which the way that came furthest ended; −1 where one passes."""
    order = in_documented_order(plan)
    assert sorted(order) == list(range(len(REASONS), len(REASONS) + len(plan.bounds)))
    furthest = np.full(plan.shape, -1)
    for cells in every_way(plan):
        ended = np.full(plan.shape, len(REASONS) + len(order))  # a place in the order, past its end: allowed
        for place, bit in reversed(list(enumerate(order, start=len(REASONS)))):
            bound = plan.bounds[bit - len(REASONS)]
            ended[np.broadcast_to(bound.forbids(bound.measure.compute(cells)), plan.shape)] = place
        reason = np.full(plan.shape, 99)
        for leg in cells.legs:
            for status, bit in REASON_OF_STATUS.items():
                reason = np.where(leg.status == status, np.minimum(reason, bit), reason)
        furthest = np.maximum(furthest, np.minimum(ended, reason))
    return np.array([*range(len(REASONS)), *order, -1])[furthest]


def bit_of(blocked):
    """The one bit that is set, −1 where there is none."""
    assert np.all(np.bitwise_count(blocked) <= 1)
    return np.where(blocked == 0, -1, np.log2(np.maximum(blocked, 1)).astype(int))


def test_what_blocks_a_cell_is_the_limit_that_removed_its_last_way(godwit, godwit_cells):
    _, blocked = godwit_cells
    np.testing.assert_array_equal(bit_of(blocked), blamed_by_hand(godwit))


def test_each_kind_of_limit_is_to_blame_somewhere(godwit, godwit_cells):
    """Else the test above would compare less than it says."""
    _, blocked = godwit_cells
    names = np.array(["", *flag_names(godwit.bounds)])
    found = set(names[np.unique(bit_of(blocked)) + 1])
    assert {"", "arrival_before_departure", "c3_km2_s2", "leg2_tof_days", "tof_days"} <= found
    assert {"flyby1_altitude_km", "flyby1_burn_km_s", "flyby1_turn_deg"} <= found
    assert {"flyby1_gain_km_s", "dv_total_km_s", "v_inf_arrival_km_s", "sun_min_au"} <= found


@pytest.mark.parametrize(
    ("name", "limits"),
    [
        ("flyby1_gain_km_s", "flyby1_gain_km_s = { min = 30 }"),
        ("dv_total_km_s", "dv_total_km_s = { max = 1 }"),
        ("v_inf_arrival_km_s", "v_inf_arrival_km_s = { max = 0.5 }"),
        ("sun_min_au", "sun_min_au = { min = 0.8 }"),
        ("flyby1_turn_deg", "flyby1_turn_deg = { min = 179 }"),
        ("flyby1_altitude_km", "flyby1_altitude_km = { min = 3e7 }"),
    ],
)
def test_a_limit_that_nothing_meets_is_the_one_that_is_blamed(plan_of, name, limits):
    plan = plan_of(limited(GODWIT, limits))
    _, blocked = swept(plan)
    assert not np.any(blocked == 0)
    np.testing.assert_array_equal(bit_of(blocked), blamed_by_hand(plan))
    assert np.any(bit_of(blocked) == flag_names(plan.bounds).index(name))


def test_a_cell_is_allowed_where_its_route_is_flown_and_keeps_every_limit(route):
    plan, cells, blocked = route
    allowed = blocked == 0
    assert allowed.any()
    assert not allowed.all()
    np.testing.assert_array_equal(cells.status == FLOWN, allowed)
    for bound in plan.bounds:
        values = np.broadcast_to(bound.measure.compute(cells), plan.shape)
        assert not bound.forbids(values)[allowed].any(), bound.title


def test_a_cell_without_a_route_has_no_measures_of_one(route):
    plan, cells, blocked = route
    for name in (
        "c3_km2_s2",
        "flyby1_epoch_jd_tdb",
        "flyby1_altitude_km",
        "v_inf_arrival_km_s",
        "sun_min_au",
    ):
        values = np.broadcast_to(plan.measures[name].compute(cells), plan.shape)
        np.testing.assert_array_equal(np.isnan(values), blocked != 0)


def test_measures_of_a_cell_are_those_of_a_route_flown_on_its_dates_with_its_options(route):
    plan, cells, blocked = route
    values = {
        name: np.broadcast_to(measure.compute(cells), plan.shape) for name, measure in plan.measures.items()
    }
    allowed = np.argwhere(blocked == 0)
    revolutions = set()
    for i, k in allowed[:: max(1, len(allowed) // 40)]:
        stops = ["departure", *(f"flyby{n}" for n in range(1, plan.flybys + 1)), "arrival"]
        epochs = tuple(float(values[f"{stop}_epoch_jd_tdb"][i, k]) for stop in stops)
        options = tuple(
            next(
                option
                for option in each
                if (option.revs, option.branch)
                == (values[f"leg{n}_revs"][i, k], values[f"leg{n}_branch"][i, k])
            )
            for n, each in enumerate(plan.options, start=1)
        )
        revolutions |= {option.revs for option in options}
        alone = measures_at(plan, Picked(epochs, options))
        for name, value in alone.items():
            assert values[name][i, k] == pytest.approx(value, rel=1e-9, abs=1e-9), name
    assert revolutions == {0, 1}


def test_rows_swept_by_themselves_are_those_of_the_whole_grid(route):
    plan, cells, blocked = route
    rows = slice(3, 9)
    part, blocked_there = route_cells(plan, rows, slice(None))
    np.testing.assert_array_equal(blocked_there, blocked[rows])
    for name, measure in plan.measures.items():
        everywhere = np.broadcast_to(measure.compute(cells), plan.shape)[rows]
        there = np.broadcast_to(measure.compute(part), blocked_there.shape)
        np.testing.assert_array_equal(there, everywhere, err_msg=name)


@pytest.mark.parametrize(
    ("change", "name"),
    [
        (("c3_km2_s2 = { max = 25 }", "c3_km2_s2 = { max = 1 }"), "c3_km2_s2"),
        (("tof_days = { max = 2600 }", "tof_days = { max = 1900 }"), "tof_days"),
        (("tof_days = { max = 2600 }", "leg2_tof_days = { max = 90 }"), "leg2_tof_days"),
        (("v_inf_arrival_km_s = { max = 8 }", "v_inf_arrival_km_s = { max = 2 }"), "v_inf_arrival_km_s"),
        (("300, max_burn_km_s = 0.6", "90000, max_burn_km_s = 0.6"), "flyby1_altitude_km"),
        (("max_burn_km_s = 0.6", "max_burn_km_s = 1e-7"), "flyby1_burn_km_s"),
        (("300, max_burn_km_s = 1.0", "90000, max_burn_km_s = 1.0"), "flyby2_altitude_km"),
        (("max_burn_km_s = 1.0", "max_burn_km_s = 1e-7"), "flyby2_burn_km_s"),
    ],
)
def test_a_chain_blames_the_encounter_at_which_it_ends(plan_of, change, name):
    plan = plan_of(changed(CHAIN, change))
    _, blocked = swept(plan)
    blamed = bit_of(blocked)
    assert not np.any(blamed == -1)
    bit = flag_names(plan.bounds).index(name)
    earlier = [flag_names(plan.bounds).index(other) for other in ("c3_km2_s2", "flyby1_altitude_km")]
    assert np.all(np.isin(blamed, [bit, *earlier]))
    assert np.mean(blamed == bit) > 0.5

"""Which option a cell keeps, against trying them all one cell at a time."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from survey_scenarios import LOOPS, changed, limited

from porkgrid.physics.lambert import FLOWN
from porkgrid.survey.cells import Cells
from porkgrid.survey.legs import solve_leg
from porkgrid.survey.limits import Bound
from porkgrid.survey.routes import route_cells


def options_of(plan):
    """(revs, branch), status, rank measure and the limited measures of every option, (n, m) each."""
    for option in plan.options[0]:
        leg = solve_leg(*plan.tables, option)
        cells = Cells(*plan.tables, plan.earth_at_arrival, [leg], plan.parking, plan.capture)
        rank = np.broadcast_to(plan.measures[plan.rank_by].compute(cells), plan.shape)
        values = [np.broadcast_to(b.measure.compute(cells), plan.shape) for b in plan.bounds]
        yield (option.revs, option.branch), leg.status, rank, values


def by_hand(plan):
    """(revs, branch) and whether it is allowed, per cell, by looking at each cell's options in turn."""
    options = list(options_of(plan))
    choice = {}
    for cell in np.ndindex(plan.shape):
        flown = []
        for which, status, rank, values in options:
            if status[cell] != FLOWN:
                continue
            inside = [
                (b.least is None or value[cell] >= b.least) and (b.most is None or value[cell] <= b.most)
                for b, value in zip(plan.bounds, values, strict=True)
            ]
            flown.append((not all(inside), plan.rank_sign * rank[cell], which))
        choice[cell] = min(flown) if flown else None
    return choice


def assert_keeps_the_best(plan):
    cells, blocked = route_cells(plan, slice(None), slice(None))
    leg = cells.legs[0]
    kept = set()
    for cell, best in by_hand(plan).items():
        if best is None:
            assert blocked[cell] != 0
            continue
        forbidden, _, which = best
        assert (leg.revs[cell], leg.branch[cell]) == which
        assert (blocked[cell] != 0) == forbidden
        kept.add(which)
    return kept


def test_a_cell_keeps_the_best_option_that_the_limits_allow(loops):
    assert assert_keeps_the_best(loops) == {(0, 0), (1, -1), (1, 1)}


@settings(max_examples=12, deadline=None)
@given(
    st.floats(5.0, 200.0),
    st.floats(0.3, 1.0),
    st.sampled_from(["c3_km2_s2", "v_inf_arrival_km_s", "sun_max_au", "leg1_transfer_angle_deg"]),
    st.sampled_from([1.0, -1.0]),
)
def test_a_cell_keeps_the_best_allowed_option_whatever_the_limits_and_the_ranking(
    loops, c3_max, sun_min, rank_by, sign
):
    bounds = (
        Bound(loops.measures["c3_km2_s2"], None, c3_max),
        Bound(loops.measures["sun_min_au"], sun_min, None),
    )
    assert_keeps_the_best(replace(loops, bounds=bounds, rank_by=rank_by, rank_sign=sign))


def test_an_allowed_option_is_kept_over_a_better_ranking_one_that_a_limit_forbids(loops):
    slow = replace(loops, bounds=(Bound(loops.measures["v_inf_arrival_km_s"], None, 4.0),))
    chosen, blocked = route_cells(slow, slice(None), slice(None))
    free, _ = route_cells(replace(loops, bounds=()), slice(None), slice(None))
    gave_way = (blocked == 0) & (chosen.c3 > free.c3)
    assert gave_way.any()
    assert np.all(free.v_inf_arrival[gave_way] > 4.0)
    assert np.all(chosen.v_inf_arrival[gave_way] <= 4.0)


def test_where_no_option_is_allowed_the_best_ranking_one_stands(loops):
    hopeless = replace(loops, bounds=(Bound(loops.measures["c3_km2_s2"], None, 0.0),))
    cells, blocked = route_cells(hopeless, slice(None), slice(None))
    free, _ = route_cells(replace(loops, bounds=()), slice(None), slice(None))
    assert np.all(blocked != 0)
    np.testing.assert_array_equal(cells.c3, free.c3)


def test_everything_about_a_cell_belongs_to_the_option_that_it_keeps(loops):
    """Vectors, revolutions and ranges must not be a mixture of options."""
    cells, _ = route_cells(loops, slice(None), slice(None))
    kept = cells.legs[0]
    for option in loops.options[0]:
        leg = solve_leg(*loops.tables, option)
        here = (kept.revs == option.revs) & (kept.branch == option.branch) & (kept.status == FLOWN)
        assert here.any()
        for name in ("v_inf_out", "v_inf_in"):
            np.testing.assert_array_equal(getattr(kept, name)[:, here], getattr(leg, name)[:, here])
        for one, other in zip(kept.sun_range_km, leg.sun_range_km, strict=True):
            np.testing.assert_array_equal(one[here], other[here])


@pytest.mark.parametrize("name", ["rook", "loops"])
def test_a_block_of_the_grid_is_what_the_whole_grid_has_there(name, request):
    plan = request.getfixturevalue(name)
    rows, columns = slice(3, 11), slice(20, 33)
    whole, blocked = route_cells(plan, slice(None), slice(None))
    part, blocked_there = route_cells(plan, rows, columns)
    np.testing.assert_array_equal(blocked_there, blocked[rows, columns])
    for measure in plan.measures.values():
        everywhere = np.broadcast_to(measure.compute(whole), plan.shape)[rows, columns]
        there = np.broadcast_to(measure.compute(part), blocked_there.shape)
        np.testing.assert_allclose(there, everywhere, rtol=1e-11, atol=1e-11)


def test_without_limits_only_cells_that_cannot_be_flown_are_blocked(plan_of):
    plan = plan_of(limited(changed(LOOPS, ("max_revs = 1", "max_revs = 0")), ""))
    cells, blocked = route_cells(plan, slice(None), slice(None))
    assert np.array_equal(blocked != 0, cells.status != FLOWN)

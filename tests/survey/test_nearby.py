"""Measures of routes at dates near their own, against the same taken one by one from the kernel."""

from __future__ import annotations

import numpy as np
import pytest
from grid_candidates import changed_plan

from porkgrid.physics.flyby import periapsis_speeds
from porkgrid.sky.bodies import gm_of
from porkgrid.sky.states import state_table
from porkgrid.survey.candidates import Picked, measures_at
from porkgrid.survey.nearby import evaluation, measures_of, paired_cells
from porkgrid.survey.routes import cells_at

SCENARIO = "earth-venus-earth-jupiter-2037.toml"
EPOCHS = np.array(
    [
        [2465365.5, 2465500.5, 2466566.5, 2467550.5],
        [2465371.2, 2465491.7, 2466571.3, 2467700.1],
        [2465352.5, 2465520.5, 2466600.5, 2467600.5],
    ]
)


@pytest.fixture(scope="module")
def plan(tmp_path_factory):
    return changed_plan(tmp_path_factory.mktemp("jupiter"), SCENARIO)


@pytest.fixture(scope="module")
def picked(plan) -> list[Picked]:
    flown = [plan.options[1][n] for n in (2, 0, 1)]  # not all alike
    return [
        Picked(tuple(map(float, epochs)), (plan.options[0][0], option, plan.options[2][0]))
        for epochs, option in zip(EPOCHS, flown, strict=True)
    ]


def at_their_dates(plan, picked, sides):
    tables = [
        state_table(plan.ephemeris, table.body, EPOCHS[:, n].copy()) for n, table in enumerate(plan.tables)
    ]
    earth, _ = plan.ephemeris.states(plan.tables[0].body, EPOCHS[:, -1].copy())
    flown = [
        (options, np.array([options.index(one.options[leg]) for one in picked]))
        for leg, options in enumerate(plan.options)
    ]
    return paired_cells(plan, tables, earth, flown, sides)


def test_every_measure_is_that_of_its_route(plan, picked):
    together = measures_of(plan, picked)
    for found, one in zip(together, picked, strict=True):
        alone = measures_at(plan, one)
        assert list(found) == list(alone)
        assert found == pytest.approx(alone, rel=1e-10, abs=1e-10, nan_ok=True)


def test_one_sided_burns_have_the_sign_of_the_change_of_speed(plan, picked):
    sides = np.array([[1.0, 1.0, -1.0], [-1.0, 1.0, 0.0]])
    cells = at_their_dates(plan, picked, sides)
    for row, flyby in enumerate(cells.flybys):
        signed = flyby.burn_km_s[:, 0]
        for n, one in enumerate(picked):
            tables = [
                state_table(plan.ephemeris, table.body, np.array([jd]))
                for table, jd in zip(plan.tables, one.epochs, strict=True)
            ]
            alone = cells_at(plan, tables, list(one.options)).flybys[row]
            before, after = periapsis_speeds(alone.v_in, alone.v_out, gm_of(alone.body))
            change = float((after - before)[0, 0])
            wanted = abs(change) if sides[row, n] == 0.0 else sides[row, n] * change
            assert signed[n] == pytest.approx(wanted, rel=1e-6, nan_ok=True)


def test_an_evaluation_gives_cost_slacks_and_burns_of_the_routes_asked_for(plan, picked):
    spans = np.stack([EPOCHS - 3.0, EPOCHS + 3.0], axis=-1)
    evaluate = evaluation(plan, picked, spans)
    which = np.array([2, 0])
    shifts = np.array([0.0, 1.5])
    values = evaluate(which, EPOCHS[which][:, :, None] + shifts, np.zeros((2, 2)))
    for row, number in enumerate(which):
        for p, shift in enumerate(shifts):
            moved = Picked(tuple(EPOCHS[number] + shift), picked[number].options)
            there = measures_at(plan, moved)
            slacks = []
            for bound in plan.bounds:
                value = there[bound.measure.name]
                slacks += [] if bound.least is None else [value - bound.least]
                slacks += [] if bound.most is None else [bound.most - value]
            burns = [there["flyby1_burn_km_s"], there["flyby2_burn_km_s"]]
            wanted = [plan.rank_sign * there[plan.rank_by], *slacks, *burns]
            assert values[row, :, p] == pytest.approx(wanted, rel=1e-6, abs=1e-7, nan_ok=True)

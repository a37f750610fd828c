"""Routes: the best way to fly every cell of a block of the grid."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np

from porkgrid.physics.lambert import FLOWN
from porkgrid.sky.bodies import find_body
from porkgrid.sky.states import StateTable
from porkgrid.survey.cells import Cells, FlybyCells
from porkgrid.survey.flybyroutes import flyby_cells
from porkgrid.survey.legs import LegCells, LegOption, solve_leg
from porkgrid.survey.limits import blocked_by
from porkgrid.survey.plan import Plan


def route_cells(plan: Plan, rows: slice, columns: slice) -> tuple[Cells, np.ndarray]:
    """The cells of a block of the plan's grid, and what forbids each of them."""
    departure, arrival = _cut(plan.tables[0], rows), _cut(plan.tables[-1], columns)
    if plan.flybys:
        return flyby_cells(plan, plan.search, departure)
    return fly_between(plan, departure, arrival, plan.earth_at_arrival[:, columns])


def fly_between(
    plan: Plan, departure: StateTable, arrival: StateTable, earth_at_arrival: np.ndarray
) -> tuple[Cells, np.ndarray]:
    """The cells of any dates, with the options kept that rank best among those that the limits allow.

    Where the limits allow no option of a cell the best-ranking one stands, and what forbids it.
    """
    best: Cells | None = None
    for option in plan.options[0]:
        cells = _cells_of(plan, departure, arrival, earth_at_arrival, option)
        blocked = blocked_by(cells, plan.bounds)
        if len(plan.options[0]) == 1:
            return cells, blocked
        rank = plan.rank_sign * np.broadcast_to(plan.measures[plan.rank_by].compute(cells), blocked.shape)
        if best is None:
            best, best_blocked, best_rank = cells, blocked, rank
            continue
        better = _better(cells, blocked, rank, best, best_blocked, best_rank)
        best = replace(best, legs=[_choose(better, cells.legs[0], best.legs[0])])
        best_blocked = np.where(better, blocked, best_blocked)
        best_rank = np.where(better, rank, best_rank)
    assert best is not None
    return best, best_blocked


def cells_at(plan: Plan, tables: list[StateTable], options: list[LegOption]) -> Cells:
    """The one cell of a route whose encounters have one date each and whose legs are flown as told."""
    legs = [solve_leg(*pair, option) for pair, option in zip(pairwise(tables), options, strict=True)]
    flybys = [
        FlybyCells(table.body, before.v_inf_in, after.v_inf_out, after.body_velocity1)
        for table, (before, after) in zip(tables[1:-1], pairwise(legs), strict=True)
    ]
    earth, _ = plan.ephemeris.states(find_body("earth", {}), tables[-1].jd)
    return plan.cells(tables[0], tables[-1], earth, legs, flybys)


def _cells_of(
    plan: Plan, departure: StateTable, arrival: StateTable, earth_at_arrival: np.ndarray, option: LegOption
) -> Cells:
    return plan.cells(departure, arrival, earth_at_arrival, [solve_leg(departure, arrival, option)])


def _better(
    cells: Cells,
    blocked: np.ndarray,
    rank: np.ndarray,
    best: Cells,
    best_blocked: np.ndarray,
    best_rank: np.ndarray,
) -> np.ndarray:
    """Where an option beats the best so far: allowed before forbidden, flown before not, then by rank."""
    flown, best_flown = cells.status == FLOWN, best.status == FLOWN
    allowed, best_allowed = blocked == 0, best_blocked == 0
    return flown & (
        ~best_flown
        | (allowed & ~best_allowed)
        | ((allowed == best_allowed) & ((rank < best_rank) | (np.isnan(best_rank) & ~np.isnan(rank))))
    )


def _choose(better: np.ndarray, leg: LegCells, best: LegCells) -> LegCells:
    return replace(
        best,
        v_inf_out=np.where(better, leg.v_inf_out, best.v_inf_out),
        v_inf_in=np.where(better, leg.v_inf_in, best.v_inf_in),
        status=np.where(better, leg.status, best.status),
        revs=np.where(better, leg.revs, best.revs),
        branch=np.where(better, leg.branch, best.branch),
    )


def _cut(table: StateTable, dates: slice) -> StateTable:
    return StateTable(
        table.body,
        table.jd[dates],
        np.ascontiguousarray(table.position[:, dates]),
        np.ascontiguousarray(table.velocity[:, dates]),
    )

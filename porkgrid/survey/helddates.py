"""What leaving on other days costs when the dates of the flybys and of the arrival are kept.

The date sets that are tried are those of each day's best route. A set is flown from the days around its own
by solving the first leg anew; the rest of the route, with its revolutions and branches, stays.
"""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from itertools import pairwise

import numpy as np

from porkgrid.sky.bodies import find_body
from porkgrid.sky.states import StateTable, state_table
from porkgrid.survey.candidates import Picked
from porkgrid.survey.cells import Cells, FlybyCells
from porkgrid.survey.departuredays import DepartureDays, signed_costs
from porkgrid.survey.legs import LegCells, solve_leg
from porkgrid.survey.limits import blocked_by
from porkgrid.survey.plan import Plan

_VECTORS = {"r1", "r2", "body_velocity1", "body_velocity2", "v_inf_out", "v_inf_in"}


@dataclass(frozen=True, eq=False)
class HeldDates:
    """Date sets and what each costs from every day.

    sets: routes, of which the dates after departure are the set. cost: (days, sets), less being better,
    infinite where a day is closed to a set or further from the set's own day than was looked at.
    """

    sets: list[Picked]
    cost: np.ndarray


def hold_dates(
    plan: Plan, by: str, sign: float, days: DepartureDays, bests: dict[int, Picked], reach: int
) -> HeldDates:
    """Fly the date set of each day's best route from all days closer to that day than `reach`."""
    own_days: dict[tuple, list[int]] = {}
    for day, one in bests.items():
        own_days.setdefault((one.epochs[1:], one.options), []).append(day)
    sets = [bests[own[0]] for own in own_days.values()]
    cost = np.full((days.count, len(sets)), np.inf)
    for column, (one, own) in enumerate(zip(sets, own_days.values(), strict=True)):
        first, last = max(own[0] - reach + 1, 0), min(own[-1] + reach, days.count)
        rows = slice(days.rows(first).start, days.rows(last - 1).stop)
        by_row = np.full(len(days.jd), np.inf)
        by_row[rows] = _costs(plan, by, sign, rows, one)
        cost[:, column] = days.least(by_row)
    return HeldDates(sets, cost)


def held_rows(plan: Plan, by: str, sign: float, rows: slice, one: Picked) -> int:
    """The row, of some, from which a date set costs least."""
    return rows.start + int(np.argmin(_costs(plan, by, sign, rows, one)))


def _costs(plan: Plan, by: str, sign: float, rows: slice, one: Picked) -> np.ndarray:
    """(rows,) signed cost of a date set, infinite where the limits forbid it."""
    table = plan.tables[0]
    departure = StateTable(
        table.body,
        table.jd[rows],
        np.ascontiguousarray(table.position[:, rows]),
        np.ascontiguousarray(table.velocity[:, rows]),
    )
    cells = _cells_with_held_dates(plan, departure, one)
    blocked = blocked_by(cells, plan.bounds)
    values = np.broadcast_to(plan.measures[by].compute(cells), blocked.shape)
    return signed_costs(values.astype(float), blocked, sign)[:, 0]


def _cells_with_held_dates(plan: Plan, departure: StateTable, one: Picked) -> Cells:
    """Cells (n, 1) of one date set flown from n departure dates."""
    later = [
        state_table(plan.ephemeris, table.body, np.array([jd]))
        for table, jd in zip(plan.tables[1:], one.epochs[1:], strict=True)
    ]
    stops = [departure, *later]
    legs = [solve_leg(*ends, option) for ends, option in zip(pairwise(stops), one.options, strict=True)]
    legs = [legs[0], *(_repeated(leg, len(departure.jd)) for leg in legs[1:])]
    flybys = [
        FlybyCells(table.body, before.v_inf_in, after.v_inf_out, after.body_velocity1)
        for table, (before, after) in zip(later[:-1], pairwise(legs), strict=True)
    ]
    earth, _ = plan.ephemeris.states(find_body("earth", {}), later[-1].jd)
    return plan.cells(departure, later[-1], earth, legs, flybys)


def _repeated(leg: LegCells, rows: int) -> LegCells:
    """A leg between single dates as the same leg of every row."""
    names = [field.name for field in fields(leg)]
    return replace(
        leg,
        **{name: np.repeat(getattr(leg, name), rows, axis=1 if name in _VECTORS else 0) for name in names},
    )

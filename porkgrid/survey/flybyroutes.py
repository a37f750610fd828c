"""The cells of routes with flybys: what the search chose, and which limit left a cell without a route."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np
from numba import njit

from porkgrid.physics.lambert import FLOWN, NO_TRANSFER
from porkgrid.physics.timeflight import PLAIN
from porkgrid.physics.turns import burn_at, periapsis, periapsis_far
from porkgrid.sky.states import StateTable
from porkgrid.survey.cells import Cells, FlybyCells
from porkgrid.survey.chains import Choice, Search, flyby_bounds, search_block
from porkgrid.survey.legs import LegCells
from porkgrid.survey.legtables import PASSED, LegTable, ends_failed, leg_table
from porkgrid.survey.limits import REASONS
from porkgrid.survey.measures import MASS, SUM

if TYPE_CHECKING:
    from porkgrid.survey.plan import Plan

# Order in which the limits of one (departure, flyby, arrival) triple are looked at, after those of its legs.
_ENDS, _ALTITUDE, _TURN, _BURN, _GAIN, _DV = 1, 2, 3, 4, 5, 6
_STAGE = 64


def flyby_cells(plan: Plan, search: Search, departure: StateTable) -> tuple[Cells, np.ndarray]:
    """The best route of every cell of some departure dates, and what forbids the cells that have none.

    `blocked_by` of a cell without a route names the limit that removed its last route. With one flyby that is
    exact: limits are looked at in the order legs, first and last date, altitude, turn, burn, gain, total Δv.
    With more flybys it is the limit at which the search from that departure date, or into that arrival date,
    came to its end.
    """
    first = leg_table(plan, 1, departure, plan.tables[1])
    choice = search_block(plan, search, departure, first)
    cells = gather(plan, [first, *search.tables], departure, choice)
    dead = choice.dates[0] < 0
    blame = _blame_one if len(search.out) == 1 else _blame_chain
    bit = blame(plan, search, departure, first, choice, dead)
    blocked = np.where(dead, np.uint32(1) << bit.astype(np.uint32), np.uint32(0))
    return cells, blocked | _mass_limits(plan, cells, dead)


def _mass_limits(plan: Plan, cells: Cells, dead: np.ndarray) -> np.ndarray:
    """Flags of the limits on masses, which are applied to the routes that were found."""
    word = np.zeros(dead.shape, dtype=np.uint32)
    for bit, bound in enumerate(plan.bounds, start=len(REASONS)):
        if bound.measure.scope == MASS:
            outside = bound.forbids(bound.measure.compute(cells)) & ~dead
            word |= np.where(outside, np.uint32(1 << bit), np.uint32(0))
    return word


def gather(plan: Plan, tables: list[LegTable], departure: StateTable, choice: Choice) -> Cells:
    """Cells of the chosen routes; NaN where there is none."""
    n, m = choice.cost.shape
    dead = choice.dates[0] < 0
    stops = [np.arange(n)[:, None] + np.zeros((1, m), dtype=int), *np.maximum(choice.dates, 0)]
    stops.append(np.zeros((n, 1), dtype=int) + np.arange(m)[None, :])
    at = [departure, *plan.tables[1:]]
    legs = [
        _leg(tables[k], at[k], at[k + 1], np.maximum(choice.options[k], 0), stops[k], stops[k + 1], dead)
        for k in range(len(tables))
    ]
    flybys = [
        FlybyCells(at[k].body, legs[k - 1].v_inf_in, legs[k].v_inf_out, legs[k].body_velocity1)
        for k in range(1, len(tables))
    ]
    return plan.cells(departure, plan.tables[-1], plan.earth_at_arrival, legs, flybys)


def _leg(
    table: LegTable,
    here: StateTable,
    there: StateTable,
    option: np.ndarray,
    i: np.ndarray,
    j: np.ndarray,
    dead: np.ndarray,
) -> LegCells:
    def blank(values: np.ndarray) -> np.ndarray:
        return np.where(dead, np.nan, values)

    return LegCells(
        r1=here.position[:, i],
        r2=there.position[:, j],
        body_velocity1=here.velocity[:, i],
        body_velocity2=there.velocity[:, j],
        jd2=blank(there.jd[j]),
        tof_days=blank(there.jd[j] - here.jd[i]),
        v_inf_out=blank(table.gather("v_inf_out", option, i, j)),
        v_inf_in=blank(table.gather("v_inf_in", option, i, j)),
        status=np.where(dead, NO_TRANSFER, FLOWN).astype(np.int8),
        revs=blank(table.gather("revs", option, i, j)),
        branch=blank(table.gather("branch", option, i, j)),
    )


def _blame_one(
    plan: Plan, search: Search, departure: StateTable, first: LegTable, choice: Choice, dead: np.ndarray
) -> np.ndarray:
    second = search.tables[0]
    code = np.zeros(dead.shape, dtype=np.int32)
    _last_to_go(
        dead,
        first.failed, np.stack([leg.v_inf_in for leg in first.options]), first.dv,
        second.failed, np.stack([leg.v_inf_out for leg in second.options]), second.dv,
        plan.tables[1].velocity,
        ends_failed(plan, departure.jd, plan.tables[-1].jd),
        flyby_bounds(plan, 1).as_array(0.0, search.bounds[0][8]),
        code,
    )  # fmt: skip
    stage, bit = np.divmod(code, _STAGE)
    for which, name in (
        (_ALTITUDE, "altitude_km"),
        (_TURN, "turn_deg"),
        (_BURN, "burn_km_s"),
        (_GAIN, "gain_km_s"),
    ):
        bit = np.where(stage == which, _bit_of(plan, f"flyby1_{name}"), bit)
    return np.where(stage == _DV, _bit_of(plan, "dv_total_km_s"), bit)


@njit(**PLAIN)
def _last_to_go(dead, fail1, v_in, dv1, fail2, v_out, dv2, body, ends, bounds, code):
    """For each dead cell the limit that the triple which came furthest failed first, as stage · 64 + bit."""
    options1, _, dates = fail1.shape
    for i in range(dead.shape[0]):
        for k in range(dead.shape[1]):
            if not dead[i, k]:
                continue
            furthest = 0
            for j in range(dates):
                for o in range(options1):
                    for p in range(fail2.shape[0]):
                        bit = min(fail1[o, i, j], fail2[p, j, k])
                        if bit != PASSED:
                            reached = bit
                        elif ends[i, k] != PASSED:
                            reached = _ENDS * _STAGE + ends[i, k]
                        else:
                            dv = dv1[o, i, j] + dv2[p, j, k]
                            reached = _STAGE * _failed_at_flyby(
                                v_in[o, :, i, j], v_out[p, :, j, k], body[:, j], dv, bounds
                            )
                        furthest = max(furthest, reached)
            code[i, k] = furthest


@njit(**PLAIN)
def _failed_at_flyby(a, b, body, dv, bounds):
    a2 = a[0] * a[0] + a[1] * a[1] + a[2] * a[2]
    b2 = b[0] * b[0] + b[1] * b[1] + b[2] * b[2]
    cosine = (a[0] * b[0] + a[1] * b[1] + a[2] * b[2]) / math.sqrt(a2 * b2)
    y = periapsis_far(a2, b2, cosine, periapsis(a2, b2, cosine))
    burn = burn_at(a2, b2, y)
    before, after = a + body, b + body
    gain = math.sqrt(np.dot(after, after)) - math.sqrt(np.dot(before, before))
    if not bounds[0] <= y <= bounds[1]:
        return _ALTITUDE
    if not bounds[3] <= cosine <= bounds[4]:
        return _TURN
    if not burn <= bounds[2]:
        return _BURN
    if not bounds[5] <= gain <= bounds[6]:
        return _GAIN
    return _DV


def _blame_chain(
    plan: Plan, search: Search, departure: StateTable, first: LegTable, choice: Choice, dead: np.ndarray
) -> np.ndarray:
    n, m = dead.shape
    flybys = len(search.out)
    at_last = np.where(choice.burnt[:, -1], _flyby_bit(plan, flybys, True), _flyby_bit(plan, flybys, False))
    bit = np.broadcast_to(at_last[:, None], (n, m)).astype(np.int32)
    ends = ends_failed(plan, departure.jd, plan.tables[-1].jd)
    bit = np.where(ends != PASSED, ends, bit)
    into = search.tables[-1].failed
    closed_into = (into != PASSED).all(axis=(0, 1))
    bit = np.where(closed_into[None, :], _furthest(into, (0, 1))[None, :], bit)
    for i in np.flatnonzero((choice.stuck > 0) & (choice.stuck < flybys)):
        number = int(choice.stuck[i])
        out = search.tables[number - 1].failed
        nothing_leaves = bool((out != PASSED).all())
        bit[i] = (
            _furthest(out, (0, 1, 2))
            if nothing_leaves
            else _flyby_bit(plan, number, bool(choice.burnt[i, number - 1]))
        )
    never_leaves = (first.failed != PASSED).all(axis=(0, 2))
    return np.where(never_leaves[:, None], _furthest(first.failed, (0, 2))[:, None], bit)


def _furthest(failed: np.ndarray, axes: tuple[int, ...]) -> np.ndarray:
    return np.where(failed == PASSED, 0, failed).max(axis=axes)


def _flyby_bit(plan: Plan, number: int, turned: bool) -> int:
    """The flag of a flyby that nothing gets past: its burn where turns were possible, else its altitude."""
    limited = any(bound.measure.scope == SUM for bound in plan.bounds)
    if turned and limited and plan.objective.name == "dv_total_km_s":
        return _bit_of(plan, "dv_total_km_s")
    return _bit_of(plan, f"flyby{number}_{'burn_km_s' if turned else 'altitude_km'}")


def _bit_of(plan: Plan, name: str) -> int:
    """The bit of the limit on a measure; that of no transfer where the plan has no such limit."""
    names = [bound.name for bound in plan.bounds]
    return len(REASONS) + names.index(name) if name in names else len(REASONS) - 1

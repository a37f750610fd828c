"""Routes with flybys: Bellman's recursion over legs, exact on the grid.

Departing on one date, let V_k(leg) be the least cost of a route that ends with that leg into encounter k + 1:

    V_1(leg) = its cost,    V_k+1(leg out) = cost of leg out + min over legs in of [ V_k(leg in) + burn ]

No choice of grid dates is better than its optimum. Run once per departure date, so that every
(departure, arrival) cell gets its own best route and limits on both dates hold exactly. A search is shared by
all tiles; the legs between flybys are flown once.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from porkgrid.sky.bodies import gm_of, radius_of
from porkgrid.sky.states import StateTable
from porkgrid.survey.joins import FIELDS, FlybyBounds, LegEnds, join, leg_ends, turns
from porkgrid.survey.legtables import PASSED, LegTable, ends_failed, leg_table
from porkgrid.survey.measures import FLYBY, SUM

if TYPE_CHECKING:
    from porkgrid.survey.plan import Plan

# Where the ranked measure leaves the flyby dates open, the smaller sum of burns decides: this much per km/s.
TIE_WEIGHT = 1e-9


@dataclass(frozen=True, eq=False)
class Search:
    """What all departure dates share: legs after the first flyby, sorted at the flybys they join."""

    tables: list[LegTable]  # of legs 2 to the last
    into: list[LegEnds]  # legs 2 to the last but one, at the flyby they end at
    out: list[LegEnds]  # legs 2 to the last, at the flyby they start from
    bounds: list[np.ndarray]  # per flyby, as the kernel reads them
    y_min: list[float]  # per flyby


@dataclass(frozen=True, eq=False)
class Choice:
    """The best route of every cell of a block of n × m; −1 where there is none."""

    dates: np.ndarray  # (flybys, n, m) index of each flyby's date
    options: np.ndarray  # (legs, n, m) index of each leg's option
    cost: np.ndarray  # (n, m), infinite where there is none
    stuck: np.ndarray  # (n,) flyby that no route from this departure date gets past, 0 where some do
    burnt: np.ndarray  # (n, flybys) whether turns were possible there, so that burns forbade


def prepare(plan: Plan) -> Search:
    """Fly the legs after the first flyby and sort their ends."""
    legs = len(plan.options)
    bounds = [flyby_bounds(plan, n) for n in range(1, legs)]
    y_min = [bound.y_min for bound in bounds]
    tables = [leg_table(plan, n, plan.tables[n - 1], plan.tables[n]) for n in range(2, legs + 1)]
    out = [_ends_out(table, plan.tables[n], y_min[n - 1]) for n, table in enumerate(tables, start=1)]
    into = [_ends_in(table, plan.tables[n], y_min[n - 1]) for n, table in enumerate(tables[:-1], start=2)]
    weight = 1.0 if plan.objective.first_leg is not None else TIE_WEIGHT
    dv_max = _dv_max(plan)
    return Search(tables, into, out, [bound.as_array(weight, dv_max) for bound in bounds], y_min)


def flyby_bounds(plan: Plan, number: int) -> FlybyBounds:
    """What the limits allow at one flyby (from 1)."""
    body = plan.tables[number].body
    ranges = {"flyby_turn_deg": (0.0, 180.0), "flyby_altitude_km": (0.0, math.inf)}
    ranges |= {"flyby_burn_km_s": (0.0, math.inf), "flyby_gain_km_s": (-math.inf, math.inf)}
    for bound in plan.bounds:
        if bound.measure.scope == FLYBY and bound.measure.number == number:
            name = bound.measure.name.replace(f"flyby{number}", "flyby")
            low, high = ranges[name]
            ranges[name] = (
                low if bound.least is None else max(low, bound.least),
                high if bound.most is None else min(high, bound.most),
            )
    altitude, burn = ranges["flyby_altitude_km"], ranges["flyby_burn_km_s"]
    turn, gain = ranges["flyby_turn_deg"], ranges["flyby_gain_km_s"]
    return FlybyBounds(
        y_min=(radius_of(body) + altitude[0]) / gm_of(body),
        y_max=(radius_of(body) + altitude[1]) / gm_of(body),
        burn_max=burn[1],
        turn_min_rad=math.radians(turn[0]),
        turn_max_rad=math.radians(turn[1]),
        gain_min=gain[0],
        gain_max=gain[1],
    )


def search_block(plan: Plan, search: Search, departure: StateTable, first: LegTable) -> Choice:
    """The best route of every cell whose departure dates are those of a table, `first` its leg 1."""
    n, m = len(departure.jd), len(plan.tables[-1].jd)
    flybys = len(search.out)
    dates = np.full((flybys, n, m), -1, dtype=np.int32)
    options = np.full((flybys + 1, n, m), -1, dtype=np.int8)
    cost, stuck = np.full((n, m), math.inf), np.zeros(n, dtype=np.int8)
    burnt = np.zeros((n, flybys), dtype=bool)
    closed = ends_failed(plan, departure.jd, plan.tables[-1].jd) != PASSED
    for i in range(n):
        legs_in = _first_legs(first, plan.tables[1], search.y_min[0], i)
        cost[i], stuck[i], burnt[i] = _from_one_date(
            plan, search, legs_in, closed[i], dates[:, i], options[:, i]
        )
    return Choice(dates, options, cost, stuck, burnt)


def _from_one_date(
    plan: Plan,
    search: Search,
    legs_in: LegEnds,
    closed: np.ndarray,
    dates: np.ndarray,
    options: np.ndarray,
) -> tuple[np.ndarray, int, np.ndarray]:
    """Run the recursion from one departure date; fills dates (flybys, m) and options (legs, m)."""
    flybys, m = len(search.out), len(closed)
    ends, cost_in, trail = legs_in, legs_in.cost, []
    stuck, burnt = 0, np.zeros(flybys, dtype=bool)
    # a route that costs more than its limit on the way is closed already
    ceiling = np.nextafter(_dv_max(plan), math.inf) if plan.objective.name == "dv_total_km_s" else math.inf
    for k, out in enumerate(search.out):
        last = k == flybys - 1
        legs = search.tables[k].valid.size // len(plan.tables[k + 1].jd)  # options × next dates
        stride = 0 if last else legs
        states = m if last else len(plan.tables[k + 1].jd) * legs
        best = np.full(states, ceiling)
        if last:
            best[closed] = -math.inf
        from_leg = np.full(states, -1, dtype=np.int64)
        by_leg = np.full(states, -1, dtype=np.int32)
        tally = np.zeros(3, dtype=np.int64)
        join(
            ends.fields, cost_in, ends.count, out.fields, out.cost, out.leg, out.count,
            m if last else legs, stride, search.bounds[k], best, from_leg, by_leg, tally,
        )  # fmt: skip
        best[from_leg < 0] = math.inf
        burnt[k] = tally[1] > 0 or turns(
            ends.fields, cost_in, ends.count, out.fields, out.count, search.bounds[k]
        )
        trail.append((ends, from_leg, by_leg))
        if stuck == 0 and not (from_leg >= 0).any():
            stuck = k + 1
        if not last:
            ends = search.into[k]
            cost_in = _costs_at(ends, best, legs, len(plan.tables[k + 2].jd))
    _trace(plan, trail, dates, options)
    return best, stuck, burnt


def _costs_at(ends: LegEnds, best: np.ndarray, legs: int, dates: int) -> np.ndarray:
    """Costs of legs, found by flyby date and leg out, in the order of their ends at the next flyby.

    A leg is (date i, option o, date j): as a way out it is state i · legs + o · dates + j; as a way in, at
    date j, it is number o · (dates before) + i.
    """
    before = len(best) // legs
    j = np.arange(len(ends.count))[:, None]
    option, i = np.divmod(ends.leg, before)
    cost = best[i * legs + option * dates + j]
    outside = np.arange(ends.leg.shape[1])[None, :] >= ends.count[:, None]
    return np.where(outside, math.inf, cost)


def _trace(
    plan: Plan, trail: list[tuple[LegEnds, np.ndarray, np.ndarray]], dates: np.ndarray, options: np.ndarray
) -> None:
    """Follow the pointers back from every arrival date that is reached."""
    reached = np.flatnonzero(trail[-1][1] >= 0)
    state = reached
    for k in range(len(trail) - 1, -1, -1):
        ends, from_leg, by_leg = trail[k]
        here, there = len(plan.tables[k].jd), len(plan.tables[k + 2].jd)
        j, place = np.divmod(from_leg[state], ends.leg.shape[1])
        dates[k, reached] = j
        options[k + 1, reached] = by_leg[state] // there
        leg_in = ends.leg[j, place]
        if k == 0:
            options[0, reached] = leg_in
            return
        option, i = np.divmod(leg_in, here)
        legs = len(plan.options[k]) * len(plan.tables[k + 1].jd)
        state = i * legs + option * len(plan.tables[k + 1].jd) + j


def _first_legs(first: LegTable, flyby: StateTable, y_min: float, i: int) -> LegEnds:
    """Ends of the legs that leave on departure date i, at the dates of the first flyby; leg = its option."""
    v_in = np.stack([leg.v_inf_in[:, i] for leg in first.options], axis=-1)  # (3, dates, options)
    speed = _length(v_in + flyby.velocity[:, :, None])
    return leg_ends(v_in, speed, first.valid[:, i].T, first.cost[:, i].T, first.dv[:, i].T, y_min)


def _ends_in(table: LegTable, flyby: StateTable, y_min: float) -> LegEnds:
    """Ends of the legs of a table at the flyby they come to; leg = option · (dates before) + date."""
    v_in = np.stack([leg.v_inf_in for leg in table.options])  # (o, 3, a, b)
    o, _, a, b = v_in.shape
    v_in = v_in.transpose(1, 3, 0, 2).reshape(3, b, o * a)
    speed = _length(v_in + flyby.velocity[:, :, None])
    valid, cost, dv = (
        each.transpose(2, 0, 1).reshape(b, o * a) for each in (table.valid, table.cost, table.dv)
    )
    return leg_ends(v_in, speed, valid, cost, dv, y_min)


def _ends_out(table: LegTable, flyby: StateTable, y_min: float) -> LegEnds:
    """Ends of the legs of a table at the flyby they leave; leg = option · (dates after) + date."""
    v_out = np.stack([leg.v_inf_out for leg in table.options])  # (o, 3, a, b)
    o, _, a, b = v_out.shape
    v_out = v_out.transpose(1, 2, 0, 3).reshape(3, a, o * b)
    speed = _length(v_out + flyby.velocity[:, :, None])
    valid, cost, dv = (
        each.transpose(1, 0, 2).reshape(a, o * b) for each in (table.valid, table.cost, table.dv)
    )
    return leg_ends(v_out, speed, valid, cost, dv, y_min)


def _dv_max(plan: Plan) -> float:
    limits = [bound.most for bound in plan.bounds if bound.measure.scope == SUM and bound.most is not None]
    return min(limits, default=math.inf)


def _length(vector: np.ndarray) -> np.ndarray:
    return np.sqrt(vector[0] ** 2 + vector[1] ** 2 + vector[2] ** 2)


def memory_bytes(plan: Plan, rows: int) -> float:
    """Bytes that a search needs at its peak: shared tables, and one thread's legs and states."""
    dates = [len(table.jd) for table in plan.tables]
    options = [len(each) for each in plan.options]
    pairs = [o * a * b for o, a, b in zip(options, dates[:-1], dates[1:], strict=True)]
    per_pair = 8.0 * (6 + 4 + 2 * (FIELDS + 3)) + 3
    shared = sum(pairs[1:]) * per_pair
    mine = pairs[0] / dates[0] * rows * 8.0 * 14 + sum(pairs[1:]) * 20.0
    return shared + mine

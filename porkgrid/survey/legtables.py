"""Leg tables: every option of a leg between all dates of two encounters, with what limits allow and it costs.

A table depends only on the two bodies, their dates and the leg's options; joins read it many times.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from porkgrid.sky.states import StateTable
from porkgrid.survey.cells import Cells
from porkgrid.survey.legs import LegCells, solve_leg
from porkgrid.survey.limits import REASON_OF_STATUS, REASONS
from porkgrid.survey.measures import ARRIVAL, DEPARTURE, ENDS, EVERY_LEG, LEG, Measure

if TYPE_CHECKING:
    from porkgrid.survey.plan import Plan

PASSED = 127  # of `LegTable.failed`: nothing forbids the leg


@dataclass(frozen=True, eq=False)
class LegTable:
    """A leg's options (o of them) between a dates of one encounter and b of the next."""

    options: list[LegCells]  # each (a, b)
    failed: np.ndarray  # (o, a, b) int8: bit of the first reason or limit that forbids the leg, or PASSED
    cost: np.ndarray  # (o, a, b) its share of what the search makes least
    dv: np.ndarray  # (o, a, b) its share of the total Δv

    @property
    def valid(self) -> np.ndarray:
        """(o, a, b) legs that can be flown and are allowed."""
        return self.failed == PASSED

    def gather(self, name: str, option: np.ndarray, i: np.ndarray, j: np.ndarray) -> np.ndarray:
        """A field of `LegCells` at chosen options and dates; vectors keep their components first."""
        first = getattr(self.options[0], name)[..., i, j]
        for number, leg in enumerate(self.options[1:], start=1):
            first = np.where(option == number, getattr(leg, name)[..., i, j], first)
        return first


def leg_table(plan: Plan, number: int, departure: StateTable, arrival: StateTable) -> LegTable:
    """Fly leg `number` (from 1) between two tables and apply what concerns this leg alone."""
    shape = (len(departure.jd), len(arrival.jd))
    solved = _solved(plan, number, departure, arrival)
    failed = np.full((len(solved), *shape), PASSED, dtype=np.int8)
    cost, dv = np.zeros(failed.shape), np.zeros(failed.shape)
    for o, leg in enumerate(solved):
        cells = _alone(plan, number, departure, arrival, leg)
        failed[o] = _first_failed(plan, number, cells, leg.status)
        cost[o] = _share(plan, plan.objective, number, cells, shape)
        if "dv_total_km_s" in plan.measures:
            dv[o] = _share(plan, plan.measures["dv_total_km_s"], number, cells, shape)
    return LegTable(solved, failed, cost, dv)


def _solved(plan: Plan, number: int, departure: StateTable, arrival: StateTable) -> list[LegCells]:
    """The leg's options, flown once for all legs between the same dates of the same bodies."""
    ends = ((table.body.name, table.jd.tobytes()) for table in (departure, arrival))
    key = (*ends, plan.options[number - 1])
    if number == 1 or key not in plan.flown:
        solved = [solve_leg(departure, arrival, option) for option in plan.options[number - 1]]
        if number == 1:
            return solved  # of one tile, which nobody else flies
        plan.flown[key] = solved
    return plan.flown[key]


def concerns(measure: Measure, number: int, legs: int) -> bool:
    """Whether a measure can be told from leg `number` alone, as far as limits go."""
    return (
        (measure.scope == DEPARTURE and number == 1)
        or (measure.scope == ARRIVAL and number == legs)
        or (measure.scope == LEG and measure.number == number)
        or measure.scope == EVERY_LEG
    )


def _alone(plan: Plan, number: int, departure: StateTable, arrival: StateTable, leg: LegCells) -> Cells:
    """Cells in which every leg is this one, so that any measure of it can be taken."""
    return plan.cells(departure, arrival, plan.earth_at_arrival, [leg] * len(plan.options))


def _first_failed(plan: Plan, number: int, cells: Cells, status: np.ndarray) -> np.ndarray:
    failed = np.full(status.shape, PASSED, dtype=np.int8)
    for bit in range(len(REASONS) + len(plan.bounds) - 1, len(REASONS) - 1, -1):
        bound = plan.bounds[bit - len(REASONS)]
        if concerns(bound.measure, number, len(plan.options)):
            failed[np.broadcast_to(bound.forbids(bound.measure.compute(cells)), status.shape)] = bit
    for code, bit in REASON_OF_STATUS.items():
        failed[status == code] = bit
    return failed


def _share(plan: Plan, measure: Measure, number: int, cells: Cells, shape: tuple[int, int]) -> np.ndarray:
    """What a leg adds to a measure, less being better."""
    legs = len(plan.options)
    if measure.first_leg is not None and measure.last_leg is not None:
        share = np.zeros(shape)
        for of_leg, where in ((measure.first_leg, 1), (measure.last_leg, legs)):
            if number == where:
                share = share + of_leg(cells)
        return share
    if not concerns(measure, number, legs):
        return np.zeros(shape)
    return plan.objective_sign * np.broadcast_to(measure.compute(cells), shape)


def ends_failed(plan: Plan, departure_jd: np.ndarray, arrival_jd: np.ndarray) -> np.ndarray:
    """(n, m) int8: bit of the first limit on first and last date that forbids a cell, or PASSED."""
    n, m = len(departure_jd), len(arrival_jd)
    failed = np.full((n, m), PASSED, dtype=np.int8)
    ends = Cells(_dates_only(plan.tables[0], departure_jd), plan.tables[-1], plan.earth_at_arrival, [])
    for bit in range(len(REASONS) + len(plan.bounds) - 1, len(REASONS) - 1, -1):
        bound = plan.bounds[bit - len(REASONS)]
        if bound.measure.scope == ENDS:
            failed[np.broadcast_to(bound.forbids(bound.measure.compute(ends)), (n, m))] = bit
    return failed


def _dates_only(table: StateTable, jd: np.ndarray) -> StateTable:
    return replace(table, jd=jd)

"""Every way to fly a route with one flyby, one flyby date and pair of leg options at a time."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import fields, replace
from itertools import product

import numpy as np

from porkgrid.sky.states import StateTable
from porkgrid.survey.cells import Cells, FlybyCells
from porkgrid.survey.legs import LegCells, solve_leg
from porkgrid.survey.plan import Plan


def whole(leg: LegCells, shape: tuple[int, int]) -> LegCells:
    """The leg with every field broadcast to the whole grid."""
    values = {field.name: getattr(leg, field.name) for field in fields(leg)}
    return LegCells(**{name: np.broadcast_to(v, (*v.shape[:-2], *shape)) for name, v in values.items()})


def one_date(table: StateTable, j: int) -> StateTable:
    return replace(
        table,
        jd=table.jd[j : j + 1],
        position=np.ascontiguousarray(table.position[:, j : j + 1]),
        velocity=np.ascontiguousarray(table.velocity[:, j : j + 1]),
    )


def every_way(plan: Plan) -> Iterator[Cells]:
    """Cells of every flyby date and every pair of leg options of a route with one flyby."""
    departure, venus, arrival = plan.tables
    for j, one, two in product(range(len(venus.jd)), *plan.options):
        there = one_date(venus, j)
        first = whole(solve_leg(departure, there, one), plan.shape)
        second = whole(solve_leg(there, arrival, two), plan.shape)
        flyby = FlybyCells(there.body, first.v_inf_in, second.v_inf_out, second.body_velocity1)
        yield plan.cells(departure, arrival, plan.earth_at_arrival, [first, second], [flyby])

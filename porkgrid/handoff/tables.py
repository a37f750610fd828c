"""A full-force solution as numbers to compare: the candidate's cell anew, its lines and its encounters.

The solution's excess velocities and epochs are put into a copy of the patched cell, so that every line is
computed by the measure that the survey computes it by.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from porkgrid.handoff.patched import POLE, Patched
from porkgrid.handoff.report import FlownEncounter, Line
from porkgrid.handoff.shooting import Problem
from porkgrid.handoff.stops import Pass, Stop, arriving, epoch_s, leaving, signed_burn
from porkgrid.physics import flyby
from porkgrid.sky.bodies import gm_of
from porkgrid.survey.cells import Cells
from porkgrid.survey.plan import Plan

Floats = NDArray[np.float64]

_AT_DEPARTURE = ("departure_epoch_jd_tdb", "c3_km2_s2", "rla_deg", "dla_deg", "dv_departure_km_s")
_AT_FLYBY = ("epoch_jd_tdb", "v_inf_km_s", "turn_deg", "altitude_km", "burn_km_s")
_AT_ARRIVAL = ("arrival_epoch_jd_tdb", "v_inf_arrival_km_s", "dv_capture_km_s", "entry_speed_km_s")
_OF_ROUTE = ("dv_total_km_s", "injected_mass_kg", "delivered_mass_kg", "mass_margin_kg", "propellant_kg",
             "low_orbit_mass_kg", "liftoff_mass_kg")  # fmt: skip


def cells_of(problem: Problem, before: Cells, x: Floats) -> Cells:
    """The patched cell with the excess velocities and flyby epochs of a solution."""
    blocks = problem.blocks(x)
    jd = [problem.forces.jd(epoch_s(stop, free)) for stop, free in zip(problem.stops, blocks, strict=True)]
    out, into = [_outgoing(free) for free in blocks], [free[:3] for free in blocks]
    legs = [
        replace(
            leg,
            v_inf_out=_cell(out[n]),
            v_inf_in=_cell(into[n + 1]),
            jd2=np.array([[jd[n + 1]]]) if n + 2 < len(jd) else leg.jd2,
        )
        for n, leg in enumerate(before.legs)
    ]
    flybys = [
        replace(passed, v_in=here.v_inf_in, v_out=on.v_inf_out)
        for passed, (here, on) in zip(before.flybys, pairwise(legs), strict=True)
    ]
    return replace(before, legs=legs, flybys=flybys)


def lines_of(plan: Plan, given: Patched, after: Cells) -> Iterator[Line]:
    """What both ways say of a route, encounter by encounter."""
    yield from _measured(plan, _AT_DEPARTURE, given.cells, after)
    for n, (old, new) in enumerate(zip(given.cells.flybys, after.flybys, strict=True), start=1):
        yield from _measured(plan, [f"flyby{n}_{name}" for name in _AT_FLYBY], given.cells, after)
        aims = [
            flyby.aim_plane(one.v_in.reshape(3), one.v_out.reshape(3), gm_of(one.body), POLE)
            for one in (old, new)
        ]
        for k, name in enumerate(("b_t_km", "b_r_km")):
            yield Line(f"flyby{n}_{name}", "km", float(aims[0][k]), float(aims[1][k]))
    yield from _measured(plan, _AT_ARRIVAL, given.cells, after)
    end = given.problem.stops[-1]
    if not isinstance(end, Pass) and end.radius_km > 0.0:
        speeds = [cells.v_inf_arrival.item() for cells in (given.cells, after)]
        distances = [float(flyby.aim_distance(v, end.radius_km, gm_of(end.body))) for v in speeds]
        yield Line("arrival_b_t_km", "km", *distances)  # the plane is held in which B lies along T
        yield Line("arrival_b_r_km", "km", 0.0, 0.0)
    yield from _measured(plan, _OF_ROUTE, given.cells, after)


def encounters_of(problem: Problem, x: Floats) -> Iterator[FlownEncounter]:
    """The periapsis states of a solution."""
    last = len(problem.stops) - 1
    for k, (stop, free) in enumerate(zip(problem.stops, problem.blocks(x), strict=True)):
        kind = "departure" if k == 0 else "arrival" if k == last else "flyby"
        yield _encounter(problem, stop, free, kind)


def _encounter(problem: Problem, stop: Stop, free: Floats, kind: str) -> FlownEncounter:
    before = None if kind == "departure" else arriving(stop, free)
    after = None if kind == "arrival" else leaving(stop, free)
    state = before if after is None else after
    assert state is not None  # every encounter is left or reached
    burn = signed_burn(stop, free) if isinstance(stop, Pass) else 0.0
    meant = stop.burn_km_s if isinstance(stop, Pass) else 0.0
    return FlownEncounter(
        kind=kind,
        body=stop.body.name,
        jd=problem.forces.jd(epoch_s(stop, free)),
        periapsis_km=float(np.linalg.norm(state[:3])),
        position=state[:3],
        velocity_before=None if before is None else before[3:],
        velocity_after=None if after is None else after[3:],
        v_inf_in=None if before is None else free[:3],
        v_inf_out=None if after is None else _outgoing(free),
        burn_km_s=burn,
        burn_left_m_s=1000.0 * (abs(burn) - abs(meant)),
        held=stop.hold.value if isinstance(stop, Pass) else "epoch",
    )


def _outgoing(free: Floats) -> Floats:
    return free[3:6] if free.size == 7 else free


def _measured(plan: Plan, names: tuple[str, ...] | list[str], before: Cells, after: Cells) -> Iterator[Line]:
    """Lines of those of the measures that the route has."""
    for name in names:
        measure = plan.measures.get(name)
        if measure is not None:
            old, new = (float(np.ravel(measure.compute(cells))[0]) for cells in (before, after))
            yield Line(name, measure.unit, old, new)


def _cell(vector: Floats) -> Floats:
    return vector.reshape(3, 1, 1)

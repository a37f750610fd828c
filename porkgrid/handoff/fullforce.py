"""Check a patched-conic candidate in the field of the Sun, the planets, the Moon and Pluto.

Departure and arrival keep their epochs, periapsis radii and planes. A flyby keeps its epoch at first, and
the burn is found. Then it takes on the burn of the patched route (none where that is under 1 m/s) and its
epoch is found; where that leads under the least altitude it is put there instead, and both are found. The
last of these is the answer if it is as the patched route to what a confirmation allows; failing that, the
best of all: joined, at allowed altitudes and within the slack, and with the least burns.
"""

from __future__ import annotations

import time
from collections.abc import Iterator
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from porkgrid.handoff.flights import Outset, body_state, carry, spliced
from porkgrid.handoff.newton import Solution
from porkgrid.handoff.patched import Patched, patched
from porkgrid.handoff.report import THRESHOLDS, Attempt, FlownLeg, FullForceReport
from porkgrid.handoff.shooting import TOLERANCE_HELD, TOLERANCE_KM, TOLERANCE_KM_S, Problem, join
from porkgrid.handoff.stops import Hold, Pass, arriving, epoch_s, leaving
from porkgrid.handoff.tables import cells_of, encounters_of, lines_of
from porkgrid.handoff.verdict import changes, extra_dv_m_s, judge, keeps_altitudes
from porkgrid.physics.nbody import ATOL_KM, ATOL_KM_S, METHOD, RTOL, FlightError
from porkgrid.survey.candidates import Picked
from porkgrid.survey.cells import Cells
from porkgrid.survey.plan import Plan

Floats = NDArray[np.float64]

SLACK_DAYS = 3.0


@dataclass(frozen=True, eq=False)
class _Tried:
    problem: Problem
    solution: Solution
    cells: Cells
    altitudes_kept: list[bool]
    within: bool  # joined, at allowed altitudes and within the slack
    as_patched: bool  # and nothing differs by more than a confirmation allows
    extra_dv_m_s: float

    @property
    def merit(self) -> tuple[bool, bool, float]:
        return not self.within, not self.solution.converged, self.extra_dv_m_s


def full_force_check(plan: Plan, picked: Picked, slack_days: float = SLACK_DAYS) -> FullForceReport:
    """Turn a candidate into a full-force trajectory, and compare.

    The epochs of flybys may move by `slack_days` either way; 0 keeps them. A candidate that cannot be joined
    is a result, with what was reached. RequestError where the candidate itself cannot be flown or the
    ephemeris has no such dates.
    """
    began = time.perf_counter()
    given = patched(plan, picked)
    tried = list(_tries(given, slack_days))
    best = tried[-1] if tried[-1].as_patched else min(tried, key=lambda one: one.merit)
    legs, joint, misses = _fly(best.problem, best.solution.x)
    ended, converged = best.solution.ended, best.solution.converged
    verdict, reasons = judge(
        ended, converged, misses, best.problem.stops, given.cells, best.cells, plan.bounds
    )
    return FullForceReport(
        lines=tuple(lines_of(plan, given, best.cells)),
        encounters=tuple(encounters_of(best.problem, best.solution.x)),
        legs=tuple(legs),
        joint_km=joint[0],
        joint_km_s=joint[1],
        miss_km=tuple(misses),
        converged=converged,
        attempts=tuple(_attempt(one) for one in tried),
        extra_dv_m_s=best.extra_dv_m_s,
        verdict=verdict,
        reasons=reasons,
        thresholds=THRESHOLDS,
        forces=given.problem.forces.names,
        ephemeris=plan.ephemeris.label,
        integrator=f"{METHOD}, relative {RTOL:g}, absolute {ATOL_KM:g} km and {ATOL_KM_S:g} km/s per step",
        tolerances=f"joints {TOLERANCE_KM:g} km and {TOLERANCE_KM_S:g} km/s, then one step more",
        assumptions=given.assumptions,
        aim_plane="T in the ecliptic of J2000 (S × N/|S × N|, N its pole), R = S × T",
        wall_s=time.perf_counter() - began,
    )


def _tries(given: Patched, slack_days: float) -> Iterator[_Tried]:
    """Solutions, each started from the one before: epochs held, burns held, least altitudes held."""
    flybys = len(given.problem.stops) - 2
    held = _try(given, [Hold.EPOCH] * flybys, given.guess, slack_days)
    yield held
    if not flybys or slack_days == 0.0:
        return
    guess = held.solution.x if held.solution.converged else given.guess
    burning = _try(given, [Hold.BURN] * flybys, guess, slack_days)
    yield burning
    if burning.as_patched or not burning.solution.converged or all(burning.altitudes_kept):
        return
    holds = [Hold.BURN if kept else Hold.RADIUS for kept in burning.altitudes_kept]
    yield _try(given, holds, burning.solution.x, slack_days)


def _try(given: Patched, holds: list[Hold], guess: Floats, slack_days: float) -> _Tried:
    kinds = iter(holds)
    stops = tuple(
        replace(stop, hold=next(kinds)) if isinstance(stop, Pass) else stop for stop in given.problem.stops
    )
    problem = replace(given.problem, stops=stops)
    solution = join(problem, guess)
    cells = cells_of(problem, given.cells, solution.x)
    kept = keeps_altitudes(stops, cells)
    shifts = [abs(block[6]) for block in problem.blocks(solution.x)[1:-1]]
    within = solution.converged and all(kept) and max(shifts, default=0.0) <= slack_days + TOLERANCE_HELD
    as_patched = within and not list(changes(given.cells, cells))
    extra = extra_dv_m_s(given.cells, cells)
    return _Tried(problem, solution, cells, kept, within, as_patched, extra)


def _attempt(one: _Tried) -> Attempt:
    held = tuple(stop.hold.value for stop in one.problem.stops if isinstance(stop, Pass))
    return Attempt(held, one.solution.converged, one.solution.ended, one.solution.history)


def _fly(problem: Problem, x: Floats) -> tuple[list[FlownLeg], tuple[float, float], list[float]]:
    """The legs, their worst joint (km, km/s), and the miss of each flown in one arc; inf if it cannot be."""
    legs, gaps, misses = [], [(0.0, 0.0)], []
    stops = list(zip(problem.stops, problem.blocks(x), strict=True))
    for n, ((start, from_start), (end, to_end)) in enumerate(pairwise(stops), start=1):
        out = Outset(start.body, epoch_s(start, from_start), leaving(start, from_start))
        back = Outset(end.body, epoch_s(end, to_end), arriving(end, to_end))
        try:
            ahead = carry(problem.forces, out, problem.meeting_s(n - 1))
            behind = carry(problem.forces, back, problem.meeting_s(n - 1))
            landed = carry(problem.forces, out, back.t_s).states[:, -1]
        except FlightError:
            misses.append(np.inf)
            continue
        aim = back.relative + body_state(problem.forces, end.body, back.t_s)
        misses.append(float(np.linalg.norm(landed[:3] - aim[:3])))
        gap = ahead.states[:, -1] - behind.states[:, -1]
        gaps.append((float(np.linalg.norm(gap[:3])), float(np.linalg.norm(gap[3:]))))
        times = np.concatenate([ahead.t_s, behind.t_s[-2::-1]])
        states = np.concatenate([ahead.states, behind.states[:, -2::-1]], axis=1)
        between = spliced(ahead, behind, problem.meeting_s(n - 1))
        legs.append(FlownLeg(n, problem.forces.epoch_jd, times, states[:3], states[3:], between))
    return legs, (max(gap[0] for gap in gaps), max(gap[1] for gap in gaps)), misses

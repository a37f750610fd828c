"""Candidates with continuous dates: the local best, under the same limits, that each grid candidate leads to.

The variables are the epochs of all encounters; how each leg is flown (revolutions, branch) stays as picked.
A date may move by up to `apart_days`, within which the scenario takes dates for one window, and by two grid
steps at least; never out of its encounter's first and last date. It gets there in steps of no more than a
grid step (survey.descent), so that a candidate walks along its valley but does not leap into another. What is
found stands only if at full precision it is no worse than the grid's dates and keeps every limit.

Candidates that end closer than `apart_days` in every date have become one window, as in survey.rank, and only
the best of them stays; so have those that end within an hour of each other where apart_days is less.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
import pandas as pd

from porkgrid.sky.epochs import iso_from_jd, jd_from_date
from porkgrid.survey.candidates import Picked, epoch_names
from porkgrid.survey.descent import Box, descend
from porkgrid.survey.nearby import evaluation, measures_of
from porkgrid.survey.plan import Plan
from porkgrid.survey.stencil import stencil

SAME_DAYS = 1.0 / 24.0  # closer than this in every date two candidates are one, whatever apart_days says
_LEAST_STEPS = 2.0  # of the grid that a date may move
_AT_LIMIT = 1e-4  # a limit is active where its measure is so near, in its unit or as a share
_AT_END_DAYS = 1e-3
_POINTS_AT_ONCE = 1024  # sets of dates evaluated together: some measures take the square of it
# Differences are taken so far to each side: a close flyby bends in wider ones, and narrower ones feel the
# rounding of dates to 40 microseconds
_WIDTH_DAYS = 0.02


Judged = tuple[Picked, dict[str, float]]  # with its measures


@dataclass(frozen=True)
class Refined:
    """A candidate before and after its dates were made continuous.

    `number` is its place among the picked ones, from 1. Values are of the plan's rank measure, burns those
    at the flybys. `active` names the limits and windows that the dates lie against: a measure, or an
    encounter and "first" or "last". `stopped` names the encounters whose dates have moved as far as they may,
    so that better ones lie beyond, in another window. `fault` says why the search failed or the grid's dates
    were kept; it is empty otherwise. `merged` are the numbers of candidates that became the same window and
    count no longer.
    """

    number: int
    grid: Picked
    picked: Picked
    grid_value: float
    value: float
    grid_burns_m_s: tuple[float, ...]
    burns_m_s: tuple[float, ...]
    active: tuple[str, ...]
    stopped: tuple[str, ...]
    fault: str
    measures: dict[str, float]
    merged: tuple[int, ...] = ()

    @property
    def converged(self) -> bool:
        """Whether the dates are a local optimum under the limits."""
        return not self.fault and not self.stopped

    @property
    def moved_days(self) -> tuple[float, ...]:
        """How far each date has moved, positive to later ones."""
        return tuple(new - old for new, old in zip(self.picked.epochs, self.grid.epochs, strict=True))


def refine(plan: Plan, picked: Sequence[Picked]) -> list[Refined]:
    """Refine candidates and merge those that become one; best first."""
    refined: list[Refined] = []
    at_once = max(1, _POINTS_AT_ONCE // stencil(len(plan.tables)).shape[1])
    for start in range(0, len(picked), at_once):
        refined += _refined_batch(plan, picked[start : start + at_once], start + 1)
    return _merged(refined, plan.rank_sign, max(plan.scenario.rank.apart_days, SAME_DAYS))


def refined_table(plan: Plan, refined: Sequence[Refined]) -> pd.DataFrame:
    """Table of refined candidates: rank, ISO dates, every measure, and what the grid had of the ranked one.

    `gain` is how much better than on the grid the ranked measure is, in its unit; `grid_rank` the place of
    the candidate before dates were refined.
    """
    stops = _stops(plan)
    on_grid = f"grid_{plan.rank_by}"
    rows = []
    for rank, one in enumerate(refined, start=1):
        dates = dict(zip(stops, map(iso_from_jd, one.picked.epochs), strict=True))
        gain = plan.rank_sign * (one.grid_value - one.value)
        grid = {on_grid: one.grid_value, "gain": gain, "grid_rank": one.number}
        rows.append({"rank": rank, **dates, **one.measures, **grid})
    return pd.DataFrame(rows, columns=["rank", *stops, *plan.measures, on_grid, "gain", "grid_rank"])


def _windows(plan: Plan) -> tuple[np.ndarray, np.ndarray]:
    """First and last date of every encounter, TDB Julian dates (encounters,) each."""
    encounters = plan.scenario.encounters
    return (
        np.array([jd_from_date(encounter.first) for encounter in encounters]),
        np.array([jd_from_date(encounter.last) for encounter in encounters]),
    )


def _box(plan: Plan, one: Picked) -> Box:
    """Where a candidate may go."""
    first, last = _windows(plan)
    step = np.array([encounter.step_days for encounter in plan.scenario.encounters])
    room = np.maximum(plan.scenario.rank.apart_days, _LEAST_STEPS * step)
    epochs = np.array(one.epochs)
    width = np.full(len(step), _WIDTH_DAYS)
    return Box(np.maximum(first, epochs - room), np.minimum(last, epochs + room), step, width)


def _refined_batch(plan: Plan, picked: Sequence[Picked], first_number: int) -> list[Refined]:
    boxes = [_box(plan, one) for one in picked]
    room = np.maximum(boxes[0].reach, _WIDTH_DAYS)  # differences look beyond the box, at first by a reach
    spans = np.array([[box.low - room, box.high + room] for box in boxes])
    evaluate = evaluation(plan, picked, np.swapaxes(spans, 1, 2))
    descents = descend(evaluate, [np.array(one.epochs) for one in picked], boxes, plan.flybys)
    found = [
        Picked(tuple(map(float, descent.point)), one.options)
        for one, descent in zip(picked, descents, strict=True)
    ]
    before, after = measures_of(plan, picked), measures_of(plan, found)
    return [
        _judged(plan, first_number + n, (one, before[n]), (found[n], after[n]), boxes[n], descents[n].settled)
        for n, one in enumerate(picked)
    ]


def _judged(plan: Plan, number: int, grid: Judged, refined: Judged, box: Box, settled: bool) -> Refined:
    """The outcome for one candidate, by its measures at full precision."""
    (one, before), (found, after) = grid, refined
    gain = plan.rank_sign * (before[plan.rank_by] - after[plan.rank_by])
    broken = [bound.name for bound in plan.bounds if bool(bound.forbids(np.array(after[bound.measure.name])))]
    fault = "" if settled else "the search did not settle on an optimum"
    if broken or not gain >= 0.0:
        found, after = one, before
        fault = f"kept the grid's dates: no better ones found that keep {', '.join(broken) or 'all limits'}"
    burns = [f"flyby{n}_burn_km_s" for n in range(1, plan.flybys + 1)]
    return Refined(
        number=number,
        grid=one,
        picked=found,
        grid_value=before[plan.rank_by],
        value=after[plan.rank_by],
        grid_burns_m_s=tuple(1e3 * before[name] for name in burns),
        burns_m_s=tuple(1e3 * after[name] for name in burns),
        active=_active(plan, found, after),
        stopped=_stopped(plan, found, box),
        fault=fault,
        measures=after,
    )


def _stopped(plan: Plan, one: Picked, box: Box) -> tuple[str, ...]:
    """The encounters whose dates are at an end of the box that is not the end of their window."""
    first, last = _windows(plan)
    stopped = (one.epochs - box.low < _AT_END_DAYS) & (box.low > first)
    stopped |= (box.high - one.epochs < _AT_END_DAYS) & (box.high < last)
    return tuple(name for name, at in zip(_stops(plan), stopped, strict=True) if at)


def _active(plan: Plan, one: Picked, measures: Mapping[str, float]) -> tuple[str, ...]:
    """The limits and windows that a candidate lies against."""
    names = []
    for bound in plan.bounds:
        value = measures[bound.measure.name]
        ends = [end for end in (bound.least, bound.most) if end is not None]
        if any(abs(value - end) <= _AT_LIMIT * max(1.0, abs(end)) for end in ends):
            names.append(bound.name)
    first, last = _windows(plan)
    for stop, after, before in zip(_stops(plan), one.epochs - first, last - one.epochs, strict=True):
        names += [f"{stop} first"] if after < _AT_END_DAYS else []
        names += [f"{stop} last"] if before < _AT_END_DAYS else []
    return tuple(names)


def _stops(plan: Plan) -> list[str]:
    return [name.removesuffix("_epoch_jd_tdb") for name in epoch_names(plan)]


def _merged(refined: Sequence[Refined], sign: float, apart_days: float) -> list[Refined]:
    """The best of every window, best first, with the numbers of those that it stands for."""
    # Digits beyond the eighth are the search's: of two that came to the same optimum the better rank stays
    order = sorted(refined, key=lambda one: (float(f"{sign * one.value:.7e}"), one.number))
    kept: list[Refined] = []
    for one in order:
        for n, better in enumerate(kept):
            if np.max(np.abs(np.subtract(one.picked.epochs, better.picked.epochs))) < apart_days:
                kept[n] = replace(better, merged=(*better.merged, one.number))
                break
        else:
            kept.append(one)
    return kept

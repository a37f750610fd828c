"""Routes side by side: best candidate and best launch period of each survey, with their baselines."""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from itertools import combinations
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd

from porkgrid.errors import RequestError
from porkgrid.survey.answers import answer, answer_to
from porkgrid.survey.baselines import (
    DEEP_SPACE,
    Baseline,
    cheapest_bielliptic,
    end_bodies,
    floor_measures,
    hohmann_floor,
    phased_bielliptic,
)
from porkgrid.survey.candidates import rank_anew
from porkgrid.survey.measures import BOTH, Measure
from porkgrid.survey.period import LaunchPeriod, day_table, periods_in
from porkgrid.survey.showing import comparison_html, comparison_line
from porkgrid.survey.surveys import Survey
from porkgrid.survey.view import better_sign

_DATES_ALONE = (
    "_epoch_jd_tdb",
    "tof_days",
    "_revs",
    "_branch",
)  # endings of what says nothing of a route's cost


@dataclass(frozen=True, eq=False)
class Entry:
    """One survey in a comparison.

    name: no other entry has it. best: its best candidate, ISO dates and every measure; None where the limits
    allow nothing. period: its best launch period, or None, and then `no_period` says why.
    """

    name: str
    survey: Survey
    by: str
    best: dict[str, Any] | None
    period: LaunchPeriod | None
    no_period: str

    @property
    def bodies(self) -> tuple[str, str]:
        """Names of its first and last body."""
        return end_bodies(self.survey.plan)


@dataclass(frozen=True, eq=False)
class Yardstick:
    """The baselines of one pair of end bodies, with the orbits and the spacecraft of one survey between them.

    That is `of`, the first of those that know most of the burns and masses. bielliptic: the phased
    bi-elliptic of each departure date of that survey.
    """

    route: str
    of: str
    baselines: tuple[Baseline, ...]
    bielliptic: pd.DataFrame


@dataclass(frozen=True, eq=False)
class Comparison:
    """Surveys laid side by side; `days` is the length of their launch periods."""

    days: int
    entries: tuple[Entry, ...]
    yardsticks: tuple[Yardstick, ...]
    sentences: tuple[str, ...]

    @property
    def units(self) -> dict[str, str]:
        """The unit of every measure that an entry has."""
        found = {DEEP_SPACE: "km/s", "mid_radius_au": "au"}
        for entry in self.entries:
            found |= {name: each.unit for name, each in entry.survey.plan.measures.items()}
        return found

    def __repr__(self) -> str:
        return comparison_line(self)

    def _repr_html_(self) -> str:
        return comparison_html(self)


def compare(surveys: Sequence[Survey], days: int = 21, by: str | None = None) -> Comparison:
    """Lay surveys side by side, each by its own rank measure or all by `by`.

    RequestError where a survey is given twice, two share no measure, or one does not store `by`.
    """
    _refuse(surveys, days, by)
    names = _names(surveys)
    entries = tuple(_entry(survey, name, days, by) for survey, name in zip(surveys, names, strict=True))
    yardsticks = tuple(_yardsticks(entries))
    return Comparison(days, entries, yardsticks, tuple(_sentences(entries, yardsticks)))


def burn_split(measures: dict[str, Any]) -> list[tuple[str, float]]:
    """The burns of a route in flying order: "departure", "flyby 1", …, "deep space", "capture", km/s each."""
    burns = [("departure", measures.get("dv_departure_km_s"))]
    flybys = sorted(n for n in measures if n.startswith("flyby") and n.endswith("_burn_km_s"))
    burns += [(name.split("_")[0].replace("flyby", "flyby "), measures[name]) for name in flybys]
    burns += [("deep space", measures.get(DEEP_SPACE)), ("capture", measures.get("dv_capture_km_s"))]
    return [(title, float(value)) for title, value in burns if value is not None and value == value]


def comparison_table(comparison: Comparison) -> pd.DataFrame:
    """A row per survey and per baseline: what it is, dates, every measure, and the launch period."""
    rows: list[dict[str, Any]] = [
        {
            "name": entry.name,
            "kind": "survey",
            "folder": str(entry.survey.path),
            "route": entry.survey.plan.route,
            "ranked_by": entry.by,
            **{name: value for name, value in (entry.best or {}).items() if name != "rank"},
            **_period_columns(entry, comparison.days),
        }
        for entry in comparison.entries
    ]
    for yardstick in comparison.yardsticks:
        for each in yardstick.baselines:
            about = {
                "name": each.title,
                "kind": "baseline",
                "route": yardstick.route,
                "orbits_of": yardstick.of,
            }
            rows.append(about | {"departure": each.departure, "arrival": each.arrival} | each.measures)
    return pd.DataFrame(rows)


def _period_columns(entry: Entry, days: int) -> dict[str, Any]:
    columns: dict[str, Any] = {"period_days": days}
    if entry.period is None:
        return columns | {"period": entry.no_period}
    period = entry.period
    columns |= {"period_first": period.first, "period_last": period.last}
    columns |= {"period_worst": period.worst, "period_worst_on": period.worst_on}
    return columns | {f"period_worst_{need.name}": need.worst for need in period.needs}


def _entry(survey: Survey, name: str, days: int, by: str | None) -> Entry:
    by = by or survey.plan.rank_by
    best = _best(survey, by)
    if best is None:
        return Entry(name, survey, by, None, None, "no dates are allowed")
    table = day_table(survey, by, "nothing", days)
    longest = _longest_run(np.isfinite(table.cost[:, 0]))
    if longest < table.days.needed(days):
        reach = longest * table.days.step_days
        return Entry(name, survey, by, best, None, f"none of {days} days; the longest is {reach:.0f}")
    return Entry(name, survey, by, best, periods_in(survey, table, days, 0, 1)[0], "")


def _best(survey: Survey, by: str) -> dict[str, Any] | None:
    """The best candidate: from the survey's own table where that is ranked so."""
    if by == survey.plan.rank_by:
        table = survey.candidates
    else:
        order = "most" if better_sign(survey, by) < 0.0 else "least"
        table, _ = rank_anew(survey, by, order, 1, None)
    return None if table.empty else {str(name): value for name, value in table.iloc[0].to_dict().items()}


def _longest_run(open_days: np.ndarray) -> int:
    edges = np.flatnonzero(np.diff(np.concatenate(([0], open_days.astype(np.int8), [0]))))
    return int(np.diff(edges)[::2].max(initial=0))


def _yardsticks(entries: Sequence[Entry]) -> Iterable[Yardstick]:
    """The baselines of every pair of end bodies, once each."""
    for bodies in dict.fromkeys(entry.bodies for entry in entries):
        there = [entry for entry in entries if entry.bodies == bodies]
        richest = max(there, key=lambda entry: len(floor_measures(entry.survey.plan)))  # the first of equals
        plan = richest.survey.plan
        bielliptic = phased_bielliptic(plan)
        found = [hohmann_floor(plan), cheapest_bielliptic(plan, bielliptic)]
        ends = f"{plan.tables[0].body.title} → {plan.tables[-1].body.title}"
        kept = tuple(each for each in found if each is not None)
        yield Yardstick(ends, richest.name, kept, bielliptic)


def _sentences(entries: Sequence[Entry], yardsticks: Sequence[Yardstick]) -> Iterable[str]:
    for one, other in combinations(entries, 2):
        yield answer(one.name, one.best, other.name, other.best)
    if len(entries) == 1:
        for floor in (each for yardstick in yardsticks for each in yardstick.baselines):
            yield answer_to(entries[0].name, entries[0].best, floor.title, floor.measures)


def _names(surveys: Sequence[Survey]) -> list[str]:
    """Names of the scenarios; those that several have with their folders, which are different."""
    names = [survey.scenario.name for survey in surveys]
    return [
        name if names.count(name) == 1 else f"{name} ({survey.path})"
        for survey, name in zip(surveys, names, strict=True)
    ]


def _refuse(surveys: Sequence[Survey], days: int, by: str | None) -> None:
    faults = [] if days >= 1 else [f"--days {days}: a launch period has one day at least"]
    folders: list[Path] = []
    for survey in surveys:
        if survey.path.resolve() in folders:
            faults.append(f"{survey.path}: given twice; a survey is compared with others, or alone")
        folders.append(survey.path.resolve())
        if by is not None and by not in survey.plan.stored:
            near = difflib.get_close_matches(by, survey.plan.stored, n=1, cutoff=0.4)
            hint = f"the nearest is {near[0]!r}" if near else f"it has {', '.join(survey.plan.stored)}"
            faults.append(f"{survey.path}: the survey does not store {by!r}; {hint}")
    for one, other in combinations(surveys, 2):
        if not _comparable(one) & _comparable(other):
            faults.append(
                f"{one.path} and {other.path}: they store no measure in common beyond dates and revolutions: "
                f"{_listed(one)} there, {_listed(other)} here; name one for both in `measures`"
            )
    if faults:
        raise RequestError(*faults)


def _comparable(survey: Survey) -> set[str]:
    return {name for name in survey.plan.stored if _says_something(survey.plan.measures[name])}


def _says_something(measure: Measure) -> bool:
    return measure.dims == BOTH and not measure.name.endswith(_DATES_ALONE)


def _listed(survey: Survey) -> str:
    return ", ".join(sorted(_comparable(survey))) or "nothing"

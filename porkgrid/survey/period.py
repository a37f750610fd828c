"""Launch periods: the runs of departure days whose worst day is best.

A launcher and tanks are sized once and must hold on every day of the period, so that the worst day decides.
What is kept over the days is `hold`: "nothing" (arrival and flyby dates are chosen anew each day), "arrival"
(one arrival date for all days; flyby dates free), or "all" (one set of flyby dates and arrival, with the
revolutions and branches of its legs, out of those that are best for a day near by). A direct route has no
flyby dates, and so "all" and "arrival" are the same there.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import pandas as pd

from porkgrid.errors import RequestError
from porkgrid.sky.epochs import iso_from_jd
from porkgrid.survey.candidates import Picked, picked_at, tabulate
from porkgrid.survey.capability import Need, margin_of, needs_of
from porkgrid.survey.departuredays import (
    DepartureDays,
    closes_most,
    costs_by_arrival,
    costs_by_day,
    days_of,
    refuse_closed,
    signed_costs,
    stored_measure,
)
from porkgrid.survey.helddates import HeldDates, held_rows, hold_dates
from porkgrid.survey.periodkernels import least_run_costs, run_costs
from porkgrid.survey.showing import period_html, period_line
from porkgrid.survey.store import BLOCKED_BY
from porkgrid.survey.surveys import Survey
from porkgrid.survey.view import better_sign

HOLDS = ("nothing", "arrival", "all")


@dataclass(frozen=True, eq=False)
class LaunchPeriod:
    """A run of departure days with what each of them flies.

    by: the measure whose worst day was made best; `worst` is its worst value, on the day `worst_on`.
    days: how long the period is; first, last: ISO dates of its first and last departure.
    table: a row per day: ISO dates of all encounters, every measure of the route at full precision, and the
    margin, in the column named `margin`; where dates are wider apart than a day a row stands for `step_days`.
    needs: what launcher and spacecraft must be able to do.
    flown: (days,) numbers of the survey's departure days. column: of the day table that it was found in.
    """

    by: str
    days: int
    hold: str
    gap_days: int
    step_days: float
    first: str
    last: str
    worst: float
    worst_on: str
    table: pd.DataFrame
    margin: str
    needs: tuple[Need, ...]
    flown: np.ndarray
    column: int

    def __repr__(self) -> str:
        return period_line(self)

    def _repr_html_(self) -> str:
        return period_html(self)


@dataclass(frozen=True, eq=False)
class DayTable:
    """Costs (days, columns) of departure days for what is held, less being better; infinite where closed.

    Columns are one (nothing held), arrival dates, or the date sets of `held`.
    """

    days: DepartureDays
    by: str
    sign: float
    hold: str
    cost: np.ndarray
    held: HeldDates | None = None

    def spans(self, days: int, gap_days: int) -> tuple[int, int]:
        """How many of the table's days a period has, and how many it may leave out."""
        count = self.days.needed(days)
        return count, max(0, min(self.days.spared(gap_days), self.days.count - count))


def launch_periods(
    survey: Survey, days: int, by: str | None = None, hold: str = "nothing", gap_days: int = 0, keep: int = 3
) -> list[LaunchPeriod]:
    """Find the best distinct launch periods of so many days, best first, at most `keep` of them.

    Up to `gap_days` days may be left out inside a period. Periods are local bests of the sliding worst day
    and do not overlap. RequestError where no such period exists or the request makes no sense.
    """
    return periods_in(survey, day_table(survey, by, hold, reach=days + gap_days), days, gap_days, keep)


def periods_in(survey: Survey, table: DayTable, days: int, gap_days: int, keep: int) -> list[LaunchPeriod]:
    """As `launch_periods`, from the costs of a survey's days."""
    cost, column = sliding_worst(survey, table, days, gap_days)
    starts = _apart(table, cost, column, *table.spans(days, gap_days), keep)
    return [period_at(survey, table, days, gap_days, start, int(column[start])) for start in starts]


def day_table(survey: Survey, by: str | None, hold: str, reach: int) -> DayTable:
    """What leaving on each day costs; periods, with days left out, may be `reach` days long."""
    if hold not in HOLDS:
        raise RequestError(f"hold {hold!r}: not known; it can be {', '.join(HOLDS)}")
    name = stored_measure(survey, by)
    refuse_closed(survey)
    days, sign = days_of(survey), better_sign(survey, name)
    if hold == "nothing":
        return DayTable(days, name, sign, hold, costs_by_day(survey, name, days))
    if hold == "arrival" or not survey.plan.flybys:
        return DayTable(days, name, sign, "arrival", costs_by_arrival(survey, name, days))
    open_days = np.flatnonzero(np.isfinite(costs_by_day(survey, name, days)[:, 0]))
    bests = dict(zip(open_days.tolist(), _free_routes(survey, name, sign, days, open_days), strict=True))
    held = hold_dates(survey.plan, name, sign, days, bests, days.needed(max(reach, 1)))
    return DayTable(days, name, sign, hold, held.cost, held)


def sliding_worst(survey: Survey, table: DayTable, days: int, gap_days: int) -> tuple[np.ndarray, np.ndarray]:
    """(starts,) the cost of the period within each span of days, and its column of the table.

    RequestError where no span has a period.
    """
    _refuse_length(survey, table, days, gap_days)
    count, spare = table.spans(days, gap_days)
    starts = table.days.count - count - spare + 1
    cost, column = np.empty(starts), np.empty(starts, dtype=np.int64)
    run_costs(table.cost, count, spare, cost, column)
    if not np.isfinite(cost).any():
        raise RequestError(_too_long(survey, table, days, gap_days))
    return cost, column


def period_at(
    survey: Survey, table: DayTable, days: int, gap_days: int, start: int, column: int
) -> LaunchPeriod:
    """The launch period in the span of days that begins at `start`, flown as a column of the table says."""
    flown = _flown_days(table, start, column, *table.spans(days, gap_days))
    rows, margin = margin_of(survey.plan, flights(survey, table, flown, column))
    values = table.sign * rows[table.by].to_numpy()
    worst = int(np.argmax(values))
    return LaunchPeriod(
        by=table.by,
        days=days,
        hold=table.hold,
        gap_days=gap_days,
        step_days=table.days.step_days,
        first=str(rows["departure"].iloc[0]),
        last=str(rows["departure"].iloc[-1]),
        worst=float(rows[table.by].iloc[worst]),
        worst_on=str(rows["departure"].iloc[worst]),
        table=rows,
        margin=margin,
        needs=needs_of(survey, rows),
        flown=flown,
        column=column,
    )


def flights(survey: Survey, table: DayTable, days: np.ndarray, column: int) -> pd.DataFrame:
    """What some ascending days fly, with what a column of the table holds: dates and all measures of each.

    days: (k,) numbers of days that are open in that column.
    """
    return tabulate(survey.plan, _routes(survey, table, days, column)).drop(columns="rank")


def least_worst(table: DayTable, gap_days: int, up_to: int) -> np.ndarray:
    """(up_to,) worst value of the best period of 1, 2, … days; NaN for lengths that no period has."""
    counts = np.array([table.days.needed(days) for days in range(1, up_to + 1)])
    least = np.full(counts[-1], np.inf)
    least_run_costs(table.cost, table.days.spared(gap_days), least)
    return np.where(np.isfinite(least), table.sign * least, np.nan)[counts - 1]


def _apart(
    table: DayTable, cost: np.ndarray, column: np.ndarray, count: int, spare: int, keep: int
) -> list[int]:
    """Starts of the best periods that are local bests and do not overlap."""
    taken: list[tuple[int, int]] = []
    starts = []
    for start in local_best_starts(cost):
        flown = _flown_days(table, start, int(column[start]), count, spare)
        if all(flown[-1] < first or flown[0] > last for first, last in taken):
            taken.append((int(flown[0]), int(flown[-1])))
            starts.append(start)
        if len(starts) == keep:
            break
    return starts


def local_best_starts(cost: np.ndarray) -> list[int]:
    """Starts whose cost no neighbour beats, best first; all of a level stretch whose two sides are dearer."""
    level = np.flatnonzero(np.append(True, cost[1:] != cost[:-1]))  # where each level stretch begins
    at = cost[level]
    padded = np.concatenate(([np.inf], at, [np.inf]))
    lowest = np.isfinite(at) & (padded[:-2] >= at) & (padded[2:] >= at)
    ends = [*level[1:], len(cost)]
    starts = [
        i for first, end, good in zip(level, ends, lowest, strict=True) if good for i in range(first, end)
    ]
    return sorted(starts, key=lambda i: (cost[i], i))


def _flown_days(table: DayTable, start: int, column: int, count: int, spare: int) -> np.ndarray:
    """(count,) the cheapest days of a span, in order of date; of equal days the earlier."""
    cost = table.cost[start : start + count + spare, column if table.cost.shape[1] > 1 else 0]
    return start + np.sort(np.argsort(cost, kind="stable")[:count])


def _routes(survey: Survey, table: DayTable, flown: np.ndarray, column: int) -> list[Picked]:
    """What each day of a period flies."""
    if table.held is not None:
        one = table.held.sets[column]
        rows = [
            held_rows(survey.plan, table.by, table.sign, table.days.rows(day), one) for day in flown.tolist()
        ]
        return [Picked((float(table.days.jd[row]), *one.epochs[1:]), one.options) for row in rows]
    arrivals = slice(None) if table.hold == "nothing" else slice(column, column + 1)
    return _free_routes(survey, table.by, table.sign, table.days, flown, arrivals)


def _free_routes(
    survey: Survey,
    by: str,
    sign: float,
    days: DepartureDays,
    flown: np.ndarray,
    arrivals: slice = slice(None),
) -> list[Picked]:
    """The best allowed route of each of some ascending days, with an arrival date out of a range."""
    cells = list(_best_cells(survey, by, sign, days, flown, arrivals))
    i, j = np.array(cells).T
    return picked_at(survey.grid, survey.plan, i, j)


def _best_cells(
    survey: Survey, by: str, sign: float, days: DepartureDays, flown: np.ndarray, arrivals: slice
) -> Iterator[tuple[int, int]]:
    first = days.rows(int(flown[0])).start
    rows = slice(first, days.rows(int(flown[-1])).stop)
    band = survey.grid[[by, BLOCKED_BY]].isel(departure=rows, arrival=arrivals).load()
    values = band[by].broadcast_like(band[BLOCKED_BY]).transpose("departure", "arrival").values
    cost = signed_costs(values, band[BLOCKED_BY].values, sign)
    for day in flown.tolist():
        own = days.rows(day)
        of_day = cost[own.start - first : own.stop - first]
        i, j = np.unravel_index(np.argmin(of_day), of_day.shape)
        yield own.start + int(i), (arrivals.start or 0) + int(j)


def _refuse_length(survey: Survey, table: DayTable, days: int, gap_days: int) -> None:
    if days < 1:
        raise RequestError(f"{days} days: a launch period has one day at least")
    if gap_days < 0:
        raise RequestError(f"{gap_days} days left out: it can be 0 or more")
    count, _ = table.spans(days, gap_days)
    if count > table.days.count:
        window = round(table.days.count * table.days.step_days)
        first, last = (iso_from_jd(jd)[:10] for jd in table.days.jd[[0, -1]])
        raise RequestError(
            f"{survey.path}: a launch period of {days} days is longer than the departure window, "
            f"{first} to {last}: {window} days; ask for {window} or fewer, or sweep a wider window"
        )


def _too_long(survey: Survey, table: DayTable, days: int, gap_days: int) -> str:
    """Say how long a period can be, and which limit closes most."""
    longest = int(np.count_nonzero(~np.isnan(least_worst(table, gap_days, days))))
    held = {"nothing": "", "arrival": " with one arrival date", "all": " with flyby dates and arrival held"}
    gaps = f" and up to {gap_days} days left out" if gap_days else ""
    return (
        f"{survey.path}: no run of {days} allowed departure days{held[table.hold]}{gaps}: "
        f"the longest has {longest}; {closes_most(survey)}"
    )

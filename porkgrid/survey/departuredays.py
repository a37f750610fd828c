"""Departure days of a survey, and what leaving on each of them costs.

With steps of a day or less a day is a day of the calendar (TDB) and its best date counts. With a step of s
days, s > 1, every date stands for s days: a period of N days is ceil(N / s) dates, and "day" below means such
a date.
"""

from __future__ import annotations

import difflib
import math
from dataclasses import dataclass

import numpy as np

from porkgrid.errors import RequestError
from porkgrid.survey.store import BLOCKED_BY
from porkgrid.survey.surveys import Survey
from porkgrid.survey.view import better_sign, row_bands

_ROUND_OFF_DAYS = 1e-6  # of Julian dates that were counted up in steps: a tenth of a second


@dataclass(frozen=True, eq=False)
class DepartureDays:
    """The rows of a grid by the day they leave on.

    starts: (days,) the first row of each day. step_days: how many days of the calendar each stands for, 1 or
    more. jd: (rows,) TDB Julian dates.
    """

    starts: np.ndarray
    step_days: float
    jd: np.ndarray

    @property
    def count(self) -> int:
        """How many days there are."""
        return len(self.starts)

    @property
    def first_jd(self) -> np.ndarray:
        """(days,) the first date of each day."""
        return self.jd[self.starts]

    def needed(self, days: float) -> int:
        """How many of these make so many days of the calendar."""
        return math.ceil(days / self.step_days - _ROUND_OFF_DAYS)

    def spared(self, days: float) -> int:
        """How many of these so many days left out are."""
        return math.floor(days / self.step_days + _ROUND_OFF_DAYS)

    def rows(self, day: int) -> slice:
        """The rows that leave on a day."""
        end = self.starts[day + 1] if day + 1 < self.count else len(self.jd)
        return slice(int(self.starts[day]), int(end))

    def least(self, cost: np.ndarray) -> np.ndarray:
        """(days, …) the least cost of each day, of costs per row (rows, …)."""
        return cost if self.count == len(cost) else np.minimum.reduceat(cost, self.starts, axis=0)


def departure_days(jd: np.ndarray) -> DepartureDays:
    """Group ascending, evenly spaced departure dates (n,), TDB Julian dates, by the day they leave on."""
    step = float(jd[1] - jd[0]) if len(jd) > 1 else 1.0
    if step > 1.0 + _ROUND_OFF_DAYS:
        return DepartureDays(np.arange(len(jd)), step, jd)
    calendar = np.floor(jd - 0.5 + _ROUND_OFF_DAYS)  # Julian days begin at noon
    return DepartureDays(np.flatnonzero(np.diff(calendar, prepend=-np.inf)), 1.0, jd)


def days_of(survey: Survey) -> DepartureDays:
    """The departure days of a survey."""
    return departure_days(survey.plan.tables[0].jd)


def costs_by_arrival(survey: Survey, by: str, days: DepartureDays) -> np.ndarray:
    """(days, arrivals): a stored measure, signed so that less is better, of each day's best allowed date.

    Infinite where none is allowed. Four bytes a cell, eight of an epoch, are held at once.
    """
    sign = better_sign(survey, by)
    bands = [signed_costs(values, blocked, sign) for values, blocked in row_bands(survey, by)]
    return days.least(np.concatenate(bands) if len(bands) > 1 else bands[0])


def costs_by_day(survey: Survey, by: str, days: DepartureDays) -> np.ndarray:
    """(days, 1): as `costs_by_arrival`, of each day's best allowed arrival. The grid is read in bands."""
    sign = better_sign(survey, by)
    rows = [
        signed_costs(values, blocked, sign).min(axis=1, keepdims=True)
        for values, blocked in row_bands(survey, by)
    ]
    return days.least(np.concatenate(rows))


def signed_costs(values: np.ndarray, blocked: np.ndarray, sign: float) -> np.ndarray:
    """Values as costs of the same type, less being better; infinite where blocked or not a number."""
    shut = (blocked != 0) | np.isnan(values)
    return np.where(shut, values.dtype.type(np.inf), values if sign > 0.0 else -values)


def stored_measure(survey: Survey, by: str | None) -> str:
    """The measure asked for, by default the scenario's. RequestError where the survey does not store it."""
    if by is None:
        return survey.plan.rank_by
    stored = survey.plan.stored
    if by not in stored:
        near = difflib.get_close_matches(by, stored, n=1, cutoff=0.4)
        hint = f"the nearest is {near[0]!r}; " if near else ""
        raise RequestError(
            f"{survey.path}: the survey does not store {by!r}; {hint}it has {', '.join(stored)}"
        )
    return by


def refuse_closed(survey: Survey) -> None:
    """RequestError, with what closes most, where no cell of the survey is allowed."""
    if not survey.provenance["cells_allowed"]:
        raise RequestError(
            f"{survey.path}: no departure day is allowed; {closes_most(survey)}; "
            "give it more room, or sweep other dates"
        )


def closes_most(survey: Survey) -> str:
    """Which limit, or reason for which there is no flight, forbids most of the grid, in words."""
    forbidden, flags = survey.provenance["cells_forbidden_by"], survey.grid[BLOCKED_BY].attrs
    titles = dict(zip(flags["flag_meanings"].split(), flags["flag_titles"], strict=True))
    limits = [bound.measure.name for bound in survey.plan.bounds] or list(titles)
    worst = max(limits, key=lambda name: forbidden[name])
    share = 100.0 * forbidden[worst] / survey.provenance["cells"]
    return f"what closes most is {worst} ({titles[worst]}), {share:.1f} % of the grid"

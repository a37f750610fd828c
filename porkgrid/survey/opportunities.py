"""Opportunities: the best launch period of each season that a survey of many years holds."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from porkgrid.physics.constants import DAY_S, GM_SUN_KM3_S2
from porkgrid.sky.epochs import iso_from_jd
from porkgrid.sky.states import StateTable
from porkgrid.survey.period import (
    DayTable,
    LaunchPeriod,
    day_table,
    least_worst,
    local_best_starts,
    period_at,
    sliding_worst,
)
from porkgrid.survey.plan import Plan
from porkgrid.survey.surveys import Survey

# Seasons of eccentric planets come up to a tenth sooner or later than the mean (practice); what is nearer
# than this share of the mean is another start in the same season.
_SAME_SEASON = 0.6


@dataclass(frozen=True, eq=False)
class Opportunity:
    """A season of departures. first, last: ISO dates of its period, or of the allowed days of one too short.

    period: None where the longest there is, of `longest_days`, is shorter than was asked for. cut: it reaches
    the first or last date of the departure window, beyond which it may go on and be better.
    """

    first: str
    last: str
    longest_days: int
    period: LaunchPeriod | None
    cut: bool

    @property
    def year(self) -> int:
        """The year it begins in."""
        return int(self.first[:4])


def synodic_days(plan: Plan) -> float:
    """The synodic period of the first and last body, from mean motions in mid-window; may be infinite."""
    rates = [_mean_motion_rad_s(table) for table in (plan.tables[0], plan.tables[-1])]
    relative = abs(rates[0] - rates[1])
    # the same body twice, whose mean motions differ by rounding and perturbations only
    return math.inf if relative < 1e-3 * max(rates) else 2.0 * math.pi / relative / DAY_S


def holds_several(survey: Survey) -> bool:
    """Whether the departure window is longer than a synodic period."""
    jd = survey.plan.tables[0].jd
    return bool(jd[-1] - jd[0] > synodic_days(survey.plan))


def opportunities(
    survey: Survey, days: int, by: str | None = None, hold: str = "nothing", gap_days: int = 0
) -> list[Opportunity]:
    """Find the best launch period of so many days in each season, in order of date.

    Starts are taken best first; those within 0.6 synodic periods of one taken are the same season. A season
    whose allowed days are too few is listed without a period. Errors as of `launch_periods`.
    """
    return opportunities_in(survey, day_table(survey, by, hold, reach=days + gap_days), days, gap_days)


def opportunities_in(survey: Survey, table: DayTable, days: int, gap_days: int) -> list[Opportunity]:
    """As `opportunities`, from the costs of a survey's days."""
    cost, column = sliding_worst(survey, table, days, gap_days)
    apart = _SAME_SEASON * synodic_days(survey.plan)
    starts = _first_of_seasons(table.days.first_jd, local_best_starts(cost), apart)
    found = []
    for start in starts:
        period = period_at(survey, table, days, gap_days, start, int(column[start]))
        found.append(Opportunity(period.first, period.last, days, period, _at_edge(table, period.flown)))
    found += _too_short(table, starts, apart, days, gap_days)
    return sorted(found, key=lambda each: each.first)


def _first_of_seasons(jd: np.ndarray, starts: Sequence[int], apart: float) -> list[int]:
    taken: list[int] = []
    for start in starts:
        if all(abs(jd[start] - jd[other]) >= apart for other in taken):
            taken.append(start)
    return taken


def _too_short(
    table: DayTable, starts: Sequence[int], apart: float, days: int, gap_days: int
) -> list[Opportunity]:
    """Seasons in which no period fits: their longest run of allowed days, and the longest period in it."""
    allowed = np.isfinite(table.cost).any(axis=1)
    padded = np.concatenate(([False], allowed, [False]))
    first = np.flatnonzero(padded[1:] & ~padded[:-1])
    last = np.flatnonzero(padded[:-1] & ~padded[1:]) - 1
    longest_first = np.argsort(first - last, kind="stable")
    jd, taken = table.days.first_jd, list(starts)
    found = []
    for run in longest_first.tolist():
        if any(abs(jd[first[run]] - jd[other]) < apart for other in taken):
            continue
        taken.append(int(first[run]))
        ends = np.array([first[run], last[run]])
        dates = [iso_from_jd(each) for each in jd[ends]]
        season = replace(table, cost=table.cost[first[run] : last[run] + 1])
        longest = int(np.count_nonzero(~np.isnan(least_worst(season, gap_days, days))))
        found.append(Opportunity(dates[0], dates[1], longest, None, _at_edge(table, ends)))
    return found


def _at_edge(table: DayTable, flown: np.ndarray) -> bool:
    return bool(flown[0] == 0 or flown[-1] == table.days.count - 1)


def _mean_motion_rad_s(table: StateTable) -> float:
    """Mean motion of a heliocentric orbit from its state in mid-table; 0 for one that does not return."""
    middle = len(table.jd) // 2
    distance, speed = (np.linalg.norm(each[:, middle]) for each in (table.position, table.velocity))
    per_axis = 2.0 / distance - speed * speed / GM_SUN_KM3_S2  # 1/a, vis-viva
    return math.sqrt(GM_SUN_KM3_S2 * per_axis**3) if per_axis > 0.0 else 0.0

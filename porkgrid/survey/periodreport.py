"""All that is to be said of a survey's launch periods of one length, from one reading of its grid."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from porkgrid.survey.growth import UP_TO_DAYS
from porkgrid.survey.opportunities import Opportunity, holds_several, opportunities_in
from porkgrid.survey.period import DayTable, LaunchPeriod, day_table, flights, least_worst, periods_in
from porkgrid.survey.showing import report_html
from porkgrid.survey.surveys import Survey

_LEAST_NEIGHBOURS = 10


@dataclass(frozen=True, eq=False)
class PeriodReport:
    """Launch periods and what surrounds them.

    periods: best first. neighbours: allowed days around the best one, flown by the same rule, as its table.
    lengths, worst: (n,) how cost grows with length, NaN where there is no such period. opportunities: in
    order of date; empty where the window has room for one season only.
    """

    periods: list[LaunchPeriod]
    neighbours: pd.DataFrame
    lengths: np.ndarray
    worst: np.ndarray
    opportunities: list[Opportunity]

    def __repr__(self) -> str:
        return f"<PeriodReport of {len(self.periods)}, the best {self.periods[0]!r}>"

    def _repr_html_(self) -> str:
        return report_html(self.periods)


def report_periods(
    survey: Survey, days: int, by: str | None = None, hold: str = "nothing", gap_days: int = 0, keep: int = 3
) -> PeriodReport:
    """Find the best launch periods, the days around the best, growth, seasons. Errors as `launch_periods`."""
    up_to = max(days, UP_TO_DAYS)
    table = day_table(survey, by, hold, reach=up_to + gap_days)
    periods = periods_in(survey, table, days, gap_days, keep)
    return PeriodReport(
        periods=periods,
        neighbours=_neighbours(survey, table, periods[0]),
        lengths=np.arange(1, up_to + 1),
        worst=least_worst(table, gap_days, up_to),
        opportunities=opportunities_in(survey, table, days, gap_days) if holds_several(survey) else [],
    )


def _neighbours(survey: Survey, table: DayTable, period: LaunchPeriod) -> pd.DataFrame:
    """Allowed days on either side of a period, and those left out inside it."""
    reach = max(_LEAST_NEIGHBOURS, len(period.flown) // 2)
    first, last = int(period.flown[0]) - reach, int(period.flown[-1]) + reach
    around = np.arange(max(first, 0), min(last + 1, table.days.count))
    cost = table.cost[around, period.column if table.cost.shape[1] > 1 else 0]
    days = np.setdiff1d(around[np.isfinite(cost)], period.flown)
    if not days.size:
        return period.table.iloc[:0]
    return flights(survey, table, days, period.column)

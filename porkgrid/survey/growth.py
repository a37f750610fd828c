"""How the cost of a launch period grows with its length."""

from __future__ import annotations

import numpy as np

from porkgrid.errors import RequestError
from porkgrid.survey.departuredays import days_of, refuse_closed, signed_costs
from porkgrid.survey.period import DayTable, day_table, least_worst
from porkgrid.survey.store import BLOCKED_BY
from porkgrid.survey.surveys import Survey
from porkgrid.survey.view import better_sign

UP_TO_DAYS = 60


def growth(
    survey: Survey, by: str | None = None, hold: str = "nothing", gap_days: int = 0, up_to: int = UP_TO_DAYS
) -> tuple[np.ndarray, np.ndarray]:
    """Find the best launch period of every length: lengths 1, 2, … days and worst values, (up_to,) each.

    NaN for lengths that no period has. Errors as of `launch_periods`.
    """
    if up_to < 1:
        raise RequestError(f"{up_to} days: a launch period has one day at least")
    table = day_table(survey, by, hold, reach=up_to + gap_days)
    return np.arange(1, up_to + 1), least_worst(table, gap_days, up_to)


def growth_of_all(
    survey: Survey, hold: str = "nothing", gap_days: int = 0, up_to: int = UP_TO_DAYS
) -> dict[str, np.ndarray]:
    """Find the best launch period of every length by every measure that is stored: worst values (up_to,).

    hold: "nothing" or "arrival". Each variable of the store is read once.
    """
    if hold not in ("nothing", "arrival"):
        raise RequestError(f"hold {hold!r}: of all measures at once it can be nothing or arrival")
    refuse_closed(survey)
    days, grid = days_of(survey), survey.grid.isel(departure=slice(None))  # a view: what it reads is not kept
    blocked = grid[BLOCKED_BY].load()
    found = {}
    for name in survey.plan.stored:
        sign = better_sign(survey, name)
        values = grid[name].broadcast_like(blocked).transpose("departure", "arrival").values
        cost = signed_costs(values, blocked.values, sign)
        if hold == "nothing":
            cost = cost.min(axis=1, keepdims=True)
        found[name] = least_worst(DayTable(days, name, sign, hold, days.least(cost)), gap_days, up_to)
    return found

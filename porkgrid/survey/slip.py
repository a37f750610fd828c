"""Slip: what leaving late costs a candidate when the rest of its route is chosen anew."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pandas as pd

from porkgrid.errors import RequestError
from porkgrid.sky.epochs import iso_from_jd
from porkgrid.survey.departuredays import DepartureDays, costs_by_day, days_of, stored_measure
from porkgrid.survey.surveys import Survey
from porkgrid.survey.view import better_sign

LATE_DAYS = (1, 5, 10, 20)
OPEN, CLOSED, OUTSIDE = "open", "closed", "outside the window"
_ROUND_OFF_DAYS = 1e-6


def slip(survey: Survey, by: str | None = None, late: Sequence[int] = LATE_DAYS) -> pd.DataFrame:
    """Tabulate what each candidate loses by leaving late, in a stored measure; a row per candidate.

    Columns: rank, departure, arrival, the measure, then of each number of days late L `late_L_departure` (the
    first departure date of the grid at or after it), `late_L_<measure>` (the best allowed value of that day),
    `late_L_change` (against the candidate's own) and `late_L_state`: "open", "closed" (no allowed route that
    day) or "outside the window" (the grid ends before it). At the end `last_departure`, the last day that can
    be reached from the candidate's without a closed day in between, `last_days_late`, and `last_state`: what
    comes after it, "closed" or "outside the window".
    """
    name = stored_measure(survey, by)
    wrong = [days for days in late if days < 1]
    if wrong:
        raise RequestError(*(f"{days} days late: it can be 1 or more" for days in wrong))
    days = days_of(survey)
    sign = better_sign(survey, name)
    best = sign * costs_by_day(survey, name, days)[:, 0].astype(float)
    shown = [column for column in ("rank", "departure", "arrival", name) if column in survey.candidates]
    rows = [
        dict(zip(shown, own[shown], strict=True)) | _lateness(days, best, own, name, late)
        for _, own in survey.candidates.iterrows()
    ]
    return pd.DataFrame(rows, columns=_columns(shown, name, late))


def _lateness(
    days: DepartureDays, best: np.ndarray, own: pd.Series, name: str, late: Sequence[int]
) -> dict[str, object]:
    jd = own["departure_epoch_jd_tdb"]
    row: dict[str, object] = {}
    for each in late:
        day = _day_at_or_after(days, jd + each)
        state = OUTSIDE if day is None else OPEN if np.isfinite(best[day]) else CLOSED
        value = best[day] if day is not None and state == OPEN else np.nan
        row |= {
            f"late_{each}_departure": None if day is None else iso_from_jd(days.first_jd[day]),
            f"late_{each}_{name}": value,
            f"late_{each}_change": value - own[name],
            f"late_{each}_state": state,
        }
    return row | _last(days, best, jd)


def _last(days: DepartureDays, best: np.ndarray, jd: float) -> dict[str, object]:
    """The last day before the first closed one after a departure."""
    own = int(np.searchsorted(days.first_jd, jd + _ROUND_OFF_DAYS, side="right")) - 1
    closed = np.flatnonzero(~np.isfinite(best[own:]))
    last = own + int(closed[0]) - 1 if closed.size else days.count - 1
    last = max(last, own)
    return {
        "last_departure": iso_from_jd(days.first_jd[last]),
        "last_days_late": float(np.floor(max(days.first_jd[last] - jd, 0.0) + _ROUND_OFF_DAYS)),
        "last_state": CLOSED if closed.size else OUTSIDE,
    }


def _day_at_or_after(days: DepartureDays, jd: float) -> int | None:
    """The number of the day that holds a date; where days stand for several, the first at or after it."""
    if jd > days.jd[-1] + _ROUND_OFF_DAYS:
        return None
    row = int(np.searchsorted(days.jd, jd - _ROUND_OFF_DAYS))
    return int(np.searchsorted(days.starts, row, side="right")) - 1


def _columns(shown: Sequence[str], name: str, late: Sequence[int]) -> list[str]:
    of_late = [f"late_{each}_{what}" for each in late for what in ("departure", name, "change", "state")]
    return [*shown, *of_late, "last_departure", "last_days_late", "last_state"]

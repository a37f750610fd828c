"""Dates on axes: as numbers of days, as cell edges, and as ticks at round dates."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from functools import partial

import numpy as np

Ticks = tuple[np.ndarray, list[str]]

UNIX_EPOCH_JD = 2_440_587.5  # 1970-01-01

_MS_PER_DAY = 86_400_000.0
_LONGEST_GAP = 2.1  # between two marks, in steps: months and the ends of months differ
_HOUR_STEPS = (1, 2, 3, 6, 12)
_DAY_STEPS = (1, 2, 5, 10)
_MONTH_STEPS = (1, 2, 3, 6)
_YEAR_STEPS = (1, 2, 5, 10, 20, 50, 100)


def days_from_dates(dates: np.ndarray) -> np.ndarray:
    """Return datetime64 dates (n,) as float days since 1970-01-01."""
    return np.asarray(dates).astype("datetime64[ms]").astype(np.int64) / _MS_PER_DAY


def dates_from_days(days: np.ndarray | float) -> np.ndarray:
    """Return float days since 1970-01-01 as datetime64[ms], to the nearest millisecond."""
    return np.round(np.asarray(days, dtype=float) * _MS_PER_DAY).astype(np.int64).astype("datetime64[ms]")


def dates_from_iso(texts: Iterable[str]) -> np.ndarray:
    """Return ISO dates, with or without a time of day (2028-11-30, 2028-11-30T12:00), as datetime64[ms]."""
    return np.array([str(text) for text in texts], dtype="datetime64[ms]")


def iso_day(date: np.datetime64 | np.ndarray) -> str:
    """Return the calendar day of a date: 2028-11-30."""
    return str(np.datetime_as_string(date.astype("datetime64[D]")))


def cell_edges(days: np.ndarray) -> np.ndarray:
    """Return the n + 1 edges between ascending dates (n,); a single date gets a cell of one day."""
    if days.size == 1:
        return np.array([days[0] - 0.5, days[0] + 0.5])
    middles = 0.5 * (days[1:] + days[:-1])
    return np.concatenate(([1.5 * days[0] - 0.5 * days[1]], middles, [1.5 * days[-1] - 0.5 * days[-2]]))


def date_ticks(first_day: float, last_day: float, most: int) -> Ticks:
    """Return at most `most` round dates in the range, two or more if there are, as days and ISO labels."""
    marks, _ = _round_dates(last_day - first_day, most)
    return marks(first_day, last_day)


def dates_around(first_day: float, last_day: float, most: int) -> np.ndarray:
    """Return ascending round dates, in days, the first and last of which enclose the range; two at least."""
    marks, step_days = _round_dates(max(last_day - first_day, 1.0), most)
    pad = _LONGEST_GAP * step_days
    days, _ = marks(first_day - pad, last_day + pad)
    start = int(np.searchsorted(days, first_day, side="right")) - 1
    end = max(int(np.searchsorted(days, last_day, side="left")), start + 1)
    return days[start : end + 1]


def _round_dates(span: float, most: int) -> tuple[Callable[[float, float], Ticks], float]:
    """Choose the finest round step that cuts a span into few enough pieces: its marks, and its days."""
    if span > 2.0:
        for step in _DAY_STEPS:
            if span / step <= most:
                return partial(_day_ticks, step=step), float(step)
        for step in _MONTH_STEPS:
            if span / (30.5 * step) <= most - 0.5:
                return partial(_month_ticks, step=step), 31.0 * step
        for step in _YEAR_STEPS:
            if span / (365.25 * step) <= most - 0.5 or step == _YEAR_STEPS[-1]:
                return partial(_year_ticks, step=step), 366.0 * step
    for step in _HOUR_STEPS:
        if span * 24.0 / step <= most:
            return partial(_hour_ticks, step=step), step / 24.0
    return partial(_day_ticks, step=1), 1.0


def _hour_ticks(first_day: float, last_day: float, step: int) -> tuple[np.ndarray, list[str]]:
    hours = np.arange(np.ceil(first_day * 24.0 / step), np.floor(last_day * 24.0 / step) + 1.0) * step
    iso = np.datetime_as_string(hours.astype(np.int64).astype("datetime64[h]"))
    labels = [day if hour == "00" else f"{hour}:00" for day, hour in (d.split("T") for d in iso)]
    return hours / 24.0, labels


def _day_ticks(first_day: float, last_day: float, step: int) -> tuple[np.ndarray, list[str]]:
    days = np.arange(np.ceil(first_day), np.floor(last_day) + 1.0).astype(np.int64).astype("datetime64[D]")
    if step > 1:  # days of the month that divide it evenly, and none so near the next 1st that labels collide
        of_month = (days - days.astype("datetime64[M]")).astype(int) + 1
        days = days[
            (of_month == 1) | ((of_month % step == (1 if step == 2 else 0)) & (of_month <= 31 - step))
        ]
    return days_from_dates(days), list(np.datetime_as_string(days))


def _month_ticks(first_day: float, last_day: float, step: int) -> tuple[np.ndarray, list[str]]:
    return _calendar_ticks(first_day, last_day, "datetime64[M]", step, 0)


def _year_ticks(first_day: float, last_day: float, step: int) -> tuple[np.ndarray, list[str]]:
    return _calendar_ticks(first_day, last_day, "datetime64[Y]", step, 1970)


def _calendar_ticks(
    first_day: float, last_day: float, unit: str, step: int, epoch: int
) -> tuple[np.ndarray, list[str]]:
    """Return the starts of every step-th month or year; epoch is the number of the one that 1970 begins."""
    first, last = dates_from_days(np.array([first_day, last_day])).astype(unit).astype(np.int64)
    numbers = np.arange(first, last + 1)
    marks = numbers[(numbers + epoch) % step == 0].astype(unit)
    days = days_from_dates(marks)
    inside = (days >= first_day) & (days <= last_day)
    return days[inside], list(np.datetime_as_string(marks[inside]))

"""Which values a chart tells apart: round levels from the best value to where detail stops mattering."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from porkgrid.figures.dates import (
    UNIX_EPOCH_JD,
    date_ticks,
    dates_around,
    dates_from_days,
    iso_day,
)
from porkgrid.figures.palette import depth_colours

_ROUND_STEPS = (1.0, 2.0, 2.5, 5.0, 10.0)
_BANDS = 10
_DATE_BANDS = 12
_FLOAT32_NOISE = 1e-6  # the store holds single precision; a smaller relative spread is a constant


@dataclass(frozen=True)
class Numbers:
    """How the values of a measure are written: as numbers, single ones with the decimals of `step`."""

    step: float

    def text(self, value: float) -> str:
        """Write a single value."""
        return value_text(value, self.step)

    def texts(self, levels: np.ndarray) -> list[str]:
        """Write evenly spaced levels."""
        step = float(levels[1] - levels[0])
        return [value_text(float(level), step) for level in levels]

    def ticks(self, low: float, high: float, most: int) -> tuple[np.ndarray, list[str]]:
        """Return round values in a range, so many steps long or fewer, with their texts."""
        step = round_step(high - low, most)
        marks = np.arange(np.ceil(low / step - 1e-6), np.floor(high / step + 1e-6) + 0.5) * step
        return marks, [value_text(float(mark), step) for mark in marks]


@dataclass(frozen=True)
class Dates:
    """How the values of a measure are written that are epochs, TDB Julian dates: as calendar dates."""

    def text(self, value: float) -> str:
        """Write the day of a single value."""
        return iso_day(dates_from_days(value - UNIX_EPOCH_JD))

    def texts(self, levels: np.ndarray) -> list[str]:
        """Write the days of levels; months, or years, where all of them begin one."""
        days = [self.text(float(level)) for level in levels]
        for start in ("-01-01", "-01"):
            if all(day.endswith(start) for day in days):
                return [day.removesuffix(start) for day in days]
        return days

    def ticks(self, low: float, high: float, most: int) -> tuple[np.ndarray, list[str]]:
        """Return round dates in a range, at most so many, with their texts."""
        days, labels = date_ticks(low - UNIX_EPOCH_JD, high - UNIX_EPOCH_JD, most)
        return days + UNIX_EPOCH_JD, labels


@dataclass(frozen=True, eq=False)
class Scale:
    """Bands of value: `levels` (n + 1,) ascending bound n bands; all values worse than those are one more.

    colours: (n + 1, 3) float RGB, band by band from the lowest value; for order "least" the band of worse
    values comes last, for "most" it comes first. Where no value is worse, as of dates, there are n.
    """

    levels: np.ndarray
    colours: np.ndarray
    order: str
    writing: Numbers | Dates

    @property
    def texts(self) -> list[str]:
        """Return the levels as they are written."""
        return self.writing.texts(self.levels)

    @property
    def has_worse(self) -> bool:
        """Tell whether there is a band of values worse than all levels."""
        return len(self.colours) == len(self.levels)

    def band_of(self, values: np.ndarray) -> np.ndarray:
        """Return the index into `colours` of each value; NaN gives the last band, so mask it before use."""
        index = np.searchsorted(self.levels, values, side="right")
        if self.order == "least" or not self.has_worse:
            return np.clip(index - 1, 0, len(self.colours) - 1)
        return np.clip(index, 0, len(self.colours) - 1)


def round_step(span: float, pieces: int) -> float:
    """Return the least of 1, 2, 2.5, 5 times a power of ten that cuts a span into so many pieces or fewer."""
    raw = span / pieces
    power = 10.0 ** np.floor(np.log10(raw))
    return float(next(power * step for step in _ROUND_STEPS if power * step >= raw * (1.0 - 1e-9)))


def round_levels(low: float, high: float, pieces: int) -> np.ndarray:
    """Return ascending round levels that enclose low to high; a constant gets one band around it."""
    size = max(abs(low), abs(high))
    if high - low <= _FLOAT32_NOISE * size or high == low:
        step = round_step(size if size > 0.0 else 1.0, 100)
    else:
        step = round_step(high - low, pieces)
    first, last = np.floor(low / step + 1e-6), np.ceil(high / step - 1e-6)
    return np.arange(first, max(last, first + 1.0) + 0.5) * step


def value_scale(values: np.ndarray, order: str) -> Scale | None:
    """Choose the bands for a chart of these values, over the range that matters, from the best value on.

    values: any shape; NaN and infinities are left out. Returns None if nothing is left.
    """
    finite = values[np.isfinite(values)].astype(float)
    if finite.size == 0:
        return None
    worse = finite if order == "least" else -finite
    best, reach = range_that_matters(worse)
    low, high = (best, reach) if order == "least" else (-reach, -best)
    levels = round_levels(low, high, _BANDS)
    colours = depth_colours(len(levels))
    fine = float(10.0 ** np.floor(np.log10((levels[1] - levels[0]) / 50.0)))  # a hundredth of a band
    return Scale(levels, colours if order == "least" else colours[::-1], order, Numbers(fine))


def date_scale(epochs_jd: np.ndarray, order: str) -> Scale | None:
    """Choose bands between round dates, from the first epoch to the last; NaN are left out, None if all are.

    epochs_jd: any shape, TDB Julian dates. The order says which date of several a strip shows.
    """
    finite = epochs_jd[np.isfinite(epochs_jd)]
    if finite.size == 0:
        return None
    levels = date_levels(float(finite.min()), float(finite.max()), _DATE_BANDS)
    return Scale(levels, depth_colours(len(levels) - 1), order, Dates())


def date_levels(first_jd: float, last_jd: float, most: int) -> np.ndarray:
    """Return ascending round dates that enclose two epochs, as Julian dates."""
    return dates_around(first_jd - UNIX_EPOCH_JD, last_jd - UNIX_EPOCH_JD, most) + UNIX_EPOCH_JD


def range_that_matters(values: np.ndarray) -> tuple[float, float]:
    """Return the least of finite values and how far up their detail matters.

    A porkchop has a deep, narrow best region and walls hundreds of times higher. The range runs four times as
    far as the lowest quarter of the values reaches, and never beyond the lowest 95 %.
    """
    least, quarter, most = np.quantile(values, [0.0, 0.25, 0.95])
    reach = min(most, least + 4.0 * (quarter - least)) if quarter > least else most
    return float(least), float(reach)


def value_text(value: float, step: float) -> str:
    """Write a value with the decimals that a step needs: 12.5 for a step of 2.5."""
    if not 1e-4 <= step < 1e7:
        return f"{value:.6g}"
    decimals = 0
    while decimals < 6 and abs(round(step, decimals) - step) > 1e-6 * step:
        decimals += 1
    return f"{value + 0.0:.{decimals}f}".replace("-", "−")

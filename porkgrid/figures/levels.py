"""Which values a chart tells apart: round levels from the best value to where detail stops mattering."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from porkgrid.figures.palette import depth_colours

_ROUND_STEPS = (1.0, 2.0, 2.5, 5.0, 10.0)
_BANDS = 10
_FLOAT32_NOISE = 1e-6  # the store holds single precision; a smaller relative spread is a constant


@dataclass(frozen=True, eq=False)
class Scale:
    """Bands of value: `levels` (n + 1,) ascending bound n bands; all values worse than those are one more.

    colours: (n + 1, 3) float RGB, band by band from the lowest value; for order "least" the band of worse
    values comes last, for "most" it comes first.
    """

    levels: np.ndarray
    colours: np.ndarray
    order: str

    def band_of(self, values: np.ndarray) -> np.ndarray:
        """Return the index into `colours` of each value; NaN gives the last band, so mask it before use."""
        index = np.searchsorted(self.levels, values, side="right")
        if self.order == "least":
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
    return Scale(levels, colours if order == "least" else colours[::-1], order)


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

"""Value and date axes of small panels: range, round ticks, name with unit."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial

import numpy as np
from matplotlib.axes import Axes

from porkgrid.figures.dates import UNIX_EPOCH_JD, Ticks, date_ticks
from porkgrid.figures.levels import Numbers
from porkgrid.figures.measured import plain_symbol
from porkgrid.figures.numbers import number_text
from porkgrid.figures.placement import Box
from porkgrid.figures.style import BODY_PT, FAINT_INK
from porkgrid.figures.text import shorten, width_in
from porkgrid.sky.epochs import iso_from_jd
from porkgrid.survey.measures import Measure

_EDGE = 0.12  # of a range, beside its extreme values
_LEAST_SHARE = 1e-3  # of a value: narrower ranges are drawn as wide as this
_LEAST_DAYS = 4.0
_TICK_ROOM_IN = 0.26
_LEAST_TICKS, _MORE = 2, 4
_OVER_IN = 0.2  # that a name may be longer than its axis


def reach(values: np.ndarray, least: float = 0.0) -> tuple[float, float]:
    """The range of an axis that holds finite values (k,) with a margin, `least` wide or wider if given."""
    known = values[np.isfinite(values)]
    low, high = float(known.min()), float(known.max())
    wide = max(high - low, least or _LEAST_SHARE * max(abs(low), abs(high)), 1e-9)
    middle = 0.5 * (low + high)
    half = (0.5 + _EDGE) * wide
    return middle - half, middle + half


def mark_measure(axes: Axes, values: np.ndarray, box: Box, measure: Measure, lead: str = "") -> np.ndarray:
    """Give an axis the range and name of a measure's values (k,); return them as the axis counts.

    Epochs become days since 1970 on an axis of calendar dates. `lead` goes before the name.
    """
    symbol = lead + plain_symbol(measure.symbol).replace("(JD TDB)", "(TDB)")
    if not _is_epoch(measure):
        mark_values(axes, reach(values), box, symbol, measure.unit)
        return values
    days = values - UNIX_EPOCH_JD
    mark_dates(axes, reach(days, _LEAST_DAYS), box, symbol)
    return days


def measure_text(measure: Measure, value: float) -> str:
    """Write a value of a measure with its unit, or as a calendar date."""
    return iso_from_jd(value) if _is_epoch(measure) else number_text(value, measure.unit)


def _is_epoch(measure: Measure) -> bool:
    return measure.name.endswith("_epoch_jd_tdb")


def mark_values(axes: Axes, limits: tuple[float, float], box: Box, name: str, unit: str) -> None:
    """Give an axis of values its range, round ticks with faint lines, and its name."""
    _mark(axes, limits, partial(Numbers(1.0).ticks, *limits), box)
    height = box.top - box.bottom
    whole = name if unit == "1" else f"{name} ({unit})"
    text = (
        whole
        if width_in(whole, BODY_PT) <= height
        else f"{shorten(name, height + _OVER_IN, BODY_PT)}\n({unit})"
    )
    axes.set_ylabel(text, fontsize=BODY_PT, labelpad=3.0)


def mark_dates(axes: Axes, limits: tuple[float, float], box: Box, name: str) -> None:
    """Give an axis of days since 1970 its range, round dates with faint lines, and its name."""
    _mark(axes, limits, partial(date_ticks, *limits), box)
    axes.set_ylabel(name, fontsize=BODY_PT, labelpad=3.0)


def _mark(axes: Axes, limits: tuple[float, float], ticks_of: Callable[[int], Ticks], box: Box) -> None:
    """Set a range, and as many round ticks as have room; two if that can be."""
    axes.set_ylim(*limits)
    room = max(_LEAST_TICKS, int((box.top - box.bottom) / _TICK_ROOM_IN))
    choices = (ticks_of(most) for most in range(room, room + _MORE))
    ticks, texts = next((each for each in choices if len(each[0]) >= _LEAST_TICKS), ticks_of(room))
    axes.set_yticks(ticks, texts)
    axes.grid(True, axis="y", color=FAINT_INK, linewidth=0.35, alpha=0.6)

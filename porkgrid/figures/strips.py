"""The best value of each day beside the panel, with the runs of allowed days marked as open windows."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from matplotlib.axes import Axes
from matplotlib.axis import Axis
from matplotlib.figure import Figure

from porkgrid.figures.dates import cell_edges, dates_from_days, days_from_dates, iso_day
from porkgrid.figures.levels import Scale
from porkgrid.figures.marks import add_line, add_rectangle
from porkgrid.figures.panel import Panel, mark_departure_dates
from porkgrid.figures.placement import Box
from porkgrid.figures.style import FAINT_INK, INK, SMALL_PT, SOFT_INK, axes_at
from porkgrid.figures.text import POINTS_PER_INCH, put, width_in

WINDOW_INK = "#2b59c3"
_LANE_IN = 0.07  # thickness of a window's bar
_MOST_TICKS, _TICK_GAP_IN = 4, 0.06
_MARGIN = 0.03  # of a strip's range, beside its extreme values
_LEAST_BAR_IN = 0.03  # so that a window of one day in fifteen years can be seen


@dataclass(frozen=True)
class Window:
    """A run of allowed dates: its outer cell edges in days, its first and last calendar day."""

    start: float
    end: float
    first: np.datetime64
    last: np.datetime64

    @property
    def days(self) -> int:
        """Return how many calendar days it spans, first and last included."""
        return int((self.last - self.first) / np.timedelta64(1, "D")) + 1

    @property
    def texts(self) -> list[str]:
        """Return descriptions, the longest first."""
        days = f"{self.days} d"
        if self.days == 1:
            return [f"{iso_day(self.first)} · {days}", iso_day(self.first), days]
        both = f"{iso_day(self.first)} – {iso_day(self.last)}"
        return [f"{both} · {days}", days]


def open_windows(dates: np.ndarray, best: np.ndarray) -> list[Window]:
    """Return the runs of dates that have a best value; dates datetime64 (n,), best (n,), NaN where none."""
    days = days_from_dates(dates)
    edges = cell_edges(days)
    allowed = np.concatenate(([False], np.isfinite(best), [False]))
    starts = np.flatnonzero(allowed[1:] & ~allowed[:-1])
    ends = np.flatnonzero(allowed[:-1] & ~allowed[1:]) - 1
    calendar = dates_from_days(days).astype("datetime64[D]")
    return [
        Window(float(edges[a]), float(edges[b + 1]), calendar[a], calendar[b])
        for a, b in zip(starts, ends, strict=True)
    ]


def draw_departure_strip(
    figure: Figure,
    sheet: Axes,
    panel: Panel,
    box: Box,
    dates: np.ndarray,
    best: np.ndarray,
    scale: Scale | None,
) -> None:
    """Draw the best value of each departure day under the panel, windows in the lane between them."""
    axes = axes_at(figure, box.left, box.bottom, box.right - box.left, box.top - box.bottom)
    axes.set_xlim(*panel.x_days)
    mark_departure_dates(panel, axes, bare=False)
    if scale is None:
        axes.set_yticks([])
    else:
        axes.set_ylim(_reach(best, scale))
        _mark_values(axes.yaxis, scale, box.top - box.bottom, lambda _: SMALL_PT / POINTS_PER_INCH)
        add_line(axes, *_steps(dates, best), color=INK, linewidth=1.2)

    windows = open_windows(dates, best)
    spans = [(float(panel.x_at(w.start)), float(panel.x_at(w.end))) for w in windows]
    y = box.top + 0.04
    for (start, end), text, middle in _labelled(windows, spans, box.left, box.right):
        add_rectangle(sheet, start, y, end - start, _LANE_IN, color=WINDOW_INK, linewidth=0)
        put(sheet, middle, y + _LANE_IN + 0.035, text, SMALL_PT, color=WINDOW_INK, ha="center", va="bottom")
    if not windows:
        _say(sheet, box, "no departure day has an allowed value", 0.0)


def draw_arrival_strip(
    figure: Figure,
    sheet: Axes,
    panel: Panel,
    box: Box,
    dates: np.ndarray,
    best: np.ndarray,
    scale: Scale | None,
) -> None:
    """Draw the best value of each arrival day beside the panel, windows in the lane on its right."""
    axes = axes_at(figure, box.left, box.bottom, box.right - box.left, box.top - box.bottom)
    axes.set_ylim(*panel.y_days)
    axes.set_yticks(panel.y_ticks, [""] * len(panel.y_ticks))
    if scale is None:
        axes.set_xticks([])
    else:
        axes.set_xlim(_reach(best, scale))
        _mark_values(axes.xaxis, scale, box.right - box.left, lambda text: width_in(text, SMALL_PT))
        days, values = _steps(dates, best)
        add_line(axes, values, days, color=INK, linewidth=1.2)

    windows = open_windows(dates, best)
    spans = [(float(panel.y_at(w.start)), float(panel.y_at(w.end))) for w in windows]
    x = box.right + 0.04
    for (start, end), text, middle in _labelled(windows, spans, box.bottom, box.top):
        add_rectangle(sheet, x, start, _LANE_IN, end - start, color=WINDOW_INK, linewidth=0)
        aside = {"rotation": 90, "ha": "left", "va": "center"}
        put(sheet, x + _LANE_IN + 0.03, middle, text, SMALL_PT, color=WINDOW_INK, **aside)
    if not windows:
        _say(sheet, box, "no arrival day has an allowed value", 90.0)


def _steps(dates: np.ndarray, best: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return days (2n,) and values (2n,) of a line that is level across each cell; NaN leaves a gap."""
    return np.repeat(cell_edges(days_from_dates(dates)), 2)[1:-1], np.repeat(best, 2)


def _reach(best: np.ndarray, scale: Scale) -> tuple[float, float]:
    """Return the range of a strip: that of the colours, and on as far as any day's best value lies."""
    low, high = float(scale.levels[0]), float(scale.levels[-1])
    known = best[np.isfinite(best)]
    least, most = float(known.min(initial=high)), float(known.max(initial=low))
    margin = _MARGIN * (max(most, high) - min(least, low))
    return low if least >= low else least - margin, high if most <= high else most + margin


def _mark_values(axis: Axis, scale: Scale, length: float, room_of: Callable[[str], float]) -> None:
    """Put as many round values on a short axis as it has room for, four at most, with faint lines across.

    length: of the axis, inches; room_of: the inches along it that a text needs.
    """
    low, high = axis.get_view_interval()
    for most in range(_MOST_TICKS, 0, -1):
        ticks, texts = scale.writing.ticks(low, high, most)
        gaps = np.diff(ticks) * length / (high - low)
        widest = max((room_of(text) for text in texts), default=0.0)
        if len(ticks) and gaps.min(initial=np.inf) > widest + _TICK_GAP_IN:
            break
    axis.set_ticks(ticks, labels=texts)
    axis.axes.grid(True, color=FAINT_INK, linewidth=0.35, alpha=0.6)


def _labelled(
    windows: Sequence[Window], spans: Sequence[tuple[float, float]], low: float, high: float
) -> list[tuple[tuple[float, float], str, float]]:
    """Give each window its bar, the longest text that meets no other's, and the text's middle, in inches."""
    if not windows:
        return []
    bars = [_at_least(span, _LEAST_BAR_IN) for span in spans]
    gaps = [0.5 * (before[1] + after[0]) for before, after in pairwise(bars)]
    chosen: list[tuple[tuple[float, float], str, float]] = []
    for window, bar, left, right in zip(windows, bars, [low, *gaps], [*gaps, high], strict=True):
        for text in (*window.texts, ""):
            half = 0.5 * width_in(text, SMALL_PT) + 0.04 if text else 0.0
            middle = min(max(0.5 * (bar[0] + bar[1]), left + half), right - half)
            if 2.0 * half <= right - left:
                break
        chosen.append((bar, text, middle))
    return chosen


def _at_least(span: tuple[float, float], length: float) -> tuple[float, float]:
    start, end = span
    spare = max(length - (end - start), 0.0) / 2.0
    return start - spare, end + spare


def _say(sheet: Axes, box: Box, text: str, rotation: float) -> None:
    x, y = 0.5 * (box.left + box.right), 0.5 * (box.bottom + box.top)
    put(sheet, x, y, text, SMALL_PT, color=SOFT_INK, ha="center", va="center", rotation=rotation)

"""What lies over the ground of a chart: labelled lines of a second measure, and numbered candidates."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.patheffects import withStroke

from porkgrid.figures.dates import dates_from_iso, days_from_dates
from porkgrid.figures.levels import Dates, Numbers, date_levels, range_that_matters, round_levels
from porkgrid.figures.marks import add_line, add_segments
from porkgrid.figures.measured import Measured
from porkgrid.figures.panel import Panel
from porkgrid.figures.placement import Room, place_markers, place_on_line
from porkgrid.figures.raster import cut_turns
from porkgrid.figures.style import ACCENT, INK, SMALL_PT
from porkgrid.figures.text import put, width_in

if TYPE_CHECKING:
    import pandas as pd

LINE_INK = "#7a1f00"
_MARKER_IN = 0.205
_POINTS_PER_INCH = 72.0
_MOST_POINTS = 500  # a side, for contour lines; more cannot be seen
_LINES = 7
_ISLAND = 0.2  # share of the ground around a candidate


def draw_lines(
    panel: Panel,
    sheet: Axes,
    measured: Measured,
    days: tuple[np.ndarray, np.ndarray],
    seen: np.ndarray,
    room: Room,
) -> None:
    """Draw thin lines of equal value over the panel with their values written on them.

    days: departure (n,) and arrival (m,) dates in days; seen: (n, m) bool, cells whose values set the levels.
    """
    values = measured.values[seen & np.isfinite(measured.values)]
    if values.size == 0 or min(measured.values.shape) < 2:
        return
    levels, texts = _levels_of(measured, values)
    stride = max(1, int(np.ceil(max(measured.values.shape) / _MOST_POINTS)))
    thinned = cut_turns(measured.values, measured.unit)[::stride, ::stride]
    if min(thinned.shape) < 2:
        return
    drawn = panel.axes.contour(
        days[0][::stride],
        days[1][::stride],
        np.ma.masked_invalid(thinned.T),
        levels=levels,
        colors=LINE_INK,
        linewidths=0.8,
        linestyles="solid",
    )
    for text, path in zip(texts, drawn.get_paths(), strict=True):
        pieces = [np.asarray(piece) for piece in path.to_polygons(closed_only=False)]
        _label_longest(panel, sheet, text, [piece for piece in pieces if len(piece) > 1], room)


def _levels_of(measured: Measured, values: np.ndarray) -> tuple[np.ndarray, list[str]]:
    """Choose round values, or round dates, for the lines, and how they are written."""
    if measured.is_date:
        levels = date_levels(float(values.min()), float(values.max()), _LINES)
        return levels, Dates().texts(levels)
    levels = round_levels(*range_that_matters(values), _LINES)
    return levels, Numbers(float(levels[1] - levels[0])).texts(levels)


def _label_longest(panel: Panel, sheet: Axes, text: str, pieces: Sequence[np.ndarray], room: Room) -> None:
    """Write a value once on each of the two longest lines that have it."""
    width = width_in(text, SMALL_PT)
    on_slide = [np.column_stack(panel.on_slide(piece[:, 0], piece[:, 1])) for piece in pieces]
    on_slide.sort(key=lambda line: -float(np.hypot(*np.diff(line, axis=0).T).sum()))
    for line in on_slide[:2]:
        place = place_on_line(line, width, SMALL_PT / _POINTS_PER_INCH, room)
        if place is not None:
            x, y, angle = place
            put(
                sheet,
                x,
                y,
                text,
                SMALL_PT,
                color=LINE_INK,
                rotation=angle,
                rotation_mode="anchor",
                ha="center",
                va="center_baseline",
                path_effects=[withStroke(linewidth=2.2, foreground="white")],
            )


def draw_candidates(
    panel: Panel,
    sheet: Axes,
    candidates: pd.DataFrame,
    days: tuple[np.ndarray, np.ndarray],
    allowed: np.ndarray,
    room: Room,
) -> None:
    """Mark the candidates by number, 1 for the first row; close ones stand aside, with a leader.

    Candidates outside the panel are left out; in too dense a cluster the last keep only their dots.
    """
    x = panel.x_at(days_from_dates(dates_from_iso(candidates["departure"])))
    y = panel.y_at(days_from_dates(dates_from_iso(candidates["arrival"])))
    box = panel.box
    inside = np.flatnonzero((x >= box.left) & (x <= box.right) & (y >= box.bottom) & (y <= box.top))
    points = [(float(x[i]), float(y[i])) for i in inside]
    aside = [_on_an_island(panel, days, allowed, point) for point in points]
    mark_by_number(sheet, points, aside, [int(i) + 1 for i in inside], room)


def mark_by_number(
    sheet: Axes,
    points: Sequence[tuple[float, float]],
    aside: Sequence[bool],
    numbers: Sequence[int],
    room: Room,
) -> None:
    """Mark points of the slide by number, number 1 in colour; those to stand aside get a dot and a leader.

    Where there is no room for a number, the dot alone is left.
    """
    places = place_markers(points, aside, _MARKER_IN + 0.02, room)
    placed = [(number, at, place) for number, at, place in zip(numbers, points, places, strict=True) if place]
    moved = [at for at, place in zip(points, places, strict=True) if place != at]
    if moved:
        leaders = [[at, place] for _, at, place in placed if place != at]
        add_segments(sheet, leaders, colors=INK, linewidths=0.7)
        dot: Any = {"linestyle": "", "marker": "o", "markersize": 3.8, "markeredgewidth": 0.6}
        add_line(sheet, *zip(*moved, strict=True), color=INK, markeredgecolor="white", **dot)
    for number, _, place in placed:
        _number(sheet, place, number)


def _on_an_island(
    panel: Panel, days: tuple[np.ndarray, np.ndarray], allowed: np.ndarray, point: tuple[float, float]
) -> bool:
    """Tell whether so little ground around a point is allowed that a marker on it would hide the window."""
    near_x = np.abs(panel.x_at(days[0]) - point[0]) < 1.5 * _MARKER_IN
    near_y = np.abs(panel.y_at(days[1]) - point[1]) < 1.5 * _MARKER_IN
    around = allowed[np.ix_(near_x, near_y)]
    return around.size > 0 and float(around.mean()) < _ISLAND


def _number(sheet: Axes, place: tuple[float, float], number: int) -> None:
    """Draw one round marker with its number; the first candidate stands out."""
    face, ink = (ACCENT, "white") if number == 1 else ("white", INK)
    size = _MARKER_IN * _POINTS_PER_INCH - 1.0
    disc = {"marker": "o", "markersize": size, "markeredgecolor": INK, "markeredgewidth": 0.8}
    add_line(sheet, [place[0]], [place[1]], color=face, **disc)
    middle: Any = {"ha": "center", "va": "center_baseline", "weight": "bold"}
    put(sheet, *place, str(number), SMALL_PT, color=ink, **middle)

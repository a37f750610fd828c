"""The column on the right: colour bar, key to the ground and the lines, table of candidates."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from matplotlib.axes import Axes

from porkgrid.figures.dates import dates_from_iso
from porkgrid.figures.levels import Scale
from porkgrid.figures.marks import add_area, add_line, add_pixels, add_rectangle, add_segments
from porkgrid.figures.measured import Measured
from porkgrid.figures.style import BODY_PT, FAINT_INK, PIXELS_PER_INCH, SMALL_PT, SOFT_INK
from porkgrid.figures.text import line_height_in, put, shorten, width_in, wrap

if TYPE_CHECKING:
    import pandas as pd

_SWATCH_W, _SWATCH_H = 0.34, 0.15
_TEXT_GAP = 0.10
_ROW = line_height_in(SMALL_PT)
_LEFT_PART = 0.68  # of the table's width, for numbers and dates; the rest is for values
_DIGIT_BLANK = "\u2007"  # as wide as a digit
SWATCH_PX = (round(_SWATCH_H * PIXELS_PER_INCH), round(_SWATCH_W * PIXELS_PER_INCH))


@dataclass
class Column:
    """A column of the slide that fills from the top: `y` is the next free height. All in inches."""

    sheet: Axes
    left: float
    right: float
    y: float
    bottom: float

    @property
    def width(self) -> float:
        """Return the width of the column."""
        return self.right - self.left

    def heading(self, text: str) -> None:
        """Write a heading."""
        self.y -= line_height_in(BODY_PT)
        put(self.sheet, self.left, self.y, shorten(text, self.width, BODY_PT, "bold"), BODY_PT, weight="bold")
        self.y -= 0.05

    def swatch(self, pixels: np.ndarray, text: str, max_lines: int = 2) -> None:
        """Show pixels (SWATCH_PX + RGB) with what they mean."""
        self._entry(text, max_lines)
        bottom = self._top_of_entry - 0.02 - _SWATCH_H
        extent = (self.left, self.left + _SWATCH_W, bottom, bottom + _SWATCH_H)
        add_pixels(self.sheet, pixels, extent)
        frame = {"fill": False, "edgecolor": SOFT_INK, "linewidth": 0.5}
        add_rectangle(self.sheet, self.left, bottom, _SWATCH_W, _SWATCH_H, **frame)

    def line(self, text: str, **style: object) -> None:
        """Show a line of this style with what it means."""
        self._entry(text, 2)
        y = self._top_of_entry - 0.02 - 0.5 * _SWATCH_H
        add_line(self.sheet, [self.left, self.left + _SWATCH_W], [y, y], **style)

    def _entry(self, text: str, max_lines: int) -> None:
        indent = _SWATCH_W + _TEXT_GAP
        self._top_of_entry = self.y
        for line in wrap(text, self.width - indent, SMALL_PT, max_lines):
            put(self.sheet, self.left + indent, self.y - 0.75 * _ROW - 0.02, line, SMALL_PT)
            self.y -= _ROW
        self.y -= 0.06


def draw_colour_bar(column: Column, scale: Scale, heading: str) -> None:
    """Draw the bands of value side by side with their bounds; an arrow stands for all values worse still."""
    column.heading(heading)
    height, top = 0.19, column.y
    if not scale.has_worse:
        edges = _draw_closed_bar(column, scale, top, height)
    else:
        edges = _draw_bar_with_arrow(column, scale, top, height)
    _number_edges(column, edges, top - height, scale)
    column.y = top - height - 0.05 - _ROW - 0.1


def _draw_closed_bar(column: Column, scale: Scale, top: float, height: float) -> np.ndarray:
    """Draw bands that hold every value; return the places of their bounds."""
    inset = max(0.08, 0.5 * max(width_in(text, SMALL_PT) for text in scale.texts))
    edges = np.linspace(column.left + inset, column.right - inset, len(scale.levels))
    _draw_bands(column, edges, scale.colours, top, height)
    frame = {"fill": False, "edgecolor": SOFT_INK, "linewidth": 0.5}
    add_rectangle(column.sheet, edges[0], top - height, edges[-1] - edges[0], height, **frame)
    return edges


def _draw_bar_with_arrow(column: Column, scale: Scale, top: float, height: float) -> np.ndarray:
    """Draw bands with an arrow at their worse end; return the places of their bounds."""
    least, arrow = scale.order == "least", 0.18
    width = (column.width - arrow - 0.3) / (len(scale.levels) - 1)
    left = column.left + 0.08 + (0.0 if least else arrow)
    edges = left + width * np.arange(len(scale.levels))
    _draw_bands(column, edges, scale.colours[:-1] if least else scale.colours[1:], top, height)
    base, tip = (edges[-1], edges[-1] + arrow) if least else (edges[0], edges[0] - arrow)
    far = edges[0] if least else edges[-1]
    point = [(base, top), (tip, top - height / 2), (base, top - height)]
    add_area(column.sheet, point, facecolor=scale.colours[-1 if least else 0], linewidth=0)
    outline = [*point, (far, top - height), (far, top)]
    add_area(column.sheet, outline, fill=False, edgecolor=SOFT_INK, linewidth=0.5)
    return edges


def _draw_bands(column: Column, edges: np.ndarray, colours: np.ndarray, top: float, height: float) -> None:
    width = float(edges[1] - edges[0])
    for edge, colour in zip(edges[:-1], colours, strict=True):
        add_rectangle(column.sheet, float(edge), top - height, width, height, facecolor=colour, linewidth=0)


def _number_edges(column: Column, edges: np.ndarray, y: float, scale: Scale) -> None:
    """Write the bounds of the bands under the bar: every one, or every n-th where they would touch."""
    texts = scale.texts
    widest = max(width_in(text, SMALL_PT) for text in texts)
    stride = int(np.ceil((widest + 0.1) / (edges[1] - edges[0])))
    add_segments(
        column.sheet,
        [[(x, y), (x, y - 0.03)] for x in edges[::stride]],
        colors=SOFT_INK,
        linewidths=0.5,
    )
    for x, text in zip(edges[::stride], texts[::stride], strict=True):
        put(column.sheet, float(x), y - 0.05, text, SMALL_PT, ha="center", va="top")


def draw_candidate_table(
    column: Column, candidates: pd.DataFrame, measured: Measured, write: Callable[[float], str]
) -> None:
    """List the candidates by number with dates, flight time and the measure drawn, as many as fit."""
    column.y -= 0.04
    column.heading("Candidates")
    room = int((column.y - 0.07 - column.bottom) / _ROW) - 1  # below the line of heads
    shown = len(candidates) if len(candidates) <= room else max(room - 1, 0)
    rows = _dates_and_flights(candidates[:shown])
    right = column.left + max(_LEFT_PART * column.width, max((_width(cells) for cells in rows), default=0.0))
    value_room = column.right - right - 0.15
    # the unit stands at the colour bar too, and goes where the column is too narrow for it
    fits = width_in(measured.caption, SMALL_PT) <= value_room
    head = shorten(measured.caption if fits else measured.label, value_room, SMALL_PT)
    head = head if measured.name in candidates else ""

    column.y -= _ROW
    _table_heads(column, rows[:1], right, head)
    rule = column.y - 0.05
    add_line(column.sheet, [column.left, column.right], [rule, rule], color=FAINT_INK, linewidth=0.4)
    column.y = rule - 0.02
    for i, cells in enumerate(rows):
        column.y -= _ROW
        # One text for all of a row's digits: setting each cell apart would take as long as drawing the grid.
        put(column.sheet, right, column.y, "".join(cells), SMALL_PT, ha="right")
        if head:
            value = write(float(candidates[measured.name].iloc[i]))
            put(column.sheet, column.right - 0.05, column.y, value, SMALL_PT, ha="right")
    if shown < len(candidates):
        column.y -= _ROW
        rest = f"… and {len(candidates) - shown} more in the candidates table"
        put(column.sheet, column.left, column.y, rest, SMALL_PT, color=SOFT_INK)


def _dates_and_flights(candidates: pd.DataFrame) -> list[list[str]]:
    """Return number, departure, arrival and days of flight, padded to columns; dates to the day or hour."""
    departures, arrivals = dates_from_iso(candidates["departure"]), dates_from_iso(candidates["arrival"])
    flights = (arrivals - departures) / np.timedelta64(1, "D")
    dates = np.concatenate([departures, arrivals])
    to_the_day = (dates == dates.astype("datetime64[D]")).all()
    unit, gap = ("datetime64[D]", 2) if to_the_day else ("datetime64[h]", 1)
    days = [f"{flight:.0f}" for flight in flights]
    widest = max((len(text) for text in days), default=0)
    return [
        [
            str(i + 1).rjust(2, _DIGIT_BLANK),
            gap * _DIGIT_BLANK + str(departures[i].astype(unit)),
            gap * _DIGIT_BLANK + str(arrivals[i].astype(unit)),
            gap * _DIGIT_BLANK + days[i].rjust(max(widest, 4), _DIGIT_BLANK),
        ]
        for i in range(len(candidates))
    ]


def _table_heads(column: Column, rows: Sequence[list[str]], right: float, value_head: str) -> None:
    """Write the heads over the right edges of the cells of the first row."""
    for cells in rows:
        for i, head in enumerate(("departure", "arrival", "days"), start=2):
            x = right - _width(cells[i:])
            put(column.sheet, x, column.y, head, SMALL_PT, color=SOFT_INK, ha="right")
    put(column.sheet, column.right - 0.05, column.y, value_head, SMALL_PT, color=SOFT_INK, ha="right")


def _width(cells: Sequence[str]) -> float:
    return width_in("".join(cells), SMALL_PT)

"""The column on the right: colour bar, key to the ground and the lines, table of candidates."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from matplotlib.axes import Axes

from porkgrid.figures.dates import dates_from_iso
from porkgrid.figures.levels import Scale, value_text
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
_GAP_DIGITS = 2
_FIGURE_SPACE = "\u2007"  # as wide as a digit
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
    least = scale.order == "least"
    column.heading(heading)
    arrow, height, top = 0.18, 0.19, column.y
    width = (column.width - arrow - 0.3) / (len(scale.levels) - 1)
    left = column.left + 0.08 + (0.0 if least else arrow)
    edges = left + width * np.arange(len(scale.levels))
    for edge, colour in zip(edges[:-1], scale.colours[:-1] if least else scale.colours[1:], strict=True):
        add_rectangle(column.sheet, float(edge), top - height, width, height, facecolor=colour, linewidth=0)

    base, tip = (edges[-1], edges[-1] + arrow) if least else (edges[0], edges[0] - arrow)
    far = edges[0] if least else edges[-1]
    point = [(base, top), (tip, top - height / 2), (base, top - height)]
    add_area(column.sheet, point, facecolor=scale.colours[-1 if least else 0], linewidth=0)
    outline = [*point, (far, top - height), (far, top)]
    add_area(column.sheet, outline, fill=False, edgecolor=SOFT_INK, linewidth=0.5)
    _number_edges(column, edges, top - height, scale)
    column.y = top - height - 0.05 - _ROW - 0.1


def _number_edges(column: Column, edges: np.ndarray, y: float, scale: Scale) -> None:
    """Write the bounds of the bands under the bar: every one, or every n-th where they would touch."""
    step = float(scale.levels[1] - scale.levels[0])
    texts = [value_text(float(level), step) for level in scale.levels]
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
    column: Column, candidates: pd.DataFrame, measured: Measured, value_step: float
) -> None:
    """List the candidates by number with dates, flight time and the measure drawn, as many as fit."""
    column.y -= 0.04
    column.heading("Candidates")
    room = int((column.y - 0.07 - column.bottom) / _ROW) - 1  # below the line of heads
    shown = len(candidates) if len(candidates) <= room else max(room - 1, 0)
    rows = _dates_and_flights(candidates[:shown])
    value_room = (1.0 - _LEFT_PART) * column.width - 0.1
    head = shorten(measured.title, value_room, SMALL_PT) if measured.name in candidates else ""

    widths = (2, *(_GAP_DIGITS + len(cell) for cell in rows[0][1:3]), _GAP_DIGITS + 4) if rows else ()
    _table_heads(column, widths, head)
    rule = column.y - 0.05
    add_line(column.sheet, [column.left, column.right], [rule, rule], color=FAINT_INK, linewidth=0.4)
    column.y = rule - 0.02
    for i, cells in enumerate(rows):
        value = value_text(float(candidates[measured.name].iloc[i]), value_step) if head else ""
        _table_row(column, widths, cells, value)
    if shown < len(candidates):
        column.y -= _ROW
        rest = f"… and {len(candidates) - shown} more in the candidates table"
        put(column.sheet, column.left, column.y, rest, SMALL_PT, color=SOFT_INK)


def _dates_and_flights(candidates: pd.DataFrame) -> list[tuple[str, str, str, str]]:
    """Return number, departure, arrival and days of flight; dates to the day or, if need be, hour."""
    departures, arrivals = dates_from_iso(candidates["departure"]), dates_from_iso(candidates["arrival"])
    flights = (arrivals - departures) / np.timedelta64(1, "D")
    dates = np.concatenate([departures, arrivals])
    unit = "datetime64[D]" if (dates == dates.astype("datetime64[D]")).all() else "datetime64[h]"
    return [
        (str(i + 1), str(departure.astype(unit)), str(arrival.astype(unit)), f"{days:.0f}")
        for i, (departure, arrival, days) in enumerate(zip(departures, arrivals, flights, strict=True))
    ]


def _table_heads(column: Column, widths: Sequence[int], value_head: str) -> None:
    """Write the heads over the right edges of the cells, whose widths are given in digits."""
    column.y -= _ROW
    digit = width_in("0", SMALL_PT)
    right = column.left + _LEFT_PART * column.width
    rights = right - digit * (sum(widths) - np.cumsum(widths))
    for x, head in zip(rights, ("", "departure", "arrival", "days"), strict=False):
        put(column.sheet, float(x), column.y, head, SMALL_PT, color=SOFT_INK, ha="right")
    put(column.sheet, column.right - 0.05, column.y, value_head, SMALL_PT, color=SOFT_INK, ha="right")


def _table_row(column: Column, widths: Sequence[int], cells: Sequence[str], value: str) -> None:
    """Write one row as two texts; cells of digits are padded with blanks as wide as a digit."""
    column.y -= _ROW
    right = column.left + _LEFT_PART * column.width
    padded = "".join(cell.rjust(width, _FIGURE_SPACE) for cell, width in zip(cells, widths, strict=True))
    put(column.sheet, right, column.y, padded, SMALL_PT, ha="right")
    put(column.sheet, column.right - 0.05, column.y, value, SMALL_PT, ha="right")

"""The trade front of a survey: what one measure costs in another, over the cloud of allowed cells."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from scipy.ndimage import gaussian_filter, grey_closing

from porkgrid.figures.frame import draw_footer, draw_titles
from porkgrid.figures.key import Column, draw_colour_bar
from porkgrid.figures.levels import Dates, Numbers, Scale, date_levels, round_levels, round_step
from porkgrid.figures.marks import add_line, add_pixels
from porkgrid.figures.measured import plain_symbol
from porkgrid.figures.numbers import number_text
from porkgrid.figures.overlay import mark_by_number
from porkgrid.figures.palette import depth_colours
from porkgrid.figures.placement import Box, Room, box_around
from porkgrid.figures.style import (
    ACCENT,
    BODY_PT,
    FAINT_INK,
    INK,
    PIXELS_PER_INCH,
    SMALL_PT,
    SOFT_INK,
    axes_at,
    new_slide,
    save_figure,
)
from porkgrid.figures.text import line_height_in, put, shorten, width_in
from porkgrid.survey.folder import FIGURES
from porkgrid.survey.surveys import Survey
from porkgrid.survey.trade import Front, allowed_bands

if TYPE_CHECKING:
    import pandas as pd

_PANEL = Box(1.10, 1.02, 8.05, 6.25)
_COLUMN = (8.45, 13.08, 6.40, 0.60)
_RIGHTS = (0.22, 1.10, 1.98)  # of number, departure and arrival in the table, from the column's left
_ROW = line_height_in(SMALL_PT)
_TILE_PX = 10  # of the cloud: coarse enough to stay quiet
_GAP_TILES = 5  # what lies between two dates of a grid, and is no gap in what can be flown
_PALE, _DENSE = np.array((238.0, 241.0, 245.0)), np.array((176.0, 190.0, 205.0))
_BETTER_MARGIN, _WORSE_MARGIN = 0.06, 0.22  # of the front's reach, around it
_MOST_TICKS, _BANDS = 8, 10
_MANY = 2000  # points of a front that a slide tells apart
_CLEAR_IN = 0.07  # of the line, by numbers beside it
_EPOCH = "_epoch_jd_tdb"


@dataclass(frozen=True)
class _Side:
    """One measure of the front as an axis: its name, how it is written, its range, its better end."""

    title: str
    unit: str
    writing: Numbers | Dates
    low: float
    high: float
    sign: float

    @property
    def caption(self) -> str:
        """The measure with its unit; a date has none."""
        bare = self.unit == "1" or isinstance(self.writing, Dates)
        return self.title if bare else f"{self.title} ({self.unit})"

    @property
    def label(self) -> str:
        """What stands at the axis."""
        words = ("earlier", "later") if isinstance(self.writing, Dates) else ("lower", "higher")
        return f"{self.caption}, {words[0] if self.sign > 0 else words[1]} is better"

    def text(self, value: float) -> str:
        """A value as the table shows it, without its unit."""
        if isinstance(self.writing, Dates):
            return self.writing.text(value)
        return number_text(value, self.unit).removesuffix(f" {self.unit}")

    def share(self, values: Any) -> Any:
        """How far along the axis a value, or each of an array, lies: 0 to 1."""
        return (values - self.low) / (self.high - self.low)


def save_trade(survey: Survey, front: Front, table: pd.DataFrame, formats: Sequence[str]) -> list[Path]:
    """Draw the front into the survey's figures folder and return the files written."""
    folder = survey.path / FIGURES
    folder.mkdir(exist_ok=True)
    stem = "-".join(("trade", *front.measures))
    return save_figure(draw_trade(survey, front, table), folder / stem, formats)


def draw_trade(survey: Survey, front: Front, table: pd.DataFrame) -> Figure:
    """Draw a front on a 16:9 slide; `table` holds those of its cells that are numbered and listed.

    The measure ranked by runs upward, the first one traded against it to the right; a second one is colour.
    """
    figure, sheet = new_slide()
    names = [_title(survey, name) for name in front.measures]
    headline = f"trade of {names[0]} against {' and '.join(names[1:])}"
    facts = survey.grid.attrs
    draw_titles(sheet, facts["title"], [facts["route"], headline], _notes(front, table))
    draw_footer(sheet, survey.grid)
    axes = axes_at(figure, _PANEL.left, _PANEL.bottom, _PANEL.right - _PANEL.left, _PANEL.top - _PANEL.bottom)
    if not len(front.rows):
        axes.set(xticks=[], yticks=[])
        x, y = 0.5 * (_PANEL.left + _PANEL.right), 0.5 * (_PANEL.bottom + _PANEL.top)
        put(sheet, x, y, "No cell of this survey is allowed.", 12.0, weight="bold", ha="center", va="center")
        return figure
    sides = [_side(survey, front, number) for number in range(len(front.measures))]
    up, along = sides[:2]
    axes.set(xlim=(along.low, along.high), ylim=(up.low, up.high))
    _draw_cloud(axes, survey, front, along, up)
    scale = _draw_front(axes, front)
    _mark_sides(axes, along, up)
    _number_points(sheet, front, table, along, up)
    column = Column(sheet, *_COLUMN)
    _draw_key(column, sides, scale)
    _draw_table(column, sides, front.measures, table)
    return figure


def _notes(front: Front, table: pd.DataFrame) -> list[str]:
    text = f"{len(front.rows):,} of {front.allowed:,} allowed cells are on the front: no other is as good in "
    text += "both and better in one" if len(front.measures) == 2 else "all three and better in one"
    few = f"; {len(table)} of them, evenly spread, are numbered" if len(table) < len(front.rows) else ""
    return [text + few]


def _title(survey: Survey, name: str) -> str:
    symbol = plain_symbol(survey.plan.measures[name].symbol)
    return symbol.removesuffix(" (JD TDB)") + " date" if name.endswith(_EPOCH) else symbol


def _side(survey: Survey, front: Front, number: int) -> _Side:
    """The axis of a measure: as far as the front reaches, and more on the worse side, where the cloud is."""
    measure = survey.plan.measures[front.measures[number]]
    costs = front.costs[:, number]
    best, worst = float(costs.min()), float(costs.max())
    reach = worst - best if worst > best else max(0.1 * abs(best), 1e-3)
    sign = front.signs[number]
    low, high = sorted((sign * (best - _BETTER_MARGIN * reach), sign * (worst + _WORSE_MARGIN * reach)))
    dates = measure.name.endswith(_EPOCH)
    writing = Dates() if dates else Numbers(round_step(high - low, _MOST_TICKS))
    return _Side(_title(survey, measure.name), measure.unit, writing, low, high, sign)


def _draw_cloud(axes: Axes, survey: Survey, front: Front, along: _Side, up: _Side) -> None:
    """Show how densely the allowed cells lie, in a pale tint: how many are in each tile of the panel."""
    columns = round((_PANEL.right - _PANEL.left) * PIXELS_PER_INCH / _TILE_PX)
    rows = round((_PANEL.top - _PANEL.bottom) * PIXELS_PER_INCH / _TILE_PX)
    count = np.zeros((rows, columns))
    for _, _, values in allowed_bands(survey, front.measures[:2]):
        i = np.floor(up.share(values[:, 0]) * rows)
        j = np.floor(along.share(values[:, 1]) * columns)
        inside = (i >= 0) & (i < rows) & (j >= 0) & (j < columns)
        np.add.at(count, (i[inside].astype(np.intp), j[inside].astype(np.intp)), 1.0)
    pixels = _tinted(count).repeat(_TILE_PX, axis=0).repeat(_TILE_PX, axis=1)
    add_pixels(axes, pixels[::-1], (along.low, along.high, up.low, up.high))


def _tinted(count: np.ndarray) -> np.ndarray:
    """Colours (rows, columns, 3) uint8 of counts; gaps that only the steps between dates make are closed."""
    closed = grey_closing(count, size=(_GAP_TILES, _GAP_TILES), mode="constant")
    tint = np.log1p(gaussian_filter(closed, 1.0))
    tint /= max(float(tint.max()), 1.0)
    pixels = np.where((closed > 0.0)[..., None], _PALE + tint[..., None] * (_DENSE - _PALE), 255.0)
    return np.rint(pixels).astype(np.uint8)


def _draw_front(axes: Axes, front: Front) -> Scale | None:
    """Draw the front: of two measures a staircase, of three its cells in the colour of the third."""
    order = np.lexsort((front.costs[:, 0], front.costs[:, 1]))
    y, x = front.values[order, 0], front.values[order, 1]
    if len(front.measures) == 2:
        add_line(axes, x, y, color=ACCENT, linewidth=1.4, drawstyle="steps-post")
        add_line(axes, x, y, color=ACCENT, linestyle="", marker="o", markersize=2.2)
        return None
    third = front.values[order, 2]
    scale = _whole_scale(third, front.measures[2].endswith(_EPOCH), front.signs[2])
    edge = 0.25 if len(x) < _MANY else 0.0
    axes.scatter(x, y, s=16.0, c=scale.colours[scale.band_of(third)], edgecolors=INK, linewidths=edge)
    return scale


def _whole_scale(values: np.ndarray, dates: bool, sign: float) -> Scale:
    """Bands over all values: a front has no walls that a scale should leave out."""
    low, high = float(values.min()), float(values.max())
    levels = date_levels(low, high, _BANDS) if dates else round_levels(low, high, _BANDS)
    colours = depth_colours(len(levels) - 1)
    writing = Dates() if dates else Numbers(float(levels[1] - levels[0]))
    return Scale(levels, colours[:: int(sign)], "least" if sign > 0 else "most", writing)


def _mark_sides(axes: Axes, along: _Side, up: _Side) -> None:
    axes.set_xticks(*along.writing.ticks(along.low, along.high, _MOST_TICKS))
    axes.set_yticks(*up.writing.ticks(up.low, up.high, _MOST_TICKS))
    axes.set_xlabel(along.label, fontsize=BODY_PT, labelpad=3.0, parse_math=False)
    axes.set_ylabel(up.label, fontsize=BODY_PT, labelpad=3.0, parse_math=False)


def _number_points(sheet: Axes, front: Front, table: pd.DataFrame, along: _Side, up: _Side) -> None:
    """Mark the cells of the table by number, beside the front."""
    pairs = zip(table[front.measures[1]], table[front.measures[0]], strict=True)
    points = [_on_slide(along, up, x, y) for x, y in pairs]
    room = Room(_PANEL)
    if len(front.measures) == 2:  # numbers stand clear of the line; a front of three measures is an area
        for y, x in front.values[:: 1 + len(front.values) // _MANY]:
            room.taken.append(box_around(*_on_slide(along, up, x, y), _CLEAR_IN, _CLEAR_IN))
    mark_by_number(sheet, points, [True] * len(points), list(range(1, len(points) + 1)), room)


def _on_slide(along: _Side, up: _Side, x: float, y: float) -> tuple[float, float]:
    """The place of a pair of values on the slide, in inches."""
    return (
        _PANEL.left + float(along.share(x)) * (_PANEL.right - _PANEL.left),
        _PANEL.bottom + float(up.share(y)) * (_PANEL.top - _PANEL.bottom),
    )


def _draw_key(column: Column, sides: Sequence[_Side], scale: Scale | None) -> None:
    if scale is None:
        column.line("the front", color=ACCENT, linewidth=1.4)
    else:
        draw_colour_bar(column, scale, sides[2].label)
    cloud = {"color": tuple(_DENSE / 255.0), "linewidth": 8.0, "solid_capstyle": "butt"}
    column.line("allowed cells, darker where they are many", **cloud)


def _draw_table(column: Column, sides: Sequence[_Side], measures: Sequence[str], table: pd.DataFrame) -> None:
    """List the numbered cells with their dates and the measures traded."""
    column.heading("On the front")
    rights = [column.left + right for right in _RIGHTS]
    each = (column.right - rights[-1]) / len(sides)
    rights += [rights[-1] + each * (n + 1) for n in range(len(sides))]
    heads = ["", "departure", "arrival"]
    heads += [s.caption if width_in(s.caption, SMALL_PT) < each - 0.08 else s.title for s in sides]
    column.y -= _ROW
    for right, head in zip(rights, heads, strict=True):
        text = shorten(head, max(each, 0.8) - 0.06, SMALL_PT)
        put(column.sheet, right, column.y, text, SMALL_PT, color=SOFT_INK, ha="right")
    rule = column.y - 0.05
    add_line(column.sheet, [column.left, column.right], [rule, rule], color=FAINT_INK, linewidth=0.4)
    column.y = rule - 0.02
    room = int((column.y - column.bottom) / _ROW)
    shown = len(table) if len(table) <= room else room - 1
    for number, (_, row) in enumerate(table[:shown].iterrows(), start=1):
        column.y -= _ROW
        texts = [str(number), str(row["departure"])[:10], str(row["arrival"])[:10]]
        texts += [side.text(float(row[name])) for side, name in zip(sides, measures, strict=True)]
        for right, text in zip(rights, texts, strict=True):
            put(column.sheet, right, column.y, text, SMALL_PT, ha="right")
    if shown < len(table):
        column.y -= _ROW
        rest = f"… and {len(table) - shown} more in trade.csv"
        put(column.sheet, column.left, column.y, rest, SMALL_PT, color=SOFT_INK)

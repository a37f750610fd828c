"""The porkchop chart: one measure over departure and arrival dates, under the limits, with its best dates."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from porkgrid.figures.dates import iso_day
from porkgrid.figures.frame import draw_footer, draw_header
from porkgrid.figures.ground import (
    ALLOWED,
    BEFORE_DEPARTURE,
    FIRST_LIMIT,
    NO_TRANSFER,
    OTHER_ALONE,
    SEVERAL,
    Ground,
    read_ground,
)
from porkgrid.figures.key import SWATCH_PX, Column, draw_candidate_table, draw_colour_bar
from porkgrid.figures.levels import Numbers, Scale, date_scale, value_scale
from porkgrid.figures.measured import Measured, read_measure
from porkgrid.figures.overlay import LINE_INK, draw_candidates, draw_lines
from porkgrid.figures.paint import COMMON_HATCH, NO_HATCH, plain_swatch, value_pixels
from porkgrid.figures.palette import FORBIDDEN_GREY, NO_FLIGHT_PAPER, NO_TRANSFER_GREY
from porkgrid.figures.panel import GUIDE_INK, Panel, draw_flight_time_guides, draw_panel, draw_statement
from porkgrid.figures.placement import Box, Room
from porkgrid.figures.raster import raster_for
from porkgrid.figures.strips import draw_arrival_strip, draw_departure_strip
from porkgrid.figures.style import SMALL_PT, SOFT_INK, new_slide
from porkgrid.figures.text import one_line, put, wrap
from porkgrid.survey.view import DayBests

if TYPE_CHECKING:
    import pandas as pd

PANEL_BOX = Box(1.00, 2.20, 7.80, 6.15)
_DEPARTURE_BOX = Box(1.00, 0.95, 7.80, 1.85)
_ARRIVAL_BOX = Box(8.27, 2.20, 9.17, 6.15)
_COLUMN = (9.70, 13.08, 6.34, 0.52)
_CAPTION_IN = 1.45
_FLIGHT_TIME = "tof_days"
_WORDS = {"least": "least", "most": "greatest"}
_DATE_WORDS = {"least": "earliest", "most": "latest"}


def draw_chart(
    view: xr.Dataset, day_bests: DayBests, candidates: pd.DataFrame, of: str, lines: str | None
) -> Figure:
    """Draw the porkchop chart of a survey on a 16:9 slide.

    view: the survey's grid or every n-th row and column of it (dimensions departure, arrival; measures;
    `blocked_by`; attributes). day_bests: best allowed values of measure `of`, by day, at full resolution.
    candidates: columns departure and arrival, best first; may be empty. of: measure shown as bands of colour.
    lines: measure shown as labelled lines, or None. Raises KeyError for a measure that the view lacks.
    """
    measured, ground = read_measure(view, of), read_ground(view)
    order = _order(view, of)
    choose_scale = date_scale if measured.is_date else value_scale
    scale = choose_scale(_values_that_matter(measured, ground), order)
    raster = raster_for(view, PANEL_BOX.right - PANEL_BOX.left, PANEL_BOX.top - PANEL_BOX.bottom)
    days = raster.departure, raster.arrival
    flight = days[1][None, :] - days[0][:, None]
    allowed = ground.kind == ALLOWED

    figure, sheet = new_slide()
    draw_header(sheet, view, _headline(measured, ground, day_bests, scale, order), ground.flags)
    draw_footer(sheet, view)
    pixels = value_pixels(raster, ground, measured.values, measured.unit, scale)
    panel = draw_panel(figure, PANEL_BOX, raster.limits, pixels)
    room = Room(PANEL_BOX)
    _state_what_is_missing(panel, sheet, measured, ground, room)
    if lines != _FLIGHT_TIME:
        draw_flight_time_guides(panel, sheet, flight[allowed] if allowed.any() else flight[flight > 0.0])
    if len(candidates):
        draw_candidates(panel, sheet, candidates, days, allowed, room)
    second = None if lines is None else read_measure(view, lines)
    if second is not None:
        draw_lines(panel, sheet, second, days, allowed if allowed.any() else flight > 0.0, room)

    draw_departure_strip(
        figure, sheet, panel, _DEPARTURE_BOX, day_bests.departure, day_bests.departure_best, scale
    )
    draw_arrival_strip(figure, sheet, panel, _ARRIVAL_BOX, day_bests.arrival, day_bests.arrival_best, scale)
    _name_strips(sheet, measured, order)
    _draw_column(sheet, measured, scale, ground, second, candidates, view.attrs.get("rank_by") == of)
    return figure


def _order(view: xr.Dataset, of: str) -> str:
    """Return which values are best: as the survey ranks, for the measure it ranks by, else the least."""
    order = view.attrs.get("rank_order") if view.attrs.get("rank_by") == of else view[of].attrs.get("better")
    return str(order or "least")


def _values_that_matter(measured: Measured, ground: Ground) -> np.ndarray:
    """Return the values of allowed cells; if no cell is allowed, of all cells."""
    allowed = measured.values[ground.kind == ALLOWED]
    return allowed if np.isfinite(allowed).any() else measured.values


def _headline(
    measured: Measured, ground: Ground, bests: DayBests, scale: Scale | None, order: str
) -> list[str]:
    """Return the best value with its departure date, and how much of the grid is allowed."""
    best = np.asarray(bests.departure_best, dtype=float)
    if scale is None or not np.isfinite(best).any():
        return [ground.allowed_text]
    at = int(np.nanargmin(best) if order == "least" else np.nanargmax(best))
    value = measured.with_unit(scale.writing.text(float(best[at])))
    word = _word(measured, order)
    leaving = iso_day(bests.departure[at])
    return [f"{word} allowed {measured.label} {value}, leaving {leaving}", ground.allowed_text]


def _word(measured: Measured, order: str) -> str:
    """Say which of a day's values a strip shows."""
    return (_DATE_WORDS if measured.is_date else _WORDS)[order]


def _state_what_is_missing(panel: Panel, sheet: Axes, measured: Measured, ground: Ground, room: Room) -> None:
    """Say in words, on the panel, that nothing is allowed or that the measure has no value."""
    if not np.isfinite(measured.values).any():
        draw_statement(
            panel, sheet, wrap(f"{measured.label} has no value anywhere on this grid.", 5.5, 12.0, 2), room
        )
    elif not (ground.kind == ALLOWED).any():
        text = "No cell of this grid is allowed: every pair of dates is forbidden."
        draw_statement(panel, sheet, [text, "The limit map shows which limits forbid what."], room)


def _name_strips(sheet: Axes, measured: Measured, order: str) -> None:
    """Write what the strips show, in the corner between them."""
    what = wrap(f"{_word(measured, order)} {measured.caption}", _CAPTION_IN, SMALL_PT, 2)
    x, below = _ARRIVAL_BOX.left, _DEPARTURE_BOX.right + 0.12
    put(sheet, x, 1.92, "\n".join([*what, "of each arrival day"]), SMALL_PT, va="top", color=SOFT_INK)
    caption = "\n".join([*what, "of each departure day"])
    put(sheet, below, 0.93, caption, SMALL_PT, va="bottom", color=SOFT_INK)


def _draw_column(
    sheet: Axes,
    measured: Measured,
    scale: Scale | None,
    ground: Ground,
    second: Measured | None,
    candidates: pd.DataFrame,
    ranked: bool,
) -> None:
    """Fill the right column: colour bar, key, candidates."""
    left, right, top, bottom = _COLUMN
    column = Column(sheet, left, right, top, bottom)
    if scale is not None:
        better = {"least": "lower is better", "most": "higher is better"}[scale.order]
        said = ranked and not measured.is_date
        draw_colour_bar(column, scale, f"{measured.title}, {better}" if said else measured.title)
    if second is not None:
        column.line(second.title, color=LINE_INK, linewidth=0.9)
    if second is None or second.name != _FLIGHT_TIME:
        column.line(
            "equal flight time (days)", color=GUIDE_INK, linewidth=0.6, alpha=0.7, linestyle=(0, (5, 3))
        )
    _draw_ground_key(column, ground)
    if len(candidates):
        writing = Numbers(0.001) if scale is None else scale.writing
        draw_candidate_table(column, candidates, measured, writing.text)


def _draw_ground_key(column: Column, ground: Ground) -> None:
    """Name every kind of ground that is not allowed, with its look."""
    present = set(np.unique(ground.kind).tolist())
    if present <= {ALLOWED}:
        return
    column.y -= 0.02
    if any(kind >= SEVERAL for kind in present):
        column.heading("Forbidden by")
    for hatch, limit in enumerate(ground.hatched):
        if FIRST_LIMIT + hatch in present:
            column.swatch(plain_swatch(FORBIDDEN_GREY, hatch, *SWATCH_PX), one_line(ground.flags[limit]))
    if OTHER_ALONE in present:
        others = [one_line(flag) for i, flag in enumerate(ground.flags) if i not in ground.hatched]
        column.swatch(plain_swatch(FORBIDDEN_GREY, COMMON_HATCH, *SWATCH_PX), "one of: " + ", ".join(others))
    if SEVERAL in present:
        column.swatch(plain_swatch(FORBIDDEN_GREY, NO_HATCH, *SWATCH_PX), "several limits at once")
    if NO_TRANSFER in present:
        column.swatch(plain_swatch(NO_TRANSFER_GREY, NO_HATCH, *SWATCH_PX), "no transfer exists")
    if BEFORE_DEPARTURE in present:
        column.swatch(plain_swatch(NO_FLIGHT_PAPER, NO_HATCH, *SWATCH_PX), "arrival before departure")

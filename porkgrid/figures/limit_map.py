"""The limit map: which limit forbids each cell, alone or with others, and what each limit costs."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import xarray as xr
from matplotlib.figure import Figure

from porkgrid.figures.frame import draw_footer, draw_header
from porkgrid.figures.ground import ALLOWED, BEFORE_DEPARTURE, NO_TRANSFER, SEVERAL, Ground, read_ground
from porkgrid.figures.key import SWATCH_PX, Column
from porkgrid.figures.marks import add_line, add_pixels, add_rectangle
from porkgrid.figures.paint import limit_pixels, limit_swatch, pale_swatch, plain_swatch, several_swatch
from porkgrid.figures.palette import ALLOWED_PAPER, NO_FLIGHT_PAPER, NO_TRANSFER_GREY
from porkgrid.figures.panel import draw_flight_time_guides, draw_panel, mark_departure_dates
from porkgrid.figures.placement import Box
from porkgrid.figures.raster import raster_for
from porkgrid.figures.style import PIXELS_PER_INCH, SMALL_PT, SOFT_INK, new_slide
from porkgrid.figures.text import line_height_in, one_line, put, shorten
from porkgrid.survey.view import FlagShare

PANEL_BOX = Box(1.00, 0.98, 7.80, 6.15)
_COLUMN = (8.60, 13.08, 6.34, 0.52)
_ROW = line_height_in(SMALL_PT)
_BAR_IN = 0.13
_BLOCK = _ROW + 2 * _BAR_IN + 0.14  # title, two bars, gap
_PERCENT_ROOM = 0.62


def draw_limit_map(view: xr.Dataset, shares: Sequence[FlagShare]) -> Figure:
    """Draw the limit map of a survey on a 16:9 slide.

    view: the survey's grid or every n-th row and column of it. shares: one per flag, at full resolution.
    """
    ground = read_ground(view)
    raster = raster_for(view, PANEL_BOX.right - PANEL_BOX.left, PANEL_BOX.top - PANEL_BOX.bottom)
    flight = raster.arrival[None, :] - raster.departure[:, None]
    allowed = ground.kind == ALLOWED

    figure, sheet = new_slide()
    draw_header(sheet, view, ["what forbids each pair of dates", ground.allowed_text], ground.flags)
    draw_footer(sheet, view)
    panel = draw_panel(figure, PANEL_BOX, raster.limits, limit_pixels(raster, ground))
    mark_departure_dates(panel, panel.axes, bare=False)
    draw_flight_time_guides(panel, sheet, flight[allowed] if allowed.any() else flight[flight > 0.0])

    column = Column(sheet, *_COLUMN)
    _draw_key(column, ground)
    _draw_costs(column, ground, shares)
    return figure


def _draw_key(column: Column, ground: Ground) -> None:
    """Name the kinds of ground that the bars below do not name."""
    present = set(np.unique(ground.kind).tolist())
    column.heading("Ground")
    if ALLOWED in present:
        column.swatch(plain_swatch(ALLOWED_PAPER, -1, *SWATCH_PX), "allowed")
    if SEVERAL in present:
        column.swatch(
            several_swatch([0, 1], *SWATCH_PX),
            "several limits at once: stripes in the pale colours of all of them",
        )
    if NO_TRANSFER in present:
        column.swatch(plain_swatch(NO_TRANSFER_GREY, -1, *SWATCH_PX), "no transfer exists")
    if BEFORE_DEPARTURE in present:
        column.swatch(plain_swatch(NO_FLIGHT_PAPER, -1, *SWATCH_PX), "arrival before departure")


def _draw_costs(column: Column, ground: Ground, shares: Sequence[FlagShare]) -> None:
    """Draw two bars a limit: all of the grid that it forbids, and what it alone forbids."""
    by_title = {share.title: share for share in shares}
    costs = [by_title[title] for title in ground.flags if title in by_title]
    column.y -= 0.06
    if not costs:
        column.heading("No limits were set")
        return
    column.heading("Share of the grid that each limit forbids")
    _draw_bar_key(column)
    room = int((column.y - column.bottom) / _BLOCK)
    order = list(range(len(costs)))
    if len(costs) > room:
        largest = sorted(order, key=lambda i: (-costs[i].share, i))[: room - 1]
        order = sorted(largest)
    widest = max(costs[i].share for i in order) or 1.0
    for i in order:
        _draw_cost(column, costs[i], ground.hatch_of(ground.flags.index(costs[i].title)), widest)
    if len(costs) > len(order):
        rest = f"… and {len(costs) - len(order)} more, each forbidding less"
        put(column.sheet, column.left, column.y - _ROW, rest, SMALL_PT, color=SOFT_INK)


def _draw_bar_key(column: Column) -> None:
    """Say which bar is which."""
    put(
        column.sheet,
        column.left,
        column.y - 0.75 * _ROW,
        "upper bar: alone or with others · lower bar, hatched: alone",
        SMALL_PT,
        color=SOFT_INK,
    )
    column.y -= _ROW + 0.08


def _draw_cost(column: Column, cost: FlagShare, hatch: int | None, widest: float) -> None:
    """Draw the title and the two bars of one limit, in its colour and hatch, with percentages."""
    sheet, left = column.sheet, column.left
    title = shorten(one_line(cost.title), column.width, SMALL_PT)
    put(sheet, left, column.y - 0.75 * _ROW, title, SMALL_PT)
    full = column.width - _PERCENT_ROOM
    top = column.y - _ROW - 0.02
    rows = round(_BAR_IN * PIXELS_PER_INCH)
    for number, (share, look) in enumerate(((cost.share, pale_swatch), (cost.alone, limit_swatch))):
        length = full * share / widest
        bottom = top - (number + 1) * _BAR_IN
        columns = round(length * PIXELS_PER_INCH)
        if columns:
            pixels = look(hatch, rows, columns)
            add_pixels(sheet, pixels, (left, left + length, bottom, bottom + _BAR_IN))
            frame = {"fill": False, "edgecolor": SOFT_INK, "linewidth": 0.4}
            add_rectangle(sheet, left, bottom, length, _BAR_IN, **frame)
        put(sheet, left + length + 0.06, bottom + 0.02, percent(share), SMALL_PT)
    add_line(sheet, [left, left], [top, top - 2 * _BAR_IN], color=SOFT_INK, linewidth=0.6)
    column.y -= _BLOCK


def percent(share: float) -> str:
    """Write a share of the grid: 0 %, under 0.1 %, 3.4 %, 62 %."""
    value = 100.0 * share
    if 0.0 < value < 0.1:
        return "under 0.1 %"
    return f"{value:.0f} %" if value >= 10.0 or value == 0.0 else f"{value:.1f} %"

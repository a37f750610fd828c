"""Header and footer of a slide: which survey it shows, under which limits, computed with what."""

from __future__ import annotations

from collections.abc import Sequence

import xarray as xr
from matplotlib.axes import Axes

from porkgrid.figures.marks import add_line
from porkgrid.figures.style import FAINT_INK, HEAD_PT, INK, SLIDE_WIDTH_IN, SMALL_PT, SOFT_INK
from porkgrid.figures.text import line_height_in, one_line, pack, put, shorten, width_in, wrap

LEFT_IN, RIGHT_IN = 0.30, SLIDE_WIDTH_IN - 0.25
NOTE_PT = SMALL_PT + 0.5
TITLE_SIZES_PT = (18.0, 15.0, 13.0)
_TITLE_Y, _HEADLINE_Y, _LIMITS_Y = 7.10, 6.84, 6.64
_FOOTER_Y = 0.14


def draw_header(sheet: Axes, view: xr.Dataset, headline: Sequence[str], limits: Sequence[str]) -> None:
    """Write the scenario name, the route with the headline, and the limits, on four lines at most."""
    room = RIGHT_IN - LEFT_IN
    lines = pack("Limits: ", limits, room, NOTE_PT, 2) if limits else ["No limits"]
    draw_titles(sheet, view.attrs.get("title", ""), [view.attrs.get("route", ""), *headline], lines)


def draw_titles(sheet: Axes, title: str, headline: Sequence[str], notes: Sequence[str]) -> None:
    """Write a title, a line of what the figure shows, and at most two small lines under it."""
    room = RIGHT_IN - LEFT_IN
    name = one_line(title) or "Survey without a name"
    size = next((s for s in TITLE_SIZES_PT if width_in(name, s, "bold") <= room), TITLE_SIZES_PT[-1])
    put(sheet, LEFT_IN, _TITLE_Y, shorten(name, room, size, "bold"), size, weight="bold")

    text = " · ".join(one_line(part) for part in headline if one_line(part))
    put(sheet, LEFT_IN, _HEADLINE_Y, shorten(text, room, HEAD_PT), HEAD_PT, color=INK)
    for row, line in enumerate(notes):
        y = _LIMITS_Y - row * line_height_in(NOTE_PT)
        put(sheet, LEFT_IN, y, line, NOTE_PT, color=SOFT_INK)


def draw_footer(sheet: Axes, view: xr.Dataset) -> None:
    """Write the ephemeris, the version, how the grid was thinned and the caution, on two lines at most."""
    kernel, version = view.attrs.get("kernel", ""), view.attrs.get("porkgrid", "")
    draw_made_with(sheet, kernel, version, [view.attrs.get("thinned", ""), view.attrs.get("caution", "")])


def draw_made_with(sheet: Axes, kernel: str, version: str, notes: Sequence[str]) -> None:
    """Write what a figure was computed with, and what to know of it, under a rule at the foot."""
    made_with = [f"Ephemeris: {kernel}" if kernel else "", f"porkgrid {version}" if version else "", *notes]
    text = " · ".join(one_line(part) for part in made_with if one_line(part))
    lines = wrap(text, RIGHT_IN - LEFT_IN, SMALL_PT, 2) if text else []
    for row, line in enumerate(lines):
        y = _FOOTER_Y + (1 - row) * line_height_in(SMALL_PT)
        put(sheet, LEFT_IN, y, line, SMALL_PT, color=SOFT_INK)
    rule = _FOOTER_Y + 2 * line_height_in(SMALL_PT) + 0.02
    add_line(sheet, [LEFT_IN, RIGHT_IN], [rule, rule], color=FAINT_INK, linewidth=0.4)

"""Header and footer of a slide: which survey it shows, under which limits, computed with what."""

from __future__ import annotations

from collections.abc import Sequence

import xarray as xr
from matplotlib.axes import Axes

from porkgrid.figures.marks import add_line
from porkgrid.figures.style import FAINT_INK, HEAD_PT, INK, SLIDE_WIDTH_IN, SMALL_PT, SOFT_INK
from porkgrid.figures.text import line_height_in, one_line, pack, put, shorten, width_in, wrap

LEFT_IN, RIGHT_IN = 0.30, SLIDE_WIDTH_IN - 0.25
_TITLE_SIZES_PT = (18.0, 15.0, 13.0)
_TITLE_Y, _HEADLINE_Y, _LIMITS_Y = 7.10, 6.84, 6.64
_FOOTER_Y = 0.14


def draw_header(sheet: Axes, view: xr.Dataset, headline: Sequence[str], limits: Sequence[str]) -> None:
    """Write the scenario name, the route with the headline, and the limits, on four lines at most."""
    room = RIGHT_IN - LEFT_IN
    name = one_line(view.attrs.get("title", "")) or "Survey without a name"
    size = next((s for s in _TITLE_SIZES_PT if width_in(name, s, "bold") <= room), _TITLE_SIZES_PT[-1])
    put(sheet, LEFT_IN, _TITLE_Y, shorten(name, room, size, "bold"), size, weight="bold")

    route = one_line(view.attrs.get("route", ""))
    text = " · ".join(part for part in (route, *headline) if part)
    put(sheet, LEFT_IN, _HEADLINE_Y, shorten(text, room, HEAD_PT), HEAD_PT, color=INK)

    lines = pack("Limits: ", limits, room, SMALL_PT + 0.5, 2) if limits else ["No limits"]
    for row, line in enumerate(lines):
        y = _LIMITS_Y - row * line_height_in(SMALL_PT + 0.5)
        put(sheet, LEFT_IN, y, line, SMALL_PT + 0.5, color=SOFT_INK)


def draw_footer(sheet: Axes, view: xr.Dataset) -> None:
    """Write the ephemeris, the version, how the grid was thinned and the caution, on two lines at most."""
    made_with = [
        f"Ephemeris: {one_line(view.attrs['kernel'])}" if view.attrs.get("kernel") else "",
        f"porkgrid {one_line(view.attrs['porkgrid'])}" if view.attrs.get("porkgrid") else "",
        one_line(view.attrs.get("thinned", "")),
        one_line(view.attrs.get("caution", "")),
    ]
    text = " · ".join(part for part in made_with if part)
    lines = wrap(text, RIGHT_IN - LEFT_IN, SMALL_PT, 2) if text else []
    for row, line in enumerate(lines):
        y = _FOOTER_Y + (1 - row) * line_height_in(SMALL_PT)
        put(sheet, LEFT_IN, y, line, SMALL_PT, color=SOFT_INK)
    rule = _FOOTER_Y + 2 * line_height_in(SMALL_PT) + 0.02
    add_line(sheet, [LEFT_IN, RIGHT_IN], [rule, rule], color=FAINT_INK, linewidth=0.4)

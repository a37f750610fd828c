"""A candidate over time: its encounters and burns, its distances, and how near the Sun it is in the sky."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patheffects import withStroke

from porkgrid.figures.dates import UNIX_EPOCH_JD, date_ticks, dates_from_iso, days_from_dates
from porkgrid.figures.itinerary import LEG_COLOURS
from porkgrid.figures.levels import Numbers
from porkgrid.figures.marks import add_area, add_line, add_rectangle
from porkgrid.figures.placement import Box
from porkgrid.figures.style import BODY_PT, FAINT_INK, INK, SMALL_PT, SOFT_INK, axes_at
from porkgrid.figures.text import line_height_in, put, width_in
from porkgrid.physics.constants import AU_KM
from porkgrid.survey.pictures import RoutePicture
from porkgrid.survey.sightlines import CONJUNCTION_RAD, Conjunction, Sightlines

# Okabe and Ito (2008): told apart by every eye, and by their dashes in grey
_SUN_LINE = {"color": "#b35c00", "linewidth": 1.5}
_EARTH_LINE = {"color": "#0072b2", "linewidth": 1.5, "linestyle": (0, (5, 1.6))}
_CONJUNCTION_INK = "#b5179e"
_BAR_IN = 0.11
_MARGIN = 0.02  # of the time axis, on both sides
_TOP = 1.12  # of an axis, in its greatest value
_MOST_ROWS = 3
_MOST_DATES, _DATE_GAP_IN = 8, 0.15
_LABEL_X = -0.095  # of the labels of the axes, in widths of the strip
_GAP_IN = 0.08
_ROW_IN = line_height_in(SMALL_PT)
_HALO = [withStroke(linewidth=2.2, foreground="white")]


@dataclass(frozen=True)
class SheetBurn:
    """A burn as the sheet shows it."""

    label: str
    jd_tdb: float
    dv_km_s: float


@dataclass(frozen=True, eq=False)
class Clock:
    """The time axis that all strips share: its range, and the encounters on it, in days since 1970."""

    first: float
    last: float
    encounters: np.ndarray

    @classmethod
    def over(cls, picture: RoutePicture, seen: Sightlines) -> Clock:
        """Return the axis that holds all of a flight."""
        encounters = days_from_dates(dates_from_iso(each.date for each in picture.encounters))
        days = seen.jd_tdb[[0, -1]] - UNIX_EPOCH_JD
        low, high = min(encounters[0], days[0]), max(encounters[-1], days[1])
        return cls(low - _MARGIN * (high - low), high + _MARGIN * (high - low), encounters)

    def place(self, day: float, box: Box) -> float:
        """Return where a day lies in a box, in inches."""
        return box.left + (day - self.first) / (self.last - self.first) * (box.right - box.left)


def draw_timeline(
    sheet: Axes, box: Box, clock: Clock, picture: RoutePicture, burns: Sequence[SheetBurn]
) -> None:
    """Draw the legs as bars, the encounters above them by number and body, the burns below with their Δv."""
    y = box.bottom + 0.5 * (box.top - box.bottom)
    stops = [clock.place(day, box) for day in clock.encounters]
    for k, (left, right) in enumerate(pairwise(stops)):
        colour = LEG_COLOURS[k % len(LEG_COLOURS)]
        add_rectangle(sheet, left, y - 0.5 * _BAR_IN, right - left, _BAR_IN, facecolor=colour, linewidth=0)
    for x in stops:
        add_line(
            sheet, [x, x], [y - 0.5 * _BAR_IN - 0.03, y + 0.5 * _BAR_IN + 0.03], color=INK, linewidth=1.4
        )
    names = [f"{n} {each.title}" for n, each in enumerate(picture.encounters, start=1)]
    _label(sheet, box, stops, names, y + 0.5 * _BAR_IN + 0.05, 1.0, INK)
    at = [clock.place(burn.jd_tdb - UNIX_EPOCH_JD, box) for burn in burns]
    foot = y - 0.5 * _BAR_IN - 0.03
    for x in at:
        add_area(
            sheet, [(x, foot), (x - 0.05, foot - 0.09), (x + 0.05, foot - 0.09)], facecolor=SOFT_INK, lw=0
        )
    sizes = [f"{burn.dv_km_s:.3f}" for burn in burns]
    _label(sheet, box, at, sizes, foot - 0.11, -1.0, SOFT_INK)
    says = "encounters above, burns (km/s) below" if burns else "encounters"
    put(sheet, box.left, box.top + 0.06, f"Time line: {says}", SMALL_PT, color=SOFT_INK)


def draw_distances(figure: Figure, sheet: Axes, box: Box, clock: Clock, seen: Sightlines) -> None:
    """Draw the distances from the Sun and from the Earth."""
    axes = _strip(figure, box, clock)
    days = seen.jd_tdb - UNIX_EPOCH_JD
    lines = (("from the Sun", seen.sun_km, _SUN_LINE), ("from the Earth", seen.earth_km, _EARTH_LINE))
    top = _TOP * max(float(values.max()) for _, values, _ in lines) / AU_KM
    axes.set_ylim(0.0, top)
    _mark_values(axes, 0.0, top)
    for _, values, style in lines:
        add_line(axes, days, values / AU_KM, **style)
    axes.set_xticklabels([])
    axes.set_ylabel("distance (au)", fontsize=BODY_PT)
    _key(sheet, box, [(text, style) for text, _, style in lines])


def draw_angle(
    figure: Figure, sheet: Axes, box: Box, clock: Clock, seen: Sightlines, near: Sequence[Conjunction]
) -> None:
    """Draw the Sun–Earth–spacecraft angle, and mark where it is under the bound of a conjunction."""
    axes = _strip(figure, box, clock)
    axes.set_ylim(0.0, 180.0)
    axes.set_yticks([0, 30, 60, 90, 120, 150, 180])
    bound = float(np.degrees(CONJUNCTION_RAD))
    for each in near:
        first, last = each.first_jd - UNIX_EPOCH_JD, each.last_jd - UNIX_EPOCH_JD
        least = 0.006 * (clock.last - clock.first)  # so that a day in ten years can be seen
        spare = max(least - (last - first), 0.0) / 2.0
        width = last - first + 2.0 * spare
        add_rectangle(axes, first - spare, 0.0, width, 180.0, facecolor=_CONJUNCTION_INK, alpha=0.25, lw=0)
    add_line(axes, [clock.first, clock.last], [bound, bound], color=_CONJUNCTION_INK, linewidth=0.8)
    add_line(axes, seen.jd_tdb - UNIX_EPOCH_JD, np.degrees(seen.angle_rad), color=INK, linewidth=1.3)
    axes.set_ylabel("angle (deg)", fontsize=BODY_PT)
    axes.set_xlabel("TDB calendar date", fontsize=BODY_PT, labelpad=2.0)
    shade = {"color": _CONJUNCTION_INK, "alpha": 0.35, "linewidth": 6.0}
    _key(
        sheet,
        box,
        [
            ("Sun–Earth–spacecraft", {"color": INK, "linewidth": 1.3}),
            (f"conjunction, under {bound:g}°", shade),
        ],
    )


def _strip(figure: Figure, box: Box, clock: Clock) -> Axes:
    """Add axes over time, with a line at every encounter."""
    axes = axes_at(figure, box.left, box.bottom, box.right - box.left, box.top - box.bottom)
    axes.set_xlim(clock.first, clock.last)
    axes.set_xticks(*_dates_that_fit(clock, box))
    axes.yaxis.set_label_coords(_LABEL_X, 0.5)
    axes.grid(True, color=FAINT_INK, linewidth=0.35, alpha=0.6)
    for day in clock.encounters:
        axes.axvline(day, color=SOFT_INK, linewidth=0.7, linestyle=(0, (2, 2)))
    return axes


def _dates_that_fit(clock: Clock, box: Box) -> tuple[np.ndarray, list[str]]:
    """Return as many round dates as do not touch each other when they are written."""
    for most in range(_MOST_DATES, 1, -1):
        days, texts = date_ticks(clock.first, clock.last, most)
        gaps = np.diff([clock.place(day, box) for day in days])
        if gaps.min(initial=np.inf) > max(width_in(text, SMALL_PT) for text in texts) + _DATE_GAP_IN:
            break
    return days, texts


def _mark_values(axes: Axes, low: float, high: float) -> None:
    ticks, texts = Numbers(1.0).ticks(low, high, 6)
    axes.set_yticks(ticks, labels=texts)


def _key(sheet: Axes, box: Box, entries: Sequence[tuple[str, dict]]) -> None:
    """Name the lines over the strip, from the left."""
    x, y = box.left, box.top + 0.06
    for text, style in entries:
        add_line(sheet, [x, x + 0.26], [y + 0.04, y + 0.04], solid_capstyle="butt", **style)
        put(sheet, x + 0.31, y, text, SMALL_PT, color=SOFT_INK)
        x += 0.31 + width_in(text, SMALL_PT) + 0.22


def _label(
    sheet: Axes, box: Box, places: Sequence[float], texts: Sequence[str], y: float, way: float, colour: str
) -> None:
    """Write texts at places along a line, in as few rows as keep them apart; up (+1) or down (−1) from it."""
    ends = [-np.inf] * _MOST_ROWS
    for x, text in zip(places, texts, strict=True):
        half = 0.5 * width_in(text, SMALL_PT)
        middle = min(max(x, box.left + half), box.right - half)
        row = next((r for r in range(_MOST_ROWS) if ends[r] + _GAP_IN <= middle - half), None)
        if row is None:
            continue
        ends[row] = middle + half
        at = y + way * row * _ROW_IN
        if row:
            add_line(sheet, [x, x], [y, at], color=FAINT_INK, linewidth=0.6)
        style = {"ha": "center", "va": "bottom" if way > 0.0 else "top", "path_effects": _HALO}
        put(sheet, middle, at, text, SMALL_PT, color=colour, **style)

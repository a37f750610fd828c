"""The one-page sheet of a candidate for a review: path, times, distances, angle to the Sun, and numbers."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from matplotlib.figure import Figure

from porkgrid.figures.dates import UNIX_EPOCH_JD, dates_from_days, iso_day
from porkgrid.figures.frame import draw_made_with, draw_titles
from porkgrid.figures.itinerary import draw_itinerary
from porkgrid.figures.key import Column
from porkgrid.figures.measured import plain_symbol
from porkgrid.figures.numbers import ROW_IN, Pair, draw_list, draw_pairs, number_text, pair
from porkgrid.figures.overtime import Clock, SheetBurn, draw_angle, draw_distances, draw_timeline
from porkgrid.figures.path import draw_pole_view
from porkgrid.figures.placement import Box
from porkgrid.figures.style import BODY_PT, SMALL_PT, SOFT_INK, new_slide
from porkgrid.figures.text import line_height_in, put, shorten
from porkgrid.survey.pictures import Number, RoutePicture
from porkgrid.survey.sightlines import CONJUNCTION_RAD, Conjunction, Sightlines, conjunctions

_PATH_BOX = Box(0.78, 2.72, 4.62, 6.22)
_TIMES_BOX = Box(5.35, 5.06, 9.20, 6.22)
_DISTANCE_BOX = Box(5.35, 3.02, 9.20, 4.86)
_ANGLE_BOX = Box(5.35, 0.98, 9.20, 2.82)
_COLUMN = (9.50, 13.08, 6.34, 0.62)
_BELOW_PATH = (0.30, 4.62, 2.22, 0.56)
_CHECK_COLUMN_IN = 1.05
_CHECK_HEADING_IN = line_height_in(BODY_PT) + 0.05


@dataclass(frozen=True)
class CheckRow:
    """One number as patched conics have it, and as the full-force check found it."""

    label: str
    patched: float
    full_force: float
    unit: str


@dataclass(frozen=True)
class SheetCheck:
    """What the full-force check says: its verdict in a word or two, and the numbers worth comparing."""

    verdict: str
    rows: tuple[CheckRow, ...]


@dataclass(frozen=True, eq=False)
class ReviewSheet:
    """All that the sheet shows.

    picture: path and numbers; seen: the same flight over time; burns in order of time; masses to list under
    them; model: one line on what path, times and numbers come from; check: None where it was not made.
    """

    picture: RoutePicture
    seen: Sightlines
    burns: Sequence[SheetBurn]
    masses: Sequence[Number]
    model: str
    check: SheetCheck | None = None


def draw_sheet(review: ReviewSheet) -> Figure:
    """Draw a candidate on a 16:9 slide."""
    figure, sheet = new_slide()
    picture, seen, burns = review.picture, review.seen, review.burns
    draw_titles(sheet, picture.title, _headline(review), [f"Model: {review.model}"])
    draw_made_with(sheet, picture.kernel, picture.version, [picture.caution])

    near_sun = conjunctions(seen, CONJUNCTION_RAD)
    clock = Clock.over(picture, seen)
    draw_pole_view(figure, sheet, picture, _PATH_BOX)
    draw_timeline(sheet, _TIMES_BOX, clock, picture, burns)
    draw_distances(figure, sheet, _DISTANCE_BOX, clock, seen)
    draw_angle(figure, sheet, _ANGLE_BOX, clock, seen, near_sun)
    _draw_burns(Column(sheet, *_BELOW_PATH), burns, review.masses, near_sun)
    column = Column(sheet, *_COLUMN)
    draw_itinerary(column, picture)
    if review.check is not None:
        _draw_check(column, review.check)
    return figure


def _headline(review: ReviewSheet) -> list[str]:
    first, last = review.picture.encounters[0], review.picture.encounters[-1]
    parts = [review.picture.route, f"leaving {first.date}, arriving {last.date}"]
    return parts if review.check is None else [*parts, f"full-force check: {review.check.verdict}"]


def _draw_check(column: Column, check: SheetCheck) -> None:
    """Compare below the itinerary as many numbers as there is room for; the headline has the verdict."""
    column.y -= 0.10
    room = int((column.y - _CHECK_HEADING_IN - column.bottom) / ROW_IN) - 1
    if room < 1:
        return
    column.heading("Full-force check")
    middle = column.right - _CHECK_COLUMN_IN
    column.y -= ROW_IN
    for x, text in ((middle, "patched"), (column.right, "full force")):
        put(column.sheet, x, column.y, text, SMALL_PT, color=SOFT_INK, ha="right")
    for row in check.rows[:room]:
        column.y -= ROW_IN
        label = shorten(plain_symbol(row.label), middle - column.left - _CHECK_COLUMN_IN, SMALL_PT)
        put(column.sheet, column.left, column.y, label, SMALL_PT, color=SOFT_INK)
        for x, value in ((middle, row.patched), (column.right, row.full_force)):
            put(column.sheet, x, column.y, number_text(value, row.unit), SMALL_PT, ha="right")


def _draw_burns(
    column: Column, burns: Sequence[SheetBurn], masses: Sequence[Number], near_sun: Sequence[Conjunction]
) -> None:
    """List burns, masses and conjunctions below the path, as many as there is room for."""
    column.heading("Burns and masses" if masses else "Burns")
    rows = [
        *(Pair(f"{burn.label}, {_day(burn.jd_tdb)}", number_text(burn.dv_km_s, "km/s")) for burn in burns),
        *(pair(each.label, each.value, each.unit) for each in masses),
    ]
    shown = rows[: _rows_left(column) - 3]  # three at least for conjunctions
    draw_list(column, shown)
    if len(shown) < len(rows):
        _say(column, f"… and {len(rows) - len(shown)} more in the target sheet")
    elif not rows:
        _say(column, "no burn that is counted: neither a parking nor a capture orbit")
    angle = f"{np.degrees(CONJUNCTION_RAD):g}° of the Sun in the Earth's sky"
    column.y -= 0.04
    _say(column, f"within {angle}, and the least angle:" if near_sun else f"never within {angle}")
    pairs = [Pair(_stretch(each), _least(each)) for each in near_sun]
    room = 2 * _rows_left(column)
    if len(pairs) > room:
        pairs = [*pairs[: room - 1], Pair(f"… and {len(pairs) - room + 1} more", "")]
    draw_pairs(column, pairs)


def _rows_left(column: Column) -> int:
    return int((column.y - column.bottom) / ROW_IN)


def _say(column: Column, text: str) -> None:
    column.y -= ROW_IN
    put(column.sheet, column.left, column.y, shorten(text, column.width, SMALL_PT), SMALL_PT, color=SOFT_INK)


def _stretch(each: Conjunction) -> str:
    """Return its first and last day, the year once where it is the same."""
    first, last = _day(each.first_jd), _day(each.last_jd)
    return f"{first} – {last[5:] if last[:4] == first[:4] else last}"


def _least(each: Conjunction) -> str:
    """Return the least angle; a spacecraft before the Sun, not beyond it, is said to be."""
    return f"{np.degrees(each.least_rad):.1f}°" + ("" if each.beyond else ", before")


def _day(jd_tdb: float) -> str:
    return iso_day(dates_from_days(jd_tdb - UNIX_EPOCH_JD))

"""The column of a path figure: encounters with their dates and numbers, and the legs between them."""

from __future__ import annotations

from collections.abc import Sequence

from porkgrid.figures.key import Column
from porkgrid.figures.numbers import ROW_IN, Pair, draw_list, draw_pairs, number_text, pair
from porkgrid.figures.style import BODY_PT, SMALL_PT
from porkgrid.figures.text import line_height_in, put
from porkgrid.survey.pictures import ArcPicture, EncounterPicture, Number, RoutePicture

# Okabe and Ito (2008), "Color Universal Design", the darker ones first
LEG_COLOURS = ("#d55e00", "#0072b2", "#009e73", "#b5179e", "#8a6d00", "#56b4e9")

_HEADING_IN = line_height_in(BODY_PT) + 0.05
_LEG_IN = ROW_IN + 0.12
_MOST_ROWS = 3  # of numbers, per encounter


def draw_itinerary(column: Column, picture: RoutePicture) -> None:
    """Fill the column from the top, with as many rows of numbers per encounter as there is room for.

    A route too long even without numbers keeps its first encounters, and says how many more there are.
    """
    whole = _pairs(picture.numbers, "")
    stops = [
        _pairs(encounter.numbers, _prefix(k, encounter)) for k, encounter in enumerate(picture.encounters)
    ]
    room = column.y - column.bottom - _HEADING_IN - len(whole) * ROW_IN - 0.12
    rows = next((n for n in range(_MOST_ROWS, 0, -1) if _height(stops, n) <= room), 0)
    shown = len(stops)
    while shown > 1 and _height(stops[:shown], rows) > room - (ROW_IN if shown < len(stops) else 0.0):
        shown -= 1

    for k in range(shown):
        encounter = picture.encounters[k]
        _draw_heading(column, f"{k + 1} {encounter.title}, {encounter.kind}", encounter.date)
        draw_pairs(column, stops[k][: 2 * rows])
        column.y -= 0.06
        if k < len(picture.arcs):
            column.line(
                _leg_text(k + 1, picture.arcs[k]), color=LEG_COLOURS[k % len(LEG_COLOURS)], linewidth=1.7
            )
    if shown < len(stops):
        column.y -= ROW_IN
        put(column.sheet, column.left, column.y, f"… and {len(stops) - shown} more encounters", SMALL_PT)
    column.y -= 0.06
    column.heading("Whole route")
    draw_list(column, whole)


def _pairs(numbers: Sequence[Number], prefix: str) -> list[Pair]:
    return [pair(each.label, each.value, each.unit, prefix) for each in numbers]


def _prefix(k: int, encounter: EncounterPicture) -> str:
    """Return how the symbols of an encounter's measures begin, which its heading says already."""
    return f"flyby {k} " if encounter.kind == "flyby" else f"{encounter.kind} "


def _draw_heading(column: Column, text: str, date: str) -> None:
    put(column.sheet, column.right, column.y - line_height_in(BODY_PT), date, BODY_PT, ha="right")
    column.heading(text)


def _leg_text(n: int, arc: ArcPicture) -> str:
    """Say how long a leg takes and how far round the Sun it goes: "leg 1: 135 days, 162.6°, 1 revolution"."""
    flown = {each.label.removeprefix(f"leg {n} "): each for each in arc.numbers}
    parts = []
    for label, after in (("flight time", ""), ("transfer angle", " round the Sun")):
        if label in flown:
            parts.append(number_text(flown[label].value, flown[label].unit) + after)
    turns = round(flown["revolutions"].value) if "revolutions" in flown else 0
    if turns:
        parts.append(f"and {turns} revolution{'s' if turns > 1 else ''}")
    return f"leg {n}: {', '.join(parts[:2])}{''.join(' ' + part for part in parts[2:])}"


def _block(pairs: Sequence[Pair], rows: int) -> float:
    """Return the height of a heading with its numbers."""
    return _HEADING_IN + min(rows, (len(pairs) + 1) // 2) * ROW_IN + 0.06


def _height(stops: Sequence[Sequence[Pair]], rows: int) -> float:
    return sum(_block(pairs, rows) for pairs in stops) + (len(stops) - 1) * _LEG_IN

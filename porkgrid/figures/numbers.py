"""Numbers of one candidate as its figures show them: each to the digits that early design can use."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from porkgrid.figures.key import Column
from porkgrid.figures.measured import plain_symbol
from porkgrid.figures.style import SMALL_PT, SOFT_INK
from porkgrid.figures.text import line_height_in, put, shorten, width_in

ROW_IN = line_height_in(SMALL_PT)
_DIGITS = {"km": 0, "days": 1, "deg": 1, "1": 0, "km²/s²": 2, "kg": 0}
_MINUS, _THIN_BLANK = "−", "\u2009"
_GAP_IN = 0.22  # between the two pairs of a row


@dataclass(frozen=True)
class Pair:
    """A label with what it says."""

    label: str
    text: str


def number_text(value: float, unit: str) -> str:
    """Write a number with its unit: 5 737 km, 349 days, −28.5°; "–" where it is not known."""
    if value != value:
        return "–"
    text = f"{value:,.{_DIGITS.get(unit, 3)}f}".replace(",", _THIN_BLANK).replace("-", _MINUS)
    if unit == "days":
        text = text.removesuffix(".0")
    return text if unit == "1" else f"{text}°" if unit == "deg" else f"{text} {unit}"


def pair(symbol: str, value: float, unit: str, prefix: str = "") -> Pair:
    """Pair a measure's symbol, without a prefix that its place in a table tells, with its number."""
    return Pair(plain_symbol(symbol).removeprefix(prefix), number_text(value, unit))


def draw_pairs(column: Column, pairs: Sequence[Pair]) -> None:
    """Write pairs two to a row, labels soft and left, numbers right."""
    half = 0.5 * (column.width - _GAP_IN)
    for i in range(0, len(pairs), 2):
        column.y -= ROW_IN
        for place, each in enumerate(pairs[i : i + 2]):
            left = column.left + place * (half + _GAP_IN)
            room = half - width_in(each.text, SMALL_PT) - 0.08
            label = shorten(each.label, room, SMALL_PT)
            put(column.sheet, left, column.y, label, SMALL_PT, color=SOFT_INK)
            put(column.sheet, left + half, column.y, each.text, SMALL_PT, ha="right")


def draw_list(column: Column, pairs: Sequence[Pair]) -> None:
    """Write pairs one to a row, labels soft and left, numbers right."""
    for each in pairs:
        column.y -= ROW_IN
        room = column.width - width_in(each.text, SMALL_PT) - 0.1
        put(
            column.sheet, column.left, column.y, shorten(each.label, room, SMALL_PT), SMALL_PT, color=SOFT_INK
        )
        put(column.sheet, column.right, column.y, each.text, SMALL_PT, ha="right")

"""Numbers and tables as people see them: digits by unit, and HTML that a notebook shows.

The HTML has no colours and no style sheet of its own, so that it follows the notebook's light or dark theme.
Every text is escaped: names come from files.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from html import escape

_DIGITS = {"km/s": 3, "km²/s²": 2, "deg": 1, "days": 1, "au": 3, "1": 0, "kg": 0, "km": 0}
_ENDINGS = (
    ("_km2_s2", "km²/s²"),
    ("_km_s", "km/s"),
    ("_km", "km"),
    ("_kg", "kg"),
    ("_deg", "deg"),
    ("_au", "au"),
    ("_days", "days"),
)
_LEFT, _RIGHT = ' style="text-align:left', ' style="text-align:right'


def number(value: float, unit: str) -> str:
    """A measure as a table shows it: digits by its unit, "–" for NaN."""
    if value != value:
        return "–"
    return f"{value:.{_DIGITS.get(unit, 3)}f}"


def unit_of(name: str) -> str:
    """The unit that ends a measure's name: "km/s" of dv_total_km_s; "" where there is none."""
    return next((unit for ending, unit in _ENDINGS if name.endswith(ending)), "")


def html_page(title: str, *blocks: str) -> str:
    """A titled block of HTML, from blocks that are HTML already."""
    return f"<div><strong>{escape(title)}</strong>{''.join(blocks)}</div>"


def html_line(text: str) -> str:
    """A line of text."""
    return f"<div>{escape(text)}</div>"


def html_table(headings: Sequence[str], rows: Iterable[Sequence[str]], title: str = "", left: int = 1) -> str:
    """A table of texts under a title; all columns but the first `left` are right-aligned, as numbers are.

    A heading is broken behind its underscores where the table is narrow; cells are not broken.
    """
    head = "".join(
        f'<th{_LEFT if column < left else _RIGHT}">{escape(text).replace("_", "_<wbr>")}</th>'
        for column, text in enumerate(headings)
    )
    body = "".join(f"<tr>{_cells(row, left)}</tr>" for row in rows)
    caption = f'<caption style="text-align:left">{escape(title)}</caption>' if title else ""
    return f"<table>{caption}<thead><tr>{head}</tr></thead><tbody>{body}</tbody></table>"


def _cells(row: Sequence[str], left: int) -> str:
    return "".join(
        f'<td{_LEFT if column < left else _RIGHT};white-space:nowrap">{escape(text)}</td>'
        for column, text in enumerate(row)
    )

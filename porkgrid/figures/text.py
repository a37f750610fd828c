"""Text on a slide: how wide it is, how it wraps, and how it is set without being read as mathematics."""

from __future__ import annotations

import unicodedata
from collections.abc import Sequence
from functools import lru_cache
from typing import Any

from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import RendererAgg
from matplotlib.font_manager import FontProperties
from matplotlib.text import Text

from porkgrid.figures.style import INK

POINTS_PER_INCH = 72.0
_MEASURED_PT = 200.0
LINE_SPACING = 1.3  # of the text size, baseline to baseline


@lru_cache(maxsize=1)
def _ruler() -> RendererAgg:
    """Return a renderer of one pixel a point, used only to measure text."""
    return RendererAgg(1, 1, POINTS_PER_INCH)


@lru_cache(maxsize=8)
def _font(weight: str) -> FontProperties:
    return FontProperties(family=["DejaVu Sans"], size=_MEASURED_PT, weight=weight)


@lru_cache(maxsize=4096)
def width_in(text: str, size_pt: float, weight: str = "normal") -> float:
    """Return the width of one line of plain text, in inches.

    Measured large and scaled down: figures are saved without hinting, so that letters keep their proportions.
    """
    width, _, _ = _ruler().get_text_width_height_descent(text, _font(weight), ismath=False)
    return float(width) / _MEASURED_PT * size_pt / POINTS_PER_INCH


def line_height_in(size_pt: float) -> float:
    """Return the distance from one baseline to the next, in inches."""
    return size_pt * LINE_SPACING / POINTS_PER_INCH


def one_line(text: str) -> str:
    """Return text with line ends, tabs and control characters turned to single blanks."""
    printable = "".join(" " if unicodedata.category(c) in ("Cc", "Cs", "Zl", "Zp") else c for c in str(text))
    return " ".join(printable.split())


def shorten(text: str, room_in: float, size_pt: float, weight: str = "normal") -> str:
    """Return text cut, with an ellipsis, to the longest start that fits the room."""
    if width_in(text, size_pt, weight) <= room_in:
        return text
    low, high = 0, len(text)
    while low < high:
        middle = (low + high + 1) // 2
        if width_in(text[:middle].rstrip() + "…", size_pt, weight) <= room_in:
            low = middle
        else:
            high = middle - 1
    return text[:low].rstrip() + "…"


def wrap(text: str, room_in: float, size_pt: float, max_lines: int) -> list[str]:
    """Break text at blanks into at most `max_lines` lines; what does not fit ends in an ellipsis."""
    lines: list[str] = []
    words = text.split(" ")
    while words and len(lines) < max_lines - 1:
        count = 1
        while count < len(words) and width_in(" ".join(words[: count + 1]), size_pt) <= room_in:
            count += 1
        lines.append(shorten(" ".join(words[:count]), room_in, size_pt))
        words = words[count:]
    if words:
        lines.append(shorten(" ".join(words), room_in, size_pt))
    return lines


def pack(lead: str, items: Sequence[str], room_in: float, size_pt: float, max_lines: int) -> list[str]:
    """Set a list after its lead in at most `max_lines` lines; the rest is counted: "… and 4 more"."""
    separator = " · "
    for count in range(len(items), 0, -1):
        rest = len(items) - count
        pieces = [*items[:count], *([f"… and {rest} more"] if rest else [])]
        lines = [f"{lead}{pieces[0]}"]
        for piece in pieces[1:]:
            longer = f"{lines[-1]}{separator}{piece}"
            if width_in(longer, size_pt) <= room_in:
                lines[-1] = longer
            else:
                lines.append(piece)
        if len(lines) <= max_lines and all(width_in(line, size_pt) <= room_in for line in lines):
            return lines
    more = f" … and {len(items) - 1} more" if len(items) > 1 else ""
    head = shorten(f"{lead}{items[0]}", room_in - width_in(more, size_pt), size_pt)
    return [head + more]


def put(axes: Axes, x: float, y: float, text: str, size_pt: float, **style: Any) -> Text:
    """Set plain text: `$`, `_`, `^` and backslashes are letters like any other."""
    style.setdefault("color", INK)
    style.setdefault("fontfamily", ["DejaVu Sans"])
    return axes.text(x, y, text, fontsize=size_pt, parse_math=False, **style)

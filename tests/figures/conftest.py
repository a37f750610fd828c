"""Helpers that look at a figure as a reader does: by its texts and where they stand."""

from __future__ import annotations

from collections.abc import Callable
from itertools import combinations

import matplotlib
import pytest
from matplotlib.figure import Figure
from matplotlib.text import Text
from matplotlib.transforms import Bbox

from porkgrid.figures.style import SETTINGS

Placed = list[tuple[Text, Bbox]]


@pytest.fixture
def placed_texts() -> Callable[[Figure], Placed]:
    """Every visible text of a figure with its box in pixels, laid out as in the PNG."""

    @matplotlib.rc_context(SETTINGS)
    def collect(figure: Figure) -> Placed:
        figure.draw_without_rendering()
        renderer = figure.canvas.get_renderer()  # type: ignore[attr-defined]
        found: list[Text] = [t for t in figure.findobj(Text) if t.get_visible() and t.get_text().strip()]  # type: ignore[misc]
        hidden = {
            label
            for axes in figure.axes
            for axis in (axes.xaxis, axes.yaxis)
            for tick in axis.get_major_ticks()
            if not axis.get_view_interval()[0] <= tick.get_loc() <= axis.get_view_interval()[1]
            for label in (tick.label1, tick.label2)
        }
        return [(text, text.get_window_extent(renderer)) for text in found if text not in hidden]

    return collect


@pytest.fixture
def overlapping() -> Callable[[Placed], list[tuple[str, str]]]:
    """Pairs of texts whose boxes share more than a pixel."""

    def collect(placed: Placed) -> list[tuple[str, str]]:
        return [
            (a.get_text(), b.get_text())
            for (a, box_a), (b, box_b) in combinations(placed, 2)
            if min(box_a.x1, box_b.x1) - max(box_a.x0, box_b.x0) > 1.0
            and min(box_a.y1, box_b.y1) - max(box_a.y0, box_b.y0) > 1.0
        ]

    return collect

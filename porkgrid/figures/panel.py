"""The panel of departure date against arrival date: its place, axes, pixels and flight-time guides."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from porkgrid.figures.dates import date_ticks
from porkgrid.figures.levels import round_step
from porkgrid.figures.marks import add_pixels, add_segments
from porkgrid.figures.placement import Box, Room, box_around
from porkgrid.figures.style import BODY_PT, INK, SMALL_PT, SOFT_INK, axes_at
from porkgrid.figures.text import put, width_in

_TICK_ROOM_X_IN, _TICK_ROOM_Y_IN = 0.85, 0.42
_MOST_GUIDES = 14
_GUIDE_GAP_IN = 0.34  # between two flight-time guides, along an edge
GUIDE_INK = "#2f363d"


@dataclass(frozen=True, eq=False)
class Panel:
    """Axes at a place on the slide (inches) over ranges of dates (days since 1970)."""

    axes: Axes
    box: Box
    x_days: tuple[float, float]
    y_days: tuple[float, float]
    y_ticks: np.ndarray

    def on_slide(self, x_days: np.ndarray | float, y_days: np.ndarray | float) -> tuple:
        """Return the place on the slide, in inches, of dates in days."""
        return self.x_at(x_days), self.y_at(y_days)

    def x_at(self, x_days: np.ndarray | float) -> np.ndarray:
        """Return the distance from the slide's left, in inches, of departure dates."""
        share = (np.asarray(x_days) - self.x_days[0]) / (self.x_days[1] - self.x_days[0])
        return self.box.left + share * (self.box.right - self.box.left)

    def y_at(self, y_days: np.ndarray | float) -> np.ndarray:
        """Return the height on the slide, in inches, of arrival dates."""
        share = (np.asarray(y_days) - self.y_days[0]) / (self.y_days[1] - self.y_days[0])
        return self.box.bottom + share * (self.box.top - self.box.bottom)


def draw_panel(
    figure: Figure, box: Box, limits: tuple[float, float, float, float], pixels: np.ndarray
) -> Panel:
    """Place the panel, show its pixels one to one, and mark the arrival dates on its left."""
    axes = axes_at(figure, box.left, box.bottom, box.right - box.left, box.top - box.bottom)
    axes.set(xlim=limits[:2], ylim=limits[2:])
    add_pixels(axes, pixels, limits)
    most = int((box.top - box.bottom) / _TICK_ROOM_Y_IN)
    ticks, labels = date_ticks(limits[2], limits[3], most)
    axes.set_yticks(ticks, labels)
    axes.set_ylabel("arrival date (TDB)", fontsize=BODY_PT, labelpad=3.0)
    panel = Panel(axes, box, limits[:2], limits[2:], ticks)
    mark_departure_dates(panel, axes, bare=True)
    return panel


def mark_departure_dates(panel: Panel, axes: Axes, bare: bool) -> None:
    """Put the departure date ticks under axes that share the panel's dates; bare ticks have no text."""
    ticks, labels = date_ticks(*panel.x_days, most=int((panel.box.right - panel.box.left) / _TICK_ROOM_X_IN))
    axes.set_xticks(ticks, [""] * len(labels) if bare else labels)
    if not bare:
        axes.set_xlabel("departure date (TDB)", fontsize=BODY_PT, labelpad=2.0)


def draw_flight_time_guides(panel: Panel, sheet: Axes, of_interest: np.ndarray) -> None:
    """Draw straight lines of equal flight time over the panel, labelled where they leave it.

    of_interest: flight times in days (any shape) that matter most; the step follows from them. On a grid of
    many years only these get guides.
    """
    if of_interest.size == 0:
        return
    low, high = float(of_interest.min()), float(of_interest.max())
    (x0, x1), (y0, y1) = panel.x_days, panel.y_days
    per_gap = _GUIDE_GAP_IN * max((y1 - y0) / (panel.box.top - panel.box.bottom),
                                  (x1 - x0) / (panel.box.right - panel.box.left))  # fmt: skip
    step = round_step(max(per_gap, (high - low) / 7.0), 1)
    everywhere = np.arange(1.0, np.floor((y1 - x0) / step) + 1.0) * step
    everywhere = everywhere[everywhere > y0 - x1]
    of_use = (everywhere >= low - step) & (everywhere <= high + step)
    times = everywhere if everywhere.size <= _MOST_GUIDES else everywhere[of_use]

    lines = [[(x0, x0 + time), (x1, x1 + time)] for time in times]
    add_segments(panel.axes, lines, colors=GUIDE_INK, linewidths=0.5, alpha=0.55, linestyles=[(0, (5, 3))])
    _label_guides(panel, sheet, times, step)


def _label_guides(panel: Panel, sheet: Axes, times: np.ndarray, step: float) -> None:
    (_, x1), (_, y1) = panel.x_days, panel.y_days
    box = panel.box
    room = Room(Box(box.left - 0.1, box.bottom - 0.05, box.right + 0.46, box.top + 0.22))
    for time in times:
        text = f"{time:.0f} d" if step >= 1.0 else f"{time:g} d"
        width = width_in(text, SMALL_PT)
        if y1 - time <= x1:  # leaves through the top
            x, y = float(panel.x_at(y1 - time)), box.top + 0.10
        else:
            x, y = box.right + 0.06 + 0.5 * width, float(panel.y_at(x1 + time))
        if room.claim(box_around(x, y, width + 0.06, 0.13)):
            put(sheet, x, y, text, SMALL_PT, color=SOFT_INK, ha="center", va="center")


def draw_statement(panel: Panel, sheet: Axes, lines: list[str], room: Room) -> None:
    """Write a plain statement across the middle of the panel."""
    x, y = 0.5 * (panel.box.left + panel.box.right), 0.5 * (panel.box.bottom + panel.box.top)
    width = max(width_in(line, 12.0, "bold") for line in lines)
    room.claim(box_around(x, y, width + 0.3, 0.24 * len(lines) + 0.2))
    put(
        sheet,
        x,
        y,
        "\n".join(lines),
        12.0,
        color=INK,
        weight="bold",
        ha="center",
        va="center",
        linespacing=1.4,
        bbox={"boxstyle": "square,pad=0.6", "facecolor": "white", "edgecolor": SOFT_INK, "linewidth": 0.6},
    )

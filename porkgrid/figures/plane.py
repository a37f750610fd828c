"""Panels to scale: a plane of space, or of velocities, on the slide, with its lines, arrows and marks."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from matplotlib.axes import Axes

from porkgrid.figures.marks import add_area, add_line
from porkgrid.figures.placement import Box

ARROW_IN = 0.13
_HALF_ARROW = 0.36  # half the width of an arrow's head, in its length


@dataclass(frozen=True)
class Plane:
    """A box of the slide, in inches, with the place and the scale of a plane's coordinates in it.

    (x0, y0) is shown at the middle of the box; the scales are inches per unit.
    """

    box: Box
    x0: float
    y0: float
    x_scale: float
    y_scale: float

    def at(self, x: np.ndarray | float, y: np.ndarray | float) -> tuple[np.ndarray, np.ndarray]:
        """Return the places on the slide, in inches, of coordinates."""
        middle_x, middle_y = 0.5 * (self.box.left + self.box.right), 0.5 * (self.box.bottom + self.box.top)
        return (
            middle_x + (np.asarray(x, dtype=float) - self.x0) * self.x_scale,
            middle_y + (np.asarray(y, dtype=float) - self.y0) * self.y_scale,
        )

    def point(self, x: float, y: float) -> tuple[float, float]:
        """Return the place on the slide of one point."""
        at_x, at_y = self.at(x, y)
        return float(at_x), float(at_y)

    @property
    def limits(self) -> tuple[tuple[float, float], tuple[float, float]]:
        """Return the least and greatest x, and y, in the box."""
        half_x = 0.5 * (self.box.right - self.box.left) / self.x_scale
        half_y = 0.5 * (self.box.top - self.box.bottom) / self.y_scale
        return (self.x0 - half_x, self.x0 + half_x), (self.y0 - half_y, self.y0 + half_y)

    def shows(self, x: float, y: float) -> bool:
        """Tell whether a point of the plane lies in the box."""
        at_x, at_y = self.point(x, y)
        return self.box.left <= at_x <= self.box.right and self.box.bottom <= at_y <= self.box.top


def extent(lines: Sequence[np.ndarray]) -> tuple[np.ndarray, np.ndarray]:
    """Return the least and the greatest coordinates (d,) of lines (d, k)."""
    low = np.min([line.min(axis=1) for line in lines], axis=0)
    return low, np.max([line.max(axis=1) for line in lines], axis=0)


def fitted(box: Box, low: np.ndarray, high: np.ndarray, margin: float) -> Plane:
    """Place a rectangle of a plane, low to high (2,), in a box, at the same scale both ways.

    margin: share of the box left free beside what touches it.
    """
    span = np.maximum(high - low, 1e-12 * np.abs(high).max())
    free = 1.0 - 2.0 * margin
    width, height = free * (box.right - box.left), free * (box.top - box.bottom)
    scale = float(min(width / max(span[0], 1e-300), height / max(span[1], 1e-300)))
    middle = 0.5 * (low + high)
    return Plane(box, float(middle[0]), float(middle[1]), scale, scale)


def inside_pieces(box: Box, line: np.ndarray) -> list[np.ndarray]:
    """Return the runs of vertices (k, 2) of a line (n, 2) that lie in a box."""
    x, y = line.T
    inside = (x >= box.left) & (x <= box.right) & (y >= box.bottom) & (y <= box.top)
    cuts = [0, *(np.flatnonzero(np.diff(inside)) + 1), len(line)]
    return [line[a:b] for a, b in pairwise(cuts) if inside[a] and b - a > 1]


def draw_arrow_head(sheet: Axes, tip: np.ndarray, along: np.ndarray, length: float, color: str) -> None:
    """Draw the filled head of an arrow; tip (2,) in inches, along (2,) the direction it points in."""
    ahead = along / np.hypot(*along)
    aside = np.array([-ahead[1], ahead[0]]) * _HALF_ARROW * length
    back = tip - ahead * length
    add_area(sheet, [tuple(tip), tuple(back + aside), tuple(back - aside)], facecolor=color, linewidth=0)


def draw_arrow(sheet: Axes, start: np.ndarray, end: np.ndarray, color: str, width_pt: float) -> None:
    """Draw a straight arrow between places (2,) on the slide; one too short for a head has a small one."""
    away = end - start
    length = float(np.hypot(*away))
    if length == 0.0:
        return
    head = min(ARROW_IN, 0.6 * length)
    neck = end - away / length * head * 0.8
    add_line(
        sheet,
        [start[0], neck[0]],
        [start[1], neck[1]],
        color=color,
        linewidth=width_pt,
        solid_capstyle="butt",
    )
    draw_arrow_head(sheet, end, away, head, color)

"""Labels beside points of a drawing, where they hide the least: no other label, few lines, near their point.

All in inches on the slide.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from matplotlib.axes import Axes
from matplotlib.patheffects import withStroke

from porkgrid.figures.marks import add_line
from porkgrid.figures.placement import Box, Room
from porkgrid.figures.style import INK, SOFT_INK
from porkgrid.figures.text import line_height_in, put, width_in

_RADII_IN = (0.09, 0.14, 0.22, 0.34, 0.50, 0.70, 0.95, 1.25, 1.6, 2.0)
_DIRECTIONS_RAD = np.radians(np.arange(0.0, 360.0, 15.0))
_SAMPLE_IN = 0.03  # between the points that stand for a line
_PER_INCH, _PER_HIDDEN, _PER_CROSSED = 1.0, 0.06, 0.1  # what distance and pieces of line count
_PER_BOX_CROSSED = 10.0  # a leader through another label or mark is better only than no label
_CROSSED_IN = 0.03
_PAD_IN = 0.03  # around the text
_LEADER_FROM_IN = 0.16
_LEADER_CLEARANCE_IN = 0.07  # of its end from the point


@dataclass
class Drawing:
    """What labels must keep clear of: `room` for boxes, `ink` (k, 2) for points of lines.

    A label may hide a piece of a line where there is no better place, but never a taken box.
    """

    room: Room
    ink: np.ndarray = field(default_factory=lambda: np.empty((0, 2)))

    def add_line(self, line: np.ndarray, weight: int = 1) -> None:
        """Note a line through points (k, 2); to hide one of more weight costs more."""
        self.ink = np.concatenate([self.ink, *[_sampled(line)] * weight])

    def keep_clear(self, x: float, y: float, radius: float) -> None:
        """Take a square for a mark, whatever else stands there."""
        self.room.taken.append(Box(x - radius, y - radius, x + radius, y + radius))

    def hidden(self, box: Box) -> int:
        """Count the samples of lines inside a box."""
        x, y = self.ink.T
        return int(np.count_nonzero((x > box.left) & (x < box.right) & (y > box.bottom) & (y < box.top)))


def draw_callout(
    sheet: Axes,
    drawing: Drawing,
    anchors: Sequence[tuple[float, float]],
    lines: Sequence[str],
    size_pt: float,
    color: str = INK,
    weight: str = "normal",
    reach_in: float = _RADII_IN[-1],
) -> bool:
    """Write a label of one or more lines near one of its anchors, with a leader where it stands off.

    anchors: points that serve as well; the best place near any of them is taken. Only the first line has
    the weight. Tells whether there was a place within reach; without one nothing is drawn.
    """
    width = max(width_in(line, size_pt, weight if i == 0 else "normal") for i, line in enumerate(lines))
    height = line_height_in(size_pt) * (len(lines) - 1) + size_pt / 72.0
    found = _best_place(drawing, anchors, width + 2.0 * _PAD_IN, height + 2.0 * _PAD_IN, reach_in)
    if found is None:
        return False
    anchor, box = found
    drawing.room.claim(box)
    halo = [withStroke(linewidth=2.2, foreground="white")]
    _draw_leader(sheet, drawing, anchor, box)
    middle = 0.5 * (box.left + box.right)
    to_the_right = middle > anchor[0]
    x, ha = (box.left + _PAD_IN, "left") if to_the_right else (box.right - _PAD_IN, "right")
    if abs(middle - anchor[0]) < 0.25 * width:
        x, ha = middle, "center"
    for i, line in enumerate(lines):
        y = box.top - _PAD_IN - 0.80 * size_pt / 72.0 - i * line_height_in(size_pt)
        look = {"color": color, "weight": weight if i == 0 else "normal", "path_effects": halo}
        put(sheet, x, y, line, size_pt, ha=ha, **look)
    return True


def _best_place(
    drawing: Drawing, anchors: Sequence[tuple[float, float]], width: float, height: float, reach_in: float
) -> tuple[tuple[float, float], Box] | None:
    """Find the free box with the least cost, and the anchor it belongs to."""
    best, least = None, np.inf
    for radius in _RADII_IN:
        if radius > reach_in or _PER_INCH * radius >= least:
            break
        for anchor in anchors:
            for angle in _DIRECTIONS_RAD:
                box = _box_beyond(anchor, radius, float(angle), width, height)
                if not _is_free(drawing.room, box):
                    continue
                cost = _PER_INCH * radius + _PER_HIDDEN * drawing.hidden(box)
                if cost >= least:
                    continue
                cost += _PER_CROSSED * _crossed(drawing, anchor, box)
                cost += _PER_BOX_CROSSED * _boxes_on_leader(drawing.room, anchor, box)
                if cost < least:
                    best, least = (anchor, box), cost
    return best


def _box_beyond(anchor: tuple[float, float], radius: float, angle: float, width: float, height: float) -> Box:
    """Return the box whose nearest edge lies at a distance from the anchor in a direction."""
    x = anchor[0] + np.cos(angle) * (radius + 0.5 * width)
    y = anchor[1] + np.sin(angle) * (radius + 0.5 * height)
    return Box(x - 0.5 * width, y - 0.5 * height, x + 0.5 * width, y + 0.5 * height)


def _is_free(room: Room, box: Box) -> bool:
    return room.region.holds(box) and not any(box.meets(other) for other in room.taken)


def _way(anchor: tuple[float, float], box: Box) -> np.ndarray:
    """Return the shortest line (2, 2) from a point to a box."""
    end = (np.clip(anchor[0], box.left, box.right), np.clip(anchor[1], box.bottom, box.top))
    return np.array([anchor, end])


def _leader(anchor: tuple[float, float], box: Box) -> np.ndarray | None:
    """Return the two ends of the leader from a point to a box; None where the box stands close by."""
    start, end = _way(anchor, box)
    away = end - start
    distance = float(np.hypot(*away))
    if distance < _LEADER_FROM_IN:
        return None
    return np.stack([start + away * (_LEADER_CLEARANCE_IN / distance), end])


def _boxes_on_leader(room: Room, anchor: tuple[float, float], box: Box) -> int:
    """Count the taken boxes that the leader would cross, apart from that of its own point."""
    leader = _leader(anchor, box)
    if leader is None:
        return 0
    x, y = _sampled(leader).T
    return sum(
        bool(((taken.left < x) & (x < taken.right) & (taken.bottom < y) & (y < taken.top)).any())
        for taken in room.taken
        if not (taken.left < anchor[0] < taken.right and taken.bottom < anchor[1] < taken.top)
    )


def _crossed(drawing: Drawing, anchor: tuple[float, float], box: Box) -> int:
    """Count the samples of lines between a point and a box; those at the point itself do not count."""
    if not len(drawing.ink):
        return 0
    ink = drawing.ink[np.hypot(*(drawing.ink - np.asarray(anchor)).T) > _LEADER_CLEARANCE_IN]
    apart = ink[:, None, :] - _sampled(_way(anchor, box))[None, :, :]
    return int(np.count_nonzero((np.hypot(apart[..., 0], apart[..., 1]) < _CROSSED_IN).any(axis=1)))


def _draw_leader(sheet: Axes, drawing: Drawing, anchor: tuple[float, float], box: Box) -> None:
    leader = _leader(anchor, box)
    if leader is not None:
        add_line(sheet, *leader.T, color=SOFT_INK, linewidth=0.6)
        drawing.add_line(leader)


def _sampled(line: np.ndarray) -> np.ndarray:
    """Return points (m, 2) at even distances on a polyline (k, 2)."""
    along = np.concatenate(([0.0], np.cumsum(np.hypot(*np.diff(line, axis=0).T))))
    at = np.linspace(0.0, along[-1], 2 + int(along[-1] / _SAMPLE_IN))
    return np.column_stack([np.interp(at, along, side) for side in line.T])

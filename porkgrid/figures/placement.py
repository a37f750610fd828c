"""Where candidate numbers and labels on lines can stand so that they cover no other text. All in inches."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from itertools import islice

import numpy as np

_FIRST_RING_IN, _RING_STEP_IN, _RINGS = 0.17, 0.07, 16
_DIRECTIONS_DEG = 135.0 + np.array(
    [0, 180, 90, -90, 45, -45, 135, -135, 22.5, -22.5, 67.5, -67.5, 112.5, -112.5, 157.5, -157.5]
)


@dataclass(frozen=True)
class Box:
    """An upright rectangle on the slide."""

    left: float
    bottom: float
    right: float
    top: float

    def meets(self, other: Box) -> bool:
        """Tell whether two boxes share ground."""
        return (
            self.left < other.right
            and other.left < self.right
            and self.bottom < other.top
            and other.bottom < self.top
        )

    def holds(self, other: Box) -> bool:
        """Tell whether another box lies wholly inside."""
        return (
            self.left <= other.left
            and other.right <= self.right
            and self.bottom <= other.bottom
            and other.top <= self.top
        )


@dataclass
class Room:
    """A region of the slide and the boxes already taken in it."""

    region: Box
    taken: list[Box] = field(default_factory=list)

    def claim(self, box: Box) -> bool:
        """Take a box if it is inside the region and free; tell whether it was."""
        if not self.region.holds(box) or any(box.meets(other) for other in self.taken):
            return False
        self.taken.append(box)
        return True


def box_around(x: float, y: float, width: float, height: float, angle_deg: float = 0.0) -> Box:
    """Return the upright box around a rectangle of this size, turned about its centre."""
    cosine, sine = abs(np.cos(np.radians(angle_deg))), abs(np.sin(np.radians(angle_deg)))
    half_w, half_h = 0.5 * (width * cosine + height * sine), 0.5 * (width * sine + height * cosine)
    return Box(x - half_w, y - half_h, x + half_w, y + half_h)


def place_markers(
    points: Sequence[tuple[float, float]], aside: Sequence[bool], diameter: float, room: Room
) -> list[tuple[float, float] | None]:
    """Give each point, in order, a free place for its round marker: on itself, else as near as can be.

    aside: points that their own marker must not cover.
    Returns one (x, y) a point, or None where no place within reach is free.
    """
    places: list[tuple[float, float] | None] = []
    for (x, y), uncovered in zip(points, aside, strict=True):
        free = (
            at
            for at in islice(_around(x, y), int(uncovered), None)
            if room.claim(box_around(*at, diameter, diameter))
        )
        places.append(next(free, None))
    return places


def _around(x: float, y: float) -> Iterator[tuple[float, float]]:
    yield x, y
    for radius in _FIRST_RING_IN + _RING_STEP_IN * np.arange(_RINGS):
        for angle in np.radians(_DIRECTIONS_DEG):
            yield x + float(radius * np.cos(angle)), y + float(radius * np.sin(angle))


def place_on_line(
    line: np.ndarray, width: float, height: float, room: Room
) -> tuple[float, float, float] | None:
    """Find a free and nearly straight place on a line for a label.

    line: (n, 2) vertices in inches. Returns x, y and the angle in degrees, upright to read, or None.
    """
    steps = np.hypot(*np.diff(line, axis=0).T)
    along = np.concatenate(([0.0], np.cumsum(steps)))
    if along[-1] < 1.8 * width:
        return None
    for share in (0.5, 0.35, 0.65, 0.2, 0.8, 0.1, 0.9):
        middle = share * along[-1]
        ends = np.clip([middle - 0.5 * width, middle + 0.5 * width], 0.0, along[-1])
        (xa, xm, xb), (ya, ym, yb) = (np.interp([ends[0], middle, ends[1]], along, side) for side in line.T)
        if np.hypot(xb - xa, yb - ya) < 0.93 * width:
            continue  # too bent here, or too near an end
        angle = (np.degrees(np.arctan2(yb - ya, xb - xa)) + 90.0) % 180.0 - 90.0
        if room.claim(box_around(xm, ym, width + 0.04, height, angle)):
            return float(xm), float(ym), float(angle)
    return None

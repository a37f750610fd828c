"""Where on its conic a transfer flies: angle swept and distances passed.

Vectors have their components first, (3, ...), and broadcast. Two-body formulas of any astrodynamics text.
"""

from __future__ import annotations

import numpy as np

Vector = np.ndarray | tuple[np.ndarray, np.ndarray, np.ndarray]


def transfer_angle(r1: np.ndarray, r2: np.ndarray, v1: np.ndarray) -> np.ndarray:
    """Angle from r1 to r2 in the direction of flight, 0 to 2π rad, whole revolutions left out."""
    normal = _cross(r1, r2)
    sine = np.sqrt(_dot(normal, normal))
    # beyond 180° the flight turns against r1 × r2
    against = _dot(normal, _cross(r1, v1)) < 0.0
    angle = np.arctan2(np.where(against, -sine, sine), _dot(r1, r2))
    angle = np.where(angle < 0.0, angle + 2.0 * np.pi, angle)
    return np.where(np.isnan(v1[0]), np.nan, angle)


def distance_range(
    r1: np.ndarray, v1: np.ndarray, r2: np.ndarray, v2: np.ndarray, full_turn: np.ndarray, gm: float
) -> tuple[np.ndarray, np.ndarray]:
    """Least and greatest distance from the centre on the arc from (r1, v1) to (r2, v2).

    An apsis counts only where the arc passes it: the distance falls at one end and rises at the other, or
    falls at both though it ends higher (then both apsides are passed). `full_turn` marks arcs of at least
    one revolution, which pass both.
    """
    d1, d2 = np.sqrt(_dot(r1, r1)), np.sqrt(_dot(r2, r2))
    climb = _dot(r1, v1) / d1  # radial speed
    down1, down2 = climb < 0.0, _dot(r2, v2) < 0.0
    alpha = 2.0 / d1 - _dot(v1, v1) / gm  # 1/a
    momentum = _cross(r1, v1)
    p = _dot(momentum, momentum) / gm
    e = np.hypot(p / d1 - 1.0, np.sqrt(p / gm) * climb)  # e cos ν and e sin ν
    wrapped = full_turn | (down1 & down2 & (d2 > d1)) | (~down1 & ~down2 & (d2 < d1))
    periapsis = wrapped | (down1 & ~down2)
    apoapsis = (wrapped | (~down1 & down2)) & (alpha > 0.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        least = np.where(periapsis, p / (1.0 + e), np.minimum(d1, d2))
        greatest = np.where(apoapsis, (1.0 + e) / alpha, np.maximum(d1, d2))
    none = np.isnan(p)
    return np.where(none, np.nan, least), np.where(none, np.nan, greatest)


def _dot(a: Vector, b: Vector) -> np.ndarray:
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2]


def _cross(a: np.ndarray, b: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """a × b by components: numpy's own moves the axis first, which costs more than the products."""
    return a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]

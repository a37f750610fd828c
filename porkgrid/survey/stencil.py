"""Slopes and curvatures of functions from their values on a stencil of points: central differences.

Second derivatives in two variables take the two points on one diagonal beside those on the axes, so that n
variables need 1 + n + n² points (Abramowitz and Stegun, 25.3.27; memory).
"""

from __future__ import annotations

import numpy as np


def stencil(n: int) -> np.ndarray:
    """(n, p) points in units of the widths: the middle, up and down every axis, both ways on diagonals."""
    unit = np.eye(n)
    i, j = np.triu_indices(n, 1)
    diagonal = (unit[i] + unit[j]).T
    return np.hstack([np.zeros((n, 1)), unit, -unit, diagonal, -diagonal])


def derivatives(values: np.ndarray, n: int) -> tuple[np.ndarray, np.ndarray]:
    """Slopes (rows, n) and curvatures (rows, n, n), per unit width, of values (rows, p) on the stencil.

    A slope is one-sided where the value on the other side is no number, and zero where neither is one; a
    curvature that lacks a value is zero.
    """
    i, j = np.triu_indices(n, 1)
    pairs = len(i)
    middle = values[:, :1]
    up, down, both_up, both_down = np.split(values[:, 1:], np.cumsum([n, n, pairs]), axis=1)
    with np.errstate(invalid="ignore"):
        central, ahead, behind = 0.5 * (up - down), up - middle, middle - down
        along = ahead - behind
        mixed = 0.5 * (both_up + both_down - up[:, i] - up[:, j] - down[:, i] - down[:, j] + 2.0 * middle)
    slope = np.where(np.isfinite(central), central, np.where(np.isfinite(ahead), ahead, behind))
    curvature = np.zeros((len(values), n, n))
    curvature[:, range(n), range(n)] = along
    curvature[:, i, j] = curvature[:, j, i] = mixed
    return np.where(np.isfinite(slope), slope, 0.0), np.where(np.isfinite(curvature), curvature, 0.0)

"""The least of a convex quadratic under linear limits: a small dense quadratic program.

Turned into a least-distance problem, and that into one of least squares with no negative unknowns (Lawson and
Hanson, Solving Least Squares Problems, chapter 23; memory), which scipy solves.
"""

from __future__ import annotations

import numpy as np

_FLAT = 1e-6  # least curvature: flatter, or downward, directions are taken as so curved
_NO_ROOM = 1e-10


def least_quadratic(
    slope: np.ndarray, curvature: np.ndarray, rows: np.ndarray, least: np.ndarray
) -> tuple[np.ndarray, np.ndarray] | None:
    """Where slope·d + d·curvature·d/2 is least among d (n,) with rows d >= least; the limits' multipliers.

    slope (n,), curvature (n, n) symmetric, rows (m, n), least (m,); where the quadratic curves downward it is
    taken as curving upward as much. None where no d keeps all limits.
    """
    from scipy.optimize import nnls

    bend, axes = np.linalg.eigh(curvature)
    root = np.sqrt(np.maximum(np.abs(bend), _FLAT))
    # y = root · axesᵀ d + shift, so that the quadratic is |y|²/2 and a constant
    shift = axes.T @ slope / root
    across = rows @ axes / root
    ahead = least + across @ shift
    size = max(float(np.max(np.abs(ahead), initial=0.0)), 1e-300)
    width = np.maximum(np.linalg.norm(across, axis=1), 1e-300)
    matrix = np.vstack([across.T, ahead / size]) / width
    target = np.zeros(len(slope) + 1)
    target[-1] = 1.0
    weights, _ = nnls(matrix, target)
    left = 1.0 - matrix[-1] @ weights
    if left < _NO_ROOM:
        return None
    multipliers = size * weights / width / left
    y = across.T @ multipliers
    return axes @ ((y - shift) / root), multipliers

"""Hatches as small pixel tiles. Painting them costs the same whatever the outline of the ground they cover.

Vector hatching would need the outline of every kind of ground: on a large grid the slowest part of a chart.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np

TILE_PX = 20  # 7.2 pt at 200 pixels per inch
_FINE = 8  # samples a pixel side, for smooth edges
_STROKE = 0.16  # of the tile


@lru_cache(maxsize=1)
def hatch_tiles() -> np.ndarray:
    """Return (7, TILE_PX, TILE_PX) ink coverage 0 to 1, rows downward: six hatches, then the common one.

    Order: rising lines, falling lines, dots, level lines, upright lines, crosses; then level dashes.
    """
    at = (np.arange(TILE_PX * _FINE) + 0.5) / (TILE_PX * _FINE)
    x, y = at[None, :], at[::-1, None]  # y upward
    level, upright = _stripe(y + 0.0 * x), _stripe(x + 0.0 * y)
    rising, falling = _stripe(y - x), _stripe(y + x)
    dots = np.hypot(x - 0.5, y - 0.5) < 0.17
    crosses = rising | falling
    dashes = _stripe(y + 0.0 * x) & (x < 0.55)
    tiles = np.stack([rising, falling, dots, level, upright, crosses, dashes]).astype(float)
    return tiles.reshape(len(tiles), TILE_PX, _FINE, TILE_PX, _FINE).mean(axis=(2, 4))


def _stripe(phase: np.ndarray) -> np.ndarray:
    return np.mod(phase, 1.0) < _STROKE


def hatch_coverage(hatch: np.ndarray) -> np.ndarray:
    """Return the ink coverage (rows, columns) of a picture whose pixels name their hatch; −1 is no hatch."""
    rows, columns = hatch.shape
    tiles = np.concatenate([hatch_tiles(), np.zeros((1, TILE_PX, TILE_PX))]).astype(np.float32)
    row, column = np.arange(rows) % TILE_PX, np.arange(columns) % TILE_PX
    return tiles[hatch, row[:, None], column[None, :]]

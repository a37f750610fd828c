"""Candidates: the distinct local bests of a survey under its limits.

A local best is an allowed cell that none of its eight neighbours beats. Of two that are closer than
`apart_days` in every date only the better one counts: they are one window.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np

BAND_ROWS = 512


def local_bests(
    read: Callable[[slice], tuple[np.ndarray, np.ndarray]], rows: int, sign: float
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Find the local bests of a grid that is read a band of rows at a time.

    `read(rows)` gives the rank measure and `blocked_by` of a slice of rows, (k, m) each. Returns row and
    column indices and values, best first (sign +1: least, −1: most).
    """
    found: list[tuple[np.ndarray, np.ndarray, np.ndarray]] = []
    for start in range(0, rows, BAND_ROWS):
        stop = min(start + BAND_ROWS, rows)
        above, below = max(start - 1, 0), min(stop + 1, rows)
        values, blocked = read(slice(above, below))
        cost = np.where((blocked == 0) & ~np.isnan(values), sign * values, np.inf)
        peak = _lowest_of_nine(cost)
        peak[: start - above] = False
        peak[stop - above :] = False
        i, j = np.nonzero(peak)
        found.append((i + above, j, values[i, j]))
    i, j, values = (np.concatenate(parts) for parts in zip(*found, strict=True))
    order = np.lexsort((j, i, sign * values))
    return i[order], j[order], values[order]


def distinct(epochs: np.ndarray, apart_days: float, keep: int) -> Iterator[int]:
    """Indices of the first `keep` rows of epochs (k, encounters), best first, that are windows apart."""
    chosen: list[np.ndarray] = []
    for index, dates in enumerate(epochs):
        if len(chosen) == keep:
            return
        if chosen and np.any(np.all(np.abs(np.array(chosen) - dates) < apart_days, axis=1)):
            continue
        chosen.append(dates)
        yield index


def _lowest_of_nine(cost: np.ndarray) -> np.ndarray:
    """Where a cell is finite and no neighbour is lower; of equal neighbours the first in row order counts."""
    n, m = cost.shape
    padded = np.full((n + 2, m + 2), np.inf)
    padded[1:-1, 1:-1] = cost
    lowest = np.isfinite(cost)
    for di in (-1, 0, 1):
        for dj in (-1, 0, 1):
            if (di, dj) == (0, 0):
                continue
            neighbour = padded[1 + di : n + 1 + di, 1 + dj : m + 1 + dj]
            lowest &= (cost < neighbour) if (di, dj) < (0, 0) else (cost <= neighbour)
    return lowest

"""From a grid of cells to the pixels of a panel: whole cells, or values interpolated between cells."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import xarray as xr

from porkgrid.figures.dates import cell_edges, days_from_dates
from porkgrid.figures.style import PIXELS_PER_INCH

_HALF_TURN_DEG = 180.0


@dataclass(frozen=True, eq=False)
class Raster:
    """Where the pixels of a panel lie in a grid. Rows run downward, so the latest arrival is row 0.

    departure, arrival: cell centres, days since 1970; x_edges, y_edges: cell edges, one more each.
    x_px, y_px: pixel centres in days, (columns,) and (rows,).
    """

    departure: np.ndarray
    arrival: np.ndarray
    x_edges: np.ndarray
    y_edges: np.ndarray
    x_px: np.ndarray
    y_px: np.ndarray

    @property
    def limits(self) -> tuple[float, float, float, float]:
        """Return x low, x high, y low, y high of the panel, in days."""
        return (
            float(self.x_edges[0]),
            float(self.x_edges[-1]),
            float(self.y_edges[0]),
            float(self.y_edges[-1]),
        )

    def cells(self, grid: np.ndarray) -> np.ndarray:
        """Return (rows, columns): for each pixel the value of its cell; grid (departure, arrival)."""
        column = np.searchsorted(self.x_edges[1:-1], self.x_px, side="right")
        row = np.searchsorted(self.y_edges[1:-1], self.y_px, side="right")
        return np.take(np.take(grid.T, row, axis=0), column, axis=1)

    def between(self, grid: np.ndarray, unit: str) -> np.ndarray:
        """Return (rows, columns): values interpolated bilinearly between cells; grid (departure, arrival).

        Where a neighbour is missing or an angle jumps by more than half a turn, the value of the cell itself.
        """
        x0, x1, fx = _neighbours(self.departure, self.x_px)
        y0, y1, fy = _neighbours(self.arrival, self.y_px)
        turned = np.ascontiguousarray(cut_turns(grid, unit).T)
        down, across = fy.astype(turned.dtype)[:, None], fx.astype(turned.dtype)
        lines = turned[y0] + down * (turned[y1] - turned[y0])
        value = lines[:, x0] + across * (lines[:, x1] - lines[:, x0])
        return np.where(np.isfinite(value), value, self.cells(grid))


def raster_for(view: xr.Dataset, width_in: float, height_in: float) -> Raster:
    """Lay the pixels of a panel of this size over the grid of a survey."""
    departure = days_from_dates(view["departure"].values)
    arrival = days_from_dates(view["arrival"].values)
    x_edges, y_edges = cell_edges(departure), cell_edges(arrival)
    columns, rows = round(width_in * PIXELS_PER_INCH), round(height_in * PIXELS_PER_INCH)
    x_px = x_edges[0] + (np.arange(columns) + 0.5) / columns * (x_edges[-1] - x_edges[0])
    y_px = y_edges[-1] - (np.arange(rows) + 0.5) / rows * (y_edges[-1] - y_edges[0])
    return Raster(departure, arrival, x_edges, y_edges, x_px, y_px)


def cut_turns(grid: np.ndarray, unit: str) -> np.ndarray:
    """Return an angle's grid with NaN where it jumps from 360 to 0, so that no line crosses the jump."""
    if unit not in ("deg", "°") or grid.size == 0:
        return grid
    jump = np.zeros(grid.shape, dtype=bool)
    jump[1:, :] |= np.abs(np.diff(grid, axis=0)) > _HALF_TURN_DEG
    jump[:, 1:] |= np.abs(np.diff(grid, axis=1)) > _HALF_TURN_DEG
    return np.where(jump, np.nan, grid)


def _neighbours(centres: np.ndarray, pixels: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Return for each pixel the cells on either side of it and how far between their centres it lies."""
    at = np.interp(pixels, centres, np.arange(centres.size, dtype=float))
    low = np.minimum(at.astype(np.intp), max(centres.size - 2, 0))
    return low, np.minimum(low + 1, centres.size - 1), at - low

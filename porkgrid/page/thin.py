"""The grid as the page holds it: whole where it is small, else every k-th date a side, never averages."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
import xarray as xr

from porkgrid.survey.plan import Tile


@dataclass(frozen=True)
class Thinning:
    """Every how many dates are kept of each side, and how many dates the survey has."""

    departure_step: int
    arrival_step: int
    departures: int
    arrivals: int

    @property
    def cells(self) -> int:
        """How many cells are kept."""
        return -(-self.departures // self.departure_step) * -(-self.arrivals // self.arrival_step)

    @property
    def words(self) -> str:
        """What is kept, as a sentence for the page; "" where nothing is left out."""
        if self.departure_step == self.arrival_step == 1:
            return ""
        return (
            f"This page holds {_every(self.departure_step, 'departure')} and "
            f"{_every(self.arrival_step, 'arrival')} of the survey's {self.departures} × {self.arrivals} "
            "dates, with the values of those dates. Candidates marked “exact” come from the whole grid."
        )


def thinning_for(departures: int, arrivals: int, most_cells: int) -> Thinning:
    """The finest thinning with at most so many cells; the side with more dates left is thinned first."""
    steps = [1, 1]
    sizes = (departures, arrivals)
    kept = list(sizes)
    while kept[0] * kept[1] > most_cells:
        side = 0 if kept[0] > kept[1] else 1
        steps[side] += 1
        kept[side] = -(-sizes[side] // steps[side])
    return Thinning(steps[0], steps[1], departures, arrivals)


def thinned(variable: xr.DataArray, thinning: Thinning) -> np.ndarray:
    """The kept values of a stored variable of both dates, (arrivals, departures) as a chart has it."""
    kept = variable.isel(
        departure=slice(None, None, thinning.departure_step),
        arrival=slice(None, None, thinning.arrival_step),
    )
    return np.ascontiguousarray(kept.transpose("arrival", "departure").values)


def thinned_dates(values: np.ndarray, step: int) -> np.ndarray:
    """The kept ones of what belongs to the dates of one side, (n,)."""
    return np.asarray(values)[::step]


def swept_part(
    variable: xr.DataArray, tiles: Iterable[Tile], rows: slice, columns: slice, fill: float
) -> np.ndarray:
    """Rows and columns of a stored variable of both dates, read from these tiles only; `fill` elsewhere.

    rows, columns: slices with start, stop and step. Returns (departures, arrivals) of the variable's type.
    """
    part = np.full((len(_numbers(rows)), len(_numbers(columns))), fill, dtype=variable.dtype)
    for tile in tiles:
        i, j = _inside(rows, tile.rows), _inside(columns, tile.columns)
        read = variable.isel(departure=_taken(rows, i), arrival=_taken(columns, j))
        if read.size:
            part[i, j] = read.transpose("departure", "arrival").values
    return part


def _inside(taken: slice, block: slice) -> slice:
    """Which of the numbers that a slice takes lie in a block, as places among those taken."""
    first, end = (np.searchsorted(_numbers(taken), edge) for edge in (block.start, block.stop))
    return slice(int(first), int(end))


def _taken(taken: slice, places: slice) -> slice:
    """The numbers at these places of a slice."""
    numbers = _numbers(taken)[places]
    return slice(numbers.start, numbers.stop, numbers.step)


def _numbers(taken: slice) -> range:
    return range(taken.start, taken.stop, taken.step)


def _every(step: int, side: str) -> str:
    """ "every departure date", "every 3rd departure date"."""
    if step == 1:
        return f"every {side} date"
    ending = {1: "st", 2: "nd", 3: "rd"}.get(step % 10, "th") if step % 100 not in (11, 12, 13) else "th"
    return f"every {step}{ending} {side} date"

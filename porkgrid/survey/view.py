"""What a picture of a survey is drawn from, at the full resolution of its grid."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
import xarray as xr

from porkgrid.survey.limits import REASONS
from porkgrid.survey.store import BLOCKED_BY
from porkgrid.survey.surveys import Survey

# Cells a side above which a picture is drawn from every k-th date: more than a slide has pixels for.
DRAWN_SIDE = 1200
BAND_CELLS = 2**22


@dataclass(frozen=True, eq=False)
class DayBests:
    """The best allowed value of one measure on each departure date and on each arrival date.

    departure, arrival: datetime64 arrays (n,) and (m,), ascending, TDB calendar.
    departure_best, arrival_best: float arrays of the same lengths; NaN where no cell of that date is allowed.
    """

    departure: np.ndarray
    departure_best: np.ndarray
    arrival: np.ndarray
    arrival_best: np.ndarray


@dataclass(frozen=True)
class FlagShare:
    """What one flag costs: the share of the grid (0 to 1) it forbids, and the share that it alone forbids."""

    title: str
    share: float
    alone: float


def row_bands(survey: Survey, name: str) -> Iterator[tuple[np.ndarray, np.ndarray]]:
    """Yield a stored variable and `blocked_by`, (k, m) each, a band of rows at a time."""
    grid = survey.grid
    for rows in _bands(grid.sizes["departure"], grid.sizes["arrival"]):
        band = grid[[name, BLOCKED_BY]].isel(departure=rows)
        values = band[name].broadcast_like(band[BLOCKED_BY]).transpose("departure", "arrival")
        yield values.values, band[BLOCKED_BY].values


def day_bests(survey: Survey, of: str) -> DayBests:
    """The best allowed value of a stored measure on every date."""
    grid, sign = survey.grid, better_sign(survey, of)
    by_departure = []
    by_arrival = np.full(grid.sizes["arrival"], np.inf)
    for values, blocked in row_bands(survey, of):
        cost = np.where((blocked == 0) & ~np.isnan(values), sign * values, np.inf)
        by_departure.append(cost.min(axis=1))
        np.minimum(by_arrival, cost.min(axis=0), out=by_arrival)
    return DayBests(
        grid["departure"].values,
        _unsigned(np.concatenate(by_departure), sign),
        grid["arrival"].values,
        _unsigned(by_arrival, sign),
    )


def drawn_view(survey: Survey, names: Sequence[str]) -> xr.Dataset:
    """The grid as a picture needs it: whole where it is small, else every k-th date of each side.

    The attribute `thinned` says so in words. Values are those of the dates kept, never averages.
    """
    grid = survey.grid[[*names, BLOCKED_BY]]
    steps = {side: -(-grid.sizes[side] // DRAWN_SIDE) for side in ("departure", "arrival")}
    if max(steps.values()) == 1:
        return grid.load()
    kept = []
    for rows in _bands(grid.sizes["departure"], grid.sizes["arrival"], steps["departure"]):
        band = grid.isel(departure=slice(rows.start, rows.stop, steps["departure"]))
        kept.append(band.isel(arrival=slice(None, None, steps["arrival"])).load())
    arrival_only = [name for name in names if grid[name].dims == ("arrival",)]
    view = xr.concat([band.drop_vars(arrival_only) for band in kept], "departure", combine_attrs="override")
    view = view.assign({name: kept[0][name] for name in arrival_only})
    return view.assign_attrs(
        thinned=f"drawn from every {steps['departure']}. departure and every {steps['arrival']}. arrival date"
    )


def flag_shares(survey: Survey) -> list[FlagShare]:
    """What each limit costs, and each reason for which cells are not flown that occurs at all."""
    cells = survey.provenance["cells"]
    forbidden = survey.provenance["cells_forbidden_by"]
    alone = survey.provenance["cells_forbidden_by_it_alone"]
    flags = survey.grid[BLOCKED_BY].attrs
    return [
        FlagShare(title, forbidden[name] / cells, alone[name] / cells)
        for name, title in zip(flags["flag_meanings"].split(), flags["flag_titles"], strict=True)
        if forbidden[name] or name not in REASONS
    ]


def better_sign(survey: Survey, of: str) -> float:
    """+1 where less of a measure is better, −1 where more is: as ranked, else as the measure's nature is."""
    plan = survey.plan
    if of == plan.rank_by:
        return plan.rank_sign
    return -1.0 if of in plan.measures and plan.measures[of].better == "most" else 1.0


def _bands(rows: int, columns: int, multiple: int = 1) -> Iterator[slice]:
    size = max(1, BAND_CELLS // columns // multiple) * multiple
    for start in range(0, rows, size):
        yield slice(start, min(start + size, rows))


def _unsigned(cost: np.ndarray, sign: float) -> np.ndarray:
    return np.where(np.isfinite(cost), sign * cost, np.nan)

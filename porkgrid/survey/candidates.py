"""The candidates' table: every measure of the route at the dates that were picked, at full precision."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import xarray as xr

from porkgrid.errors import RequestError
from porkgrid.sky.epochs import iso_from_jd
from porkgrid.sky.states import state_table
from porkgrid.survey.legs import LegOption
from porkgrid.survey.plan import Plan
from porkgrid.survey.rank import distinct, local_bests
from porkgrid.survey.reading import open_grid
from porkgrid.survey.routes import cells_at
from porkgrid.survey.store import BLOCKED_BY
from porkgrid.survey.surveys import Survey
from porkgrid.survey.view import better_sign

_BLOCK = 64  # routes that are flown together


@dataclass(frozen=True)
class Picked:
    """A candidate: its epochs, TDB Julian dates of all encounters, and how each leg is flown."""

    epochs: tuple[float, ...]
    options: tuple[LegOption, ...]


def pick(folder: Path, plan: Plan, by: str, sign: float, keep: int, apart_days: float) -> list[Picked]:
    """The distinct local bests of a stored measure, best first."""
    grid = open_grid(folder, plan.shape, plan.stored)

    def read(rows: slice) -> tuple[np.ndarray, np.ndarray]:
        band = grid[[by, BLOCKED_BY]].isel(departure=rows)
        values = band[by].broadcast_like(band[BLOCKED_BY]).transpose("departure", "arrival")
        return values.values, band[BLOCKED_BY].values

    i, j, _ = local_bests(read, len(plan.tables[0].jd), sign)
    cells, epochs = _cells_of_candidates(grid, plan, i, j)
    return [_picked(plan, cells, epochs, row) for row in distinct(epochs, apart_days, keep)]


def picked_at(grid: xr.Dataset, plan: Plan, i: np.ndarray, j: np.ndarray) -> list[Picked]:
    """The routes in cells (i, j) of a survey's grid, index arrays (k,), all of them cells that are flown."""
    cells, epochs = _cells_of_candidates(grid, plan, i, j)
    return [_picked(plan, cells, epochs, row) for row in range(len(epochs))]


def epoch_names(plan: Plan) -> list[str]:
    """The measures that hold the epochs of a route's encounters, in flying order."""
    stops = ["departure", *(f"flyby{n}" for n in range(1, plan.flybys + 1)), "arrival"]
    return [f"{stop}_epoch_jd_tdb" for stop in stops]


def stops_of(plan: Plan) -> list[str]:
    """The columns that hold the ISO dates of a route's encounters, in flying order."""
    return [name.removesuffix("_epoch_jd_tdb") for name in epoch_names(plan)]


def tabulate(plan: Plan, picked: list[Picked]) -> pd.DataFrame:
    """Table of candidates: rank, ISO dates of all encounters, then every measure of the route."""
    stops = stops_of(plan)
    table: dict[str, Any] = {"rank": range(1, len(picked) + 1)}
    for number, stop in enumerate(stops):
        table[stop] = [iso_from_jd(one.epochs[number]) for one in picked]
    return pd.DataFrame(table | measures_of(plan, picked), columns=["rank", *stops, *plan.measures])


def measures_at(plan: Plan, one: Picked) -> dict[str, float]:
    """Every measure of a route flown at epochs that need not be on the grid."""
    return {name: float(values[0]) for name, values in measures_of(plan, [one]).items()}


def measures_of(plan: Plan, picked: Sequence[Picked]) -> dict[str, np.ndarray]:
    """Every measure, (k,), of k routes flown at epochs that need not be on the grid."""
    found = {name: np.full(len(picked), np.nan) for name in plan.measures}
    together: dict[tuple[LegOption, ...], list[int]] = defaultdict(list)
    for number, one in enumerate(picked):
        together[one.options].append(number)
    for options, numbers in together.items():
        for start in range(0, len(numbers), _BLOCK):
            block = numbers[start : start + _BLOCK]
            for name, values in _flown(plan, options, [picked[number].epochs for number in block]).items():
                found[name][block] = values
    return found


def _flown(
    plan: Plan, options: tuple[LegOption, ...], epochs: list[tuple[float, ...]]
) -> dict[str, np.ndarray]:
    """Measures of k routes with the same leg options: the diagonal of the k × k grid of their dates.

    For a few dozen routes that is far less work than k grids of one cell each.
    """
    tables = [
        state_table(plan.ephemeris, table.body, np.array(dates))
        for table, dates in zip(plan.tables, zip(*epochs, strict=True), strict=True)
    ]
    cells, k = cells_at(plan, tables, list(options)), len(epochs)
    with np.errstate(invalid="ignore", over="ignore"):  # off the diagonal anything may be
        return {
            name: np.diagonal(np.broadcast_to(measure.compute(cells), (k, k)))
            for name, measure in plan.measures.items()
        }


def _cells_of_candidates(
    grid: xr.Dataset, plan: Plan, i: np.ndarray, j: np.ndarray
) -> tuple[xr.Dataset, np.ndarray]:
    """What the store holds of the cells that a candidate is made of, and their epochs (n, encounters)."""
    at = {"departure": xr.DataArray(i, dims="cell"), "arrival": xr.DataArray(j, dims="cell")}
    cells = grid[[name for name in plan.stored if _makes_a_candidate(name)]].isel(at).load()
    return cells, np.column_stack([cells[name].values for name in epoch_names(plan)])


def _picked(plan: Plan, cells: xr.Dataset, epochs: np.ndarray, row: int) -> Picked:
    return Picked(tuple(map(float, epochs[row])), _options(plan, cells, row))


def _makes_a_candidate(name: str) -> bool:
    return name.endswith(("_epoch_jd_tdb", "_revs", "_branch"))


def _options(plan: Plan, cells: xr.Dataset, row: int) -> tuple[LegOption, ...]:
    """The leg options whose revolutions and branch the store gives for a cell."""
    kept = []
    for n, options in enumerate(plan.options, start=1):
        flown = (int(cells[f"leg{n}_revs"][row]), int(cells[f"leg{n}_branch"][row]))
        kept.append(next(option for option in options if (option.revs, option.branch) == flown))
    return tuple(kept)


def rank_anew(
    survey: Survey, by: str | None, order: str | None, keep: int | None, apart_days: float | None
) -> tuple[pd.DataFrame, str]:
    """Candidates of a finished survey by any measure it stores; what is None is as in the scenario.

    Returns the table and the measure. RequestError for a measure that the survey does not store.
    """
    plan, rank = survey.plan, survey.scenario.rank
    by = by or plan.rank_by
    if by not in plan.stored:
        raise RequestError(
            f"{survey.path}: the survey does not store {by!r}; it has {', '.join(plan.stored)}"
        )
    sign = better_sign(survey, by) if order is None else (-1.0 if order == "most" else 1.0)
    apart = rank.apart_days if apart_days is None else apart_days
    return tabulate(plan, pick(survey.path, plan, by, sign, keep or rank.keep, apart)), by

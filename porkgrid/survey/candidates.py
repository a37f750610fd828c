"""The candidates' table: every measure of the route at the dates that were picked, at full precision."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import xarray as xr

from porkgrid.errors import RequestError
from porkgrid.sky.bodies import find_body
from porkgrid.sky.epochs import iso_from_jd
from porkgrid.sky.states import StateTable, state_table
from porkgrid.survey.plan import Plan
from porkgrid.survey.rank import distinct, local_bests
from porkgrid.survey.routes import fly_between
from porkgrid.survey.store import BLOCKED_BY, STORE
from porkgrid.survey.surveys import Survey


def pick(folder: Path, plan: Plan, by: str, sign: float, keep: int, apart_days: float) -> np.ndarray:
    """Epochs (k, 2) of the distinct local bests of a stored measure, best first, TDB Julian dates."""
    departure, arrival = plan.tables[0].jd, plan.tables[-1].jd
    grid = xr.open_zarr(folder / STORE, chunks=None)[[by, BLOCKED_BY]]

    def read(rows: slice) -> tuple[np.ndarray, np.ndarray]:
        band = grid.isel(departure=rows)
        values = band[by].broadcast_like(band[BLOCKED_BY]).transpose("departure", "arrival")
        return values.values, band[BLOCKED_BY].values

    i, j, _ = local_bests(read, len(departure), sign)
    epochs = np.column_stack([departure[i], arrival[j]])
    return epochs[list(distinct(epochs, apart_days, keep))]


def tabulate(plan: Plan, epochs: np.ndarray) -> pd.DataFrame:
    """Table of candidates: rank, ISO dates, then every measure of the route. `epochs` (k, 2) as of `pick`."""
    rows = []
    for number, (departure, arrival) in enumerate(epochs, start=1):
        row: dict[str, object] = {
            "rank": number,
            "departure": iso_from_jd(departure),
            "arrival": iso_from_jd(arrival),
        }
        rows.append(row | measure_at(plan, departure, arrival))
    columns = ["rank", "departure", "arrival", *plan.measures]
    return pd.DataFrame(rows, columns=columns)


def measure_at(plan: Plan, departure_jd: float, arrival_jd: float) -> dict[str, float]:
    """Every measure of the route between two epochs, which need not be on the grid."""
    ends = [_state_at(plan, encounter, jd) for encounter, jd in ((0, departure_jd), (-1, arrival_jd))]
    earth = _earth_at(plan, ends[1].jd)
    cells, _ = fly_between(plan, ends[0], ends[1], earth)
    return {name: float(np.ravel(measure.compute(cells))[0]) for name, measure in plan.measures.items()}


def _state_at(plan: Plan, encounter: int, jd: float) -> StateTable:
    return state_table(plan.ephemeris, plan.tables[encounter].body, np.array([jd]))


def _earth_at(plan: Plan, jd: np.ndarray) -> np.ndarray:
    return plan.ephemeris.states(find_body("earth", {}), jd)[0]


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
    usual = rank.order if by == plan.rank_by else "least"
    sign = -1.0 if (order or usual) == "most" else 1.0
    apart = rank.apart_days if apart_days is None else apart_days
    return tabulate(plan, pick(survey.path, plan, by, sign, keep or rank.keep, apart)), by

"""One tile of a sweep: its cells, its measures, and the sums that the survey reports."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from porkgrid.survey.limits import flag_names
from porkgrid.survey.measures import BOTH
from porkgrid.survey.plan import Plan, Tile
from porkgrid.survey.routes import route_cells
from porkgrid.survey.store import BLOCKED_BY, stored_type


@dataclass(frozen=True)
class TileSums:
    """What a tile adds to the survey's totals."""

    tile: int
    cells: int
    allowed: int
    forbidden: dict[str, int]  # cells per flag, alone or with others
    alone: dict[str, int]  # cells that only this flag forbids
    best: float | None  # best allowed value of the rank measure


def compute_tile(plan: Plan, tile: Tile) -> tuple[dict[str, np.ndarray], TileSums]:
    """Values of every stored array of two dates over a tile, and its sums."""
    cells, blocked = route_cells(plan, tile.rows, tile.columns)
    values: dict[str, np.ndarray] = {BLOCKED_BY: blocked}
    for name in plan.stored:
        measure = plan.measures[name]
        if measure.dims == BOTH:
            with np.errstate(over="ignore"):  # the mass of what nobody could fly is infinite in the store
                kept = np.broadcast_to(measure.compute(cells), blocked.shape).astype(stored_type(measure))
            values[name] = kept
    rank = np.broadcast_to(plan.measures[plan.rank_by].compute(cells), blocked.shape)
    return values, _sums(plan, tile, blocked, rank)


def _sums(plan: Plan, tile: Tile, blocked: np.ndarray, rank: np.ndarray) -> TileSums:
    allowed = blocked == 0
    forbidden, alone = {}, {}
    for bit, name in enumerate(flag_names(plan.bounds)):
        mask = np.uint32(1 << bit)
        forbidden[name] = int(np.count_nonzero(blocked & mask))
        alone[name] = int(np.count_nonzero(blocked == mask))
    best = None
    if allowed.any():
        best = float(plan.rank_sign * np.nanmin(plan.rank_sign * rank[allowed]))
    return TileSums(tile.number, tile.cells, int(np.count_nonzero(allowed)), forbidden, alone, best)

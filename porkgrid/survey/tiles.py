"""One tile of a sweep: its cells, its measures, and the sums that the survey reports."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numba import njit

from porkgrid.physics.timeflight import PLAIN
from porkgrid.survey.limits import BITS, flag_names
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
    sizes: tuple[int, ...] = ()  # bytes of its chunk in each array, in the order of store.tiled


def compute_tile(plan: Plan, tile: Tile) -> tuple[dict[str, np.ndarray], TileSums]:
    """Values of every stored array of two dates over a tile, and its sums."""
    cells, blocked = route_cells(plan, tile.rows, tile.columns)
    values: dict[str, np.ndarray] = {BLOCKED_BY: blocked}
    for name in plan.stored:
        measure = plan.measures[name]
        if measure.dims == BOTH:
            with np.errstate(over="ignore"):  # the mass of what nobody could fly is infinite in the store
                kept: np.ndarray = np.broadcast_to(measure.compute(cells), blocked.shape).astype(
                    stored_type(measure)
                )
            values[name] = kept
    rank = np.broadcast_to(plan.measures[plan.rank_by].compute(cells), blocked.shape)
    return values, _sums(plan, tile, blocked, rank)


def _sums(plan: Plan, tile: Tile, blocked: np.ndarray, rank: np.ndarray) -> TileSums:
    names = flag_names(plan.bounds)
    forbidden, alone = np.zeros(BITS, dtype=np.int64), np.zeros(BITS, dtype=np.int64)
    allowed, best = _tally(
        blocked, np.ascontiguousarray(rank, dtype=np.float64), plan.rank_sign, forbidden, alone
    )
    return TileSums(
        tile.number,
        tile.cells,
        allowed,
        dict(zip(names, forbidden.tolist(), strict=False)),
        dict(zip(names, alone.tolist(), strict=False)),
        plan.rank_sign * best if math.isfinite(best) else None,
    )


@njit(**PLAIN)
def _tally(blocked, rank, sign, forbidden, alone):
    """Count flags of (n, m) cells into (32,) arrays; how many cells are allowed and the least sign · rank."""
    allowed, best = 0, math.inf
    for i in range(blocked.shape[0]):
        for j in range(blocked.shape[1]):
            word = blocked[i, j]
            if word == 0:
                allowed += 1
                best = min(best, sign * rank[i, j]) if rank[i, j] == rank[i, j] else best
                continue
            single = (word & (word - np.uint32(1))) == 0
            bit = 0
            while word:
                if word & np.uint32(1):
                    forbidden[bit] += 1
                    alone[bit] += single
                word >>= np.uint32(1)
                bit += 1
    return allowed, best

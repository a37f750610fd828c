"""How much memory a sweep takes, and how to keep it within a budget."""

from __future__ import annotations

import os
from collections.abc import Iterator
from dataclasses import replace

from porkgrid.errors import RequestError
from porkgrid.survey.chains import memory_bytes
from porkgrid.survey.measures import BOTH
from porkgrid.survey.plan import Plan

# Peak of a process that has imported the engine and draws its charts, without any tile in hand (measured).
BASE_BYTES = 420e6
# Arrays of eight bytes a cell that a tile holds at its peak besides the measures it keeps (measured).
WORKING_ARRAYS = 45
LEAST_TILE_CELLS = 2**13  # below, starting a tile costs more than its cells


def memory_needed(plan: Plan, workers: int) -> float:
    """Bytes at the peak of a sweep with so many workers."""
    kept = sum(4.0 for name in plan.stored if plan.measures[name].dims == BOTH) + 4.0
    rows, columns = plan.chunks
    tiles = workers * rows * columns * (8.0 * WORKING_ARRAYS * (1 + plan.flybys) + kept)
    return BASE_BYTES + tiles + (memory_bytes(plan, workers * rows) if plan.flybys else 0.0)


def within(plan: Plan, workers: int, budget_bytes: float | None) -> tuple[Plan, int]:
    """The plan with tiles and the number of workers that keep to a budget; smaller tiles first, then fewer.

    RequestError, with steps that would fit, where nothing does.
    """
    if budget_bytes is None:
        return plan, workers
    for tiles, threads in _ways(plan, workers):
        if memory_needed(tiles, threads) <= budget_bytes:
            return tiles, threads
    least = memory_needed(tiles, 1)
    raise RequestError(
        f"{plan.scenario.path}: needs {least / 1e6:.0f} MB, and --memory allows {budget_bytes / 1e6:.0f}; "
        + _remedy(plan, least, budget_bytes)
    )


def workers_of(workers: int | None) -> int:
    """How many threads: as asked for, else one per core."""
    return workers or os.cpu_count() or 1


def _ways(plan: Plan, workers: int) -> Iterator[tuple[Plan, int]]:
    cells = plan.tile_cells
    while True:
        yield replace(plan, tile_cells=cells), workers
        if cells <= LEAST_TILE_CELLS:
            break
        cells //= 2
    for fewer in range(workers - 1, 0, -1):
        yield replace(plan, tile_cells=cells), fewer


def _remedy(plan: Plan, least: float, budget_bytes: float) -> str:
    room = budget_bytes - BASE_BYTES
    if not plan.flybys or room <= 0.05 * least:
        return f"give {least * 1.05 / 1e6:.0f}MB or more"
    factor = ((least - BASE_BYTES) / room) ** 0.5  # legs are pairs of dates
    steps = ", ".join(f"{1.05 * factor * each.step_days:.2g}" for each in plan.scenario.encounters)
    return f"give {least * 1.05 / 1e6:.0f}MB or more, or its encounters steps of {steps} days"

"""What a sweep would cost on this machine, from one tile of it really swept."""

from __future__ import annotations

import os
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path

from porkgrid.survey.chains import memory_bytes, prepare
from porkgrid.survey.measures import BOTH
from porkgrid.survey.plan import Plan
from porkgrid.survey.store import create_store, open_arrays, write_tile
from porkgrid.survey.sweep import warm_up
from porkgrid.survey.tiles import compute_tile

# Peak of a process that has imported the engine and draws its charts, without any tile in hand (measured).
BASE_BYTES = 420e6
# Arrays of eight bytes a cell that a tile holds at its peak besides the measures it keeps (measured).
WORKING_ARRAYS = 45


@dataclass(frozen=True)
class Cost:
    """Prediction for a sweep."""

    cells: int
    lambert_solves: int
    tiles: int
    workers: int
    seconds: float
    memory_bytes: float
    disk_bytes: float


def predict(plan: Plan, workers: int | None = None) -> Cost:
    """Sweep the middle tile into a temporary folder and scale up."""
    threads = min(workers or os.cpu_count() or 1, len(plan.tiles))
    warm_up(plan)
    prepared = _seconds_to_prepare(plan)
    tile = plan.tiles[len(plan.tiles) // 2]
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        create_store(folder, plan, "calibration")
        bare = _bytes_in(folder)
        started = time.perf_counter()
        values, _ = compute_tile(plan, tile)
        write_tile(open_arrays(folder), tile, values)
        seconds = time.perf_counter() - started
        disk = _bytes_in(folder) - bare
    n, m = plan.shape
    scale = n * m / tile.cells
    kept = sum(4.0 for name in plan.stored if plan.measures[name].dims == BOTH) + 4.0
    return Cost(
        cells=n * m,
        lambert_solves=plan.lambert_solves,
        tiles=len(plan.tiles),
        workers=threads,
        seconds=prepared + seconds * scale / threads,
        memory_bytes=BASE_BYTES
        + threads * plan.tiles[0].cells * (8.0 * WORKING_ARRAYS * (1 + plan.flybys) + kept)
        + (memory_bytes(plan, threads * plan.chunks[0]) if plan.flybys else 0.0),
        disk_bytes=bare + disk * scale,
    )


def _seconds_to_prepare(plan: Plan) -> float:
    """What the legs after the first flyby take, which all tiles share."""
    if not plan.flybys:
        return 0.0
    started = time.perf_counter()
    prepare(plan)
    return time.perf_counter() - started


def _bytes_in(folder: Path) -> int:
    return sum(path.stat().st_size for path in folder.rglob("*") if path.is_file())

"""What a sweep would cost on this machine, from one tile of it really swept."""

from __future__ import annotations

import tempfile
import time
from dataclasses import dataclass
from pathlib import Path

from porkgrid.survey.budget import memory_needed, workers_of
from porkgrid.survey.chains import prepare
from porkgrid.survey.plan import Plan
from porkgrid.survey.store import create_store, write_tile
from porkgrid.survey.sweep import warm_up
from porkgrid.survey.tiles import compute_tile


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
    threads = min(workers_of(workers), len(plan.tiles))
    warm_up(plan)
    prepared = _seconds_to_prepare(plan)
    tile = plan.tiles[len(plan.tiles) // 2]
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        create_store(folder, plan, "calibration")
        bare = _bytes_in(folder)
        started = time.perf_counter()
        values, _ = compute_tile(plan, tile)
        write_tile(folder, plan, tile, values)
        seconds = time.perf_counter() - started
        disk = _bytes_in(folder) - bare
    n, m = plan.shape
    scale = n * m / tile.cells
    return Cost(
        cells=n * m,
        lambert_solves=plan.lambert_solves,
        tiles=len(plan.tiles),
        workers=threads,
        seconds=prepared + seconds * scale / threads,
        memory_bytes=memory_needed(plan, threads),
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

"""A sweep: every tile of a plan computed and written, then ranked. What is done already is not done again."""

from __future__ import annotations

import errno
import os
import platform
import threading
import time
from collections.abc import Callable, Iterator
from concurrent.futures import FIRST_COMPLETED, Future, ThreadPoolExecutor, wait
from contextlib import contextmanager
from dataclasses import dataclass
from datetime import UTC, datetime
from importlib.metadata import version
from pathlib import Path
from typing import Any

from porkgrid.errors import RunError
from porkgrid.scenario import Scenario
from porkgrid.sky.kernel import sha256_of
from porkgrid.survey import folder as folders
from porkgrid.survey.candidates import pick, tabulate
from porkgrid.survey.ledger import enter, open_ledger, read_ledger, totals
from porkgrid.survey.plan import Plan, Tile, make_plan
from porkgrid.survey.store import CAUTION, create_store, open_arrays, write_tile
from porkgrid.survey.surveys import Survey, open_survey
from porkgrid.survey.tiles import TileSums, compute_tile


@dataclass(frozen=True)
class Progress:
    """How far a sweep has come."""

    tiles_done: int
    tiles: int
    cells_done: int
    cells: int
    best: float | None  # of the rank measure, so far


def sweep(
    scenario: Scenario,
    out: str | Path | None = None,
    workers: int | None = None,
    *,
    fresh: bool = False,
    report: Callable[[Progress], None] | None = None,
) -> Survey:
    """Sweep a scenario's grid and leave a survey folder.

    A sweep that was interrupted goes on with the tiles that are missing; a finished one is only ranked
    again. `out` is the folder (by default surveys/<slug>), `workers` the number of threads (by default one
    per core), `fresh` starts anew, `report` is called after every tile.

    Raises RequestError for a request that cannot be met (a date outside the kernel, a folder that holds
    something else), RunError where writing fails, KeyboardInterrupt after the tiles in hand are saved.
    """
    plan = make_plan(scenario)
    folder = folders.folder_of(scenario, out)
    with _disk_faults(folder):
        begun = folders.claim(folder, scenario, fresh)
        provenance = folders.read_provenance(folder) if begun else _begin(folder, plan)
        if provenance["state"] != folders.COMPLETE:
            with ThreadPoolExecutor(1) as aside:
                kernels = aside.submit(_kernels, plan)  # reads the whole kernel: the tiles need not wait
                _fill(folder, plan, workers or os.cpu_count() or 1, report)
                provenance["kernels"] = kernels.result()
        _finish(folder, plan, provenance)
    return open_survey(folder)


def _kernels(plan: Plan) -> list[dict[str, str]]:
    return [
        {"name": name, "file": path.name, "sha256": sha256_of(path)} for name, path in plan.ephemeris.files
    ]


def _begin(folder: Path, plan: Plan) -> dict[str, Any]:
    create_store(folder, plan, version("porkgrid"))
    scenario = plan.scenario
    provenance = folders.read_provenance(folder) | {
        "route": plan.route,
        "scenario_folder": str(scenario.path.absolute().parent),
        "state": folders.RUNNING,
        "versions": {
            name: version(name) for name in ("porkgrid", "numpy", "numba", "jplephem", "zarr", "xarray")
        }
        | {"python": platform.python_version()},
        "bodies": {table.body.name: table.body.motion for table in plan.tables},
        "grid": {"departure_dates": plan.shape[0], "arrival_dates": plan.shape[1]},
        "conventions": "km, km/s, deg; ICRF axes; epochs TDB; patched conics about the Sun as a point mass",
        "caution": CAUTION,
    }
    folders.write_provenance(folder, provenance)
    return provenance


def _fill(folder: Path, plan: Plan, workers: int, report: Callable[[Progress], None] | None) -> None:
    """Compute and write the tiles that are missing, on a pool of threads."""
    arrays = open_arrays(folder)
    entries = read_ledger(folder)
    missing = [tile for tile in plan.tiles if tile.number not in entries]
    if plan.flybys and missing:
        _ = plan.search  # made once, before the threads share it
    stop = threading.Event()
    lock = threading.Lock()
    with open_ledger(folder) as ledger:

        def work(tile: Tile) -> TileSums | None:
            if stop.is_set():
                return None
            values, sums = compute_tile(plan, tile)
            write_tile(arrays, tile, values)
            with lock:
                enter(ledger, sums)
            return sums

        with ThreadPoolExecutor(workers) as pool:
            try:
                for sums in _as_done([pool.submit(work, tile) for tile in missing]):
                    if sums is not None:
                        entries[sums.tile] = sums
                    if report:
                        report(_progress(plan, entries))
            except BaseException:
                stop.set()  # the tiles in hand are finished and entered before the pool closes
                raise


def _as_done(futures: list[Future[TileSums | None]]) -> Iterator[TileSums | None]:
    pending = set(futures)
    while pending:
        done, pending = wait(pending, return_when=FIRST_COMPLETED)
        for future in done:
            yield future.result()


def _progress(plan: Plan, entries: dict[int, TileSums]) -> Progress:
    so_far = totals(entries.values(), plan.rank_sign)
    return Progress(len(entries), len(plan.tiles), so_far.cells, plan.shape[0] * plan.shape[1], so_far.best)


def _finish(folder: Path, plan: Plan, provenance: dict[str, Any]) -> None:
    """Rank, and write the totals: the survey is complete when this returns."""
    rank = plan.scenario.rank
    table = tabulate(plan, pick(folder, plan, plan.rank_by, plan.rank_sign, rank.keep, rank.apart_days))
    folders.write_whole(folder / folders.CANDIDATES, table.to_csv(index=False, float_format="%.13g"))
    sums = totals(read_ledger(folder).values(), plan.rank_sign)
    if provenance["state"] == folders.COMPLETE:
        return
    started = datetime.fromisoformat(provenance["started"])
    seconds = (datetime.now(UTC) - started).total_seconds()
    provenance |= {
        "state": folders.COMPLETE,
        "finished": datetime.now(UTC).isoformat(timespec="seconds"),
        "seconds": seconds,
        "cells": sums.cells,
        "cells_allowed": sums.allowed,
        "lambert_solves": plan.lambert_solves,
        "cells_per_second": round(sums.cells / max(seconds, 1e-9)),
        "cells_forbidden_by": sums.forbidden,
        "cells_forbidden_by_it_alone": sums.alone,
    }
    folders.write_provenance(folder, provenance)


@contextmanager
def _disk_faults(folder: Path) -> Iterator[None]:
    """Turn what the file system refuses into a message."""
    try:
        yield
    except OSError as error:
        if error.errno == errno.ENOSPC:
            raise RunError(
                f"{folder}: the disk is full; free some space and give the same command again: "
                "the tiles already written are kept"
            ) from error
        if error.errno in (errno.EACCES, errno.EPERM, errno.EROFS):
            raise RunError(
                f"{folder}: no permission to write there; give another folder with --out"
            ) from error
        raise RunError(f"{folder}: {error.strerror or error}") from error


def warm_up(plan: Plan) -> float:
    """Fly one cell of every leg option, so that kernels are compiled; the seconds it took."""
    started = time.perf_counter()
    compute_tile(plan, Tile(-1, slice(0, 1), slice(0, 1)))
    return time.perf_counter() - started

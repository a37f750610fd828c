"""A sweep: every tile of a plan computed and written, then ranked. What is done already is not done again."""

from __future__ import annotations

import errno
import platform
import time
from collections.abc import Callable, Generator, Iterator
from concurrent.futures import ThreadPoolExecutor
from contextlib import ExitStack, closing, contextmanager
from dataclasses import replace
from datetime import UTC, datetime
from importlib.metadata import version
from pathlib import Path
from typing import Any

from porkgrid.errors import RequestError, RunError
from porkgrid.scenario import Scenario
from porkgrid.sky.kernel import sha256_of
from porkgrid.survey import folder as folders
from porkgrid.survey.budget import within, workers_of
from porkgrid.survey.candidates import pick, tabulate
from porkgrid.survey.chunks import remove_parts
from porkgrid.survey.cluster import connected, on_cluster
from porkgrid.survey.ledger import Ledger, added, read_ledger, totals
from porkgrid.survey.lock import held
from porkgrid.survey.logbook import log, logged
from porkgrid.survey.plan import Plan, Tile, make_plan
from porkgrid.survey.pool import in_threads
from porkgrid.survey.progress import Pace, Progress
from porkgrid.survey.refine import refine, refined_table
from porkgrid.survey.refinedtable import with_refined
from porkgrid.survey.room import refuse_full_disk
from porkgrid.survey.store import CAUTION, STORE, create_store, write_tile
from porkgrid.survey.surveys import Survey, open_survey
from porkgrid.survey.tiles import TileSums, compute_tile
from porkgrid.survey.verify import damaged_tiles

# What the last bits of a number depend on: a sweep is not begun with one and finished with another.
_MAKERS = ("porkgrid", "numpy", "numba")


def sweep(
    scenario: Scenario,
    out: str | Path | None = None,
    workers: int | None = None,
    *,
    fresh: bool = False,
    memory_bytes: float | None = None,
    cluster: str | None = None,
    flown: dict | None = None,
    report: Callable[[Progress], None] | None = None,
) -> Survey:
    """Sweep a scenario's grid and leave a survey folder.

    A sweep that was interrupted goes on with the tiles that are missing or damaged; so does a finished one,
    which is then ranked again. `out` is the folder (by default surveys/<slug>), `workers` the number of
    threads (by default one per core), `fresh` starts anew, `memory_bytes` bounds the memory by smaller tiles
    and fewer threads, `cluster` gives tiles to the workers of a dask scheduler at that address ("local"
    starts one), `flown` holds legs that sweeps share, `report` is called after every tile.

    Raises RequestError for a request that cannot be met (a date outside the kernel, a folder that holds
    something else or that another process sweeps into), RunError where writing fails, KeyboardInterrupt after
    the tiles in hand are saved.
    """
    plan, threads = within(make_plan(scenario), workers_of(workers), memory_bytes)
    plan = plan if flown is None else replace(plan, flown=flown)
    folder = folders.folder_of(scenario, out)
    folders.refuse_foreign(folder)
    with _disk_faults(folder), held(folder) as dead, logged(folder):
        if dead:
            log.info("the sweep of %s ended without a word; going on from what it wrote", dead)
        begun = folders.claim(folder, scenario, fresh)
        if not begun:
            refuse_full_disk(folder, plan)
        provenance = folders.read_provenance(folder) if begun else _begin(folder, plan)
        plan = replace(plan, **provenance["tiles"])
        entries = read_ledger(folder)
        missing = _missing(folder, plan, entries)
        if missing and begun:
            _same_makers(folder, plan, provenance)
        with ThreadPoolExecutor(1) as aside:
            # reads the whole kernel: the tiles need not wait
            noted = aside.submit(_note_kernels, folder, plan, provenance)
            if missing:
                _fill(folder, plan, entries, missing, threads, cluster, report)
                if begun or cluster is not None:
                    remove_parts(folder / STORE)
            noted.result()
        _finish(folder, plan, provenance)
    return open_survey(folder)


def _note_kernels(folder: Path, plan: Plan, provenance: dict[str, Any]) -> None:
    """Add the kernel files to the provenance, unless they are there."""
    if "kernels" not in provenance:
        provenance["kernels"] = _kernels(plan)
        folders.write_provenance(folder, provenance)


def _kernels(plan: Plan) -> list[dict[str, str]]:
    try:
        return [
            {"name": name, "file": path.name, "sha256": sha256_of(path)}
            for name, path in plan.ephemeris.files
        ]
    except OSError as error:
        raise RunError(
            f"{error.filename}: the kernel was there when the sweep began, and now: {error.strerror}; put it "
            "back and give the same command again: the tiles already written are kept"
        ) from error


def _same_makers(folder: Path, plan: Plan, provenance: dict[str, Any]) -> None:
    """Refuse to go on with other versions, or another ephemeris, than those that the sweep began with."""
    begun_with = provenance.get("versions", {})
    other = [
        f"{name} {begun_with.get(name, '(unknown)')} (this is {version(name)})"
        for name in _MAKERS
        if begun_with.get(name) != version(name)
    ]
    if "kernels" in provenance and (now := _kernels(plan)) != provenance["kernels"]:
        told = {each["name"]: each["sha256"] for each in provenance["kernels"]}
        other += [f"another {each['name']}" for each in now if told.get(each["name"]) != each["sha256"]]
    if other:
        raise RequestError(
            f"{folder}: was begun with {', '.join(other)}; go on with that, or start anew with --fresh"
        )


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
        "tiles": {"tile_cells": plan.tile_cells, "tile_columns": plan.tile_columns},
        "stored": list(plan.stored),
        "grid": {"departure_dates": plan.shape[0], "arrival_dates": plan.shape[1]},
        "conventions": "km, km/s, deg; ICRF axes; epochs TDB; patched conics about the Sun as a point mass",
        "caution": CAUTION,
    }
    folders.write_provenance(folder, provenance)
    return provenance


def _missing(folder: Path, plan: Plan, entries: dict[int, TileSums]) -> list[Tile]:
    """The tiles that are not on disk, or damaged there."""
    damaged = set(damaged_tiles(folder, plan, entries))
    if damaged:
        log.warning(
            "%s: %d of %d tiles are damaged on disk and will be computed again",
            folder, len(damaged), len(entries),
        )  # fmt: skip
    return [tile for tile in plan.tiles if tile.number not in entries or tile.number in damaged]


def _fill(
    folder: Path,
    plan: Plan,
    entries: dict[int, TileSums],
    missing: list[Tile],
    workers: int,
    cluster: str | None,
    report: Callable[[Progress], None] | None,
) -> None:
    """Compute and write tiles, on a pool of threads or on a cluster."""
    place = f"{workers} workers" if cluster is None else f"cluster {cluster}"
    log.info("%d of %d tiles to compute, %s", len(missing), len(plan.tiles), place)
    again = {tile.number for tile in missing}
    there = [sums for number, sums in entries.items() if number not in again]
    so_far, done = totals(there, plan.rank_sign), len(there)
    pace = Pace(plan, so_far)
    with ExitStack() as stack:
        ledger = stack.enter_context(Ledger(folder))
        if cluster is None:
            swept = _on_threads(folder, plan, missing, workers, ledger)
        else:
            client = stack.enter_context(connected(cluster))
            swept = on_cluster(client, folder, plan, missing, ledger.enter)
        for sums in stack.enter_context(closing(swept)):
            so_far, done = added(so_far, sums, plan.rank_sign), done + 1
            progress = pace.progress(done, so_far)
            if report:
                report(progress)


def _on_threads(
    folder: Path, plan: Plan, missing: list[Tile], workers: int, ledger: Ledger
) -> Generator[TileSums]:
    if plan.flybys:
        _ = plan.search  # made once, before the threads share it

    def work(tile: Tile) -> TileSums:
        values, sums = compute_tile(plan, tile)
        sums = replace(sums, sizes=tuple(write_tile(folder, plan, tile, values)))
        ledger.enter(sums)
        return sums

    return in_threads(work, missing, workers)


def _finish(folder: Path, plan: Plan, provenance: dict[str, Any]) -> None:
    """Rank, and write the totals: the survey is complete when this returns."""
    rank = plan.scenario.rank
    picked = pick(folder, plan, plan.rank_by, plan.rank_sign, rank.keep, rank.apart_days)
    refined = refine(plan, picked)
    table = with_refined(plan, tabulate(plan, picked), refined)
    for name, rows in ((folders.CANDIDATES, table), (folders.REFINED, refined_table(plan, refined))):
        folders.write_whole(folder / name, rows.to_csv(index=False, float_format="%.13g"))
    sums = totals(read_ledger(folder).values(), plan.rank_sign)
    if provenance["state"] == folders.COMPLETE:
        return
    log.info("complete: %d of %d cells allowed, %d candidates", sums.allowed, sums.cells, len(table))
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

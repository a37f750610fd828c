"""Tiles on the workers of a dask cluster, over a folder that all of them share (extra `cluster`).

A worker reads the scenario from the survey folder, computes a tile and writes its chunks there, as a thread
of the laptop would: the same bits. The ledger stays with the process that sweeps. A tile of a worker that
dies is given to another.
"""

from __future__ import annotations

import logging
from collections.abc import Callable, Generator, Iterator, Sequence
from contextlib import contextmanager, suppress
from dataclasses import asdict, replace
from functools import lru_cache
from importlib.metadata import version
from itertools import islice
from pathlib import Path
from typing import TYPE_CHECKING, Any

from porkgrid.errors import RequestError, RunError
from porkgrid.survey.plan import Plan, Tile
from porkgrid.survey.tiles import TileSums, compute_tile

if TYPE_CHECKING:
    from distributed import Client

ANSWER_SECONDS = 15.0  # to wait for a scheduler
_TRIES = 5  # of a tile whose workers die under it
_LAST_SECONDS = 60.0  # for tiles in hand when a sweep is interrupted


@contextmanager
def connected(address: str) -> Iterator[Client]:
    """A client of the scheduler at `address`, or of one with a worker per core started here ("local").

    RequestError where dask is not installed, no scheduler answers, or it has no workers.
    """
    try:
        from distributed import Client, LocalCluster
    except ImportError:
        raise RequestError("--cluster: needs dask; install it with pip install 'porkgrid[cluster]'") from None
    if address == "local":
        with (
            LocalCluster(threads_per_worker=1, dashboard_address=None, silence_logs=logging.ERROR) as cluster,
            Client(cluster) as client,
        ):
            yield client
        return
    try:
        client = Client(address, timeout=ANSWER_SECONDS)
    except (OSError, TimeoutError, ValueError) as error:
        raise RequestError(
            f"--cluster {address}: no scheduler answers there ({str(error).splitlines()[0]}); start one with "
            "`dask scheduler`, workers with `dask worker ADDRESS`, or give --cluster local"
        ) from None
    with client:
        if not client.scheduler_info()["workers"]:
            raise RequestError(
                f"--cluster {address}: the scheduler has no workers; start some with `dask worker {address}`"
            )
        yield client


def on_cluster(
    client: Client, folder: Path, plan: Plan, tiles: Sequence[Tile], enter: Callable[[TileSums], None]
) -> Generator[TileSums]:
    """Have workers compute and write tiles; enter each in the ledger and yield it as it is done."""
    from distributed import as_completed

    order = _order(folder, plan)
    waiting = iter(tiles)
    threads = sum(client.nthreads().values())

    def submit(tile: Tile) -> Any:
        return client.submit(sweep_tile, order, tile.number, pure=False, retries=_TRIES)

    in_hand = as_completed([submit(tile) for tile in islice(waiting, 2 * threads + 2)])
    try:
        for future in in_hand:
            sums = _result(future)
            enter(sums)
            for tile in islice(waiting, 1):
                in_hand.add(submit(tile))
            yield sums
    except BaseException:
        _save_those_in_hand(client, list(in_hand.futures), enter)
        raise


def sweep_tile(order: dict[str, Any], number: int) -> dict[str, Any]:
    """On a worker: compute tile `number` of the survey that `order` names and write it; its sums."""
    from porkgrid.survey.store import write_tile

    plan = _plan(order["folder"], order["beside"], order["fingerprint"], *order["tiles"].values())
    ours = {name: version(name) for name in order["versions"]}
    if ours != order["versions"]:
        raise RequestError(f"a worker has {ours}, and the sweep was begun with {order['versions']}")
    tile = plan.tiles[number]
    values, sums = compute_tile(plan, tile)
    return asdict(replace(sums, sizes=tuple(write_tile(Path(order["folder"]), plan, tile, values))))


@lru_cache(maxsize=2)
def _plan(folder: str, beside: str, fingerprint: str, tile_cells: int, tile_columns: int) -> Plan:
    from porkgrid.survey import folder as folders
    from porkgrid.survey.admit import load_scenario
    from porkgrid.survey.plan import make_plan

    path = Path(folder) / folders.SCENARIO
    if not path.exists():
        raise RequestError(f"{folder}: a worker does not see it; the survey folder must be on a shared disk")
    scenario = load_scenario(path, Path(beside))
    if folders.fingerprint(scenario) != fingerprint:
        raise RequestError(f"{folder}: a worker reads another scenario there, or other tables beside it")
    return replace(make_plan(scenario), tile_cells=tile_cells, tile_columns=tile_columns)


def _order(folder: Path, plan: Plan) -> dict[str, Any]:
    from porkgrid.survey.folder import fingerprint

    return {
        "folder": str(folder.absolute()),
        "beside": str(plan.scenario.path.absolute().parent),
        "fingerprint": fingerprint(plan.scenario),
        "tiles": {"tile_cells": plan.tile_cells, "tile_columns": plan.tile_columns},
        "versions": {name: version(name) for name in ("porkgrid", "numpy", "numba")},
    }


def _result(future: Any) -> TileSums:
    from distributed.scheduler import KilledWorker

    try:
        told = future.result()
    except KilledWorker as error:
        last = error.last_worker
        raise RunError(f"--cluster: {_TRIES} workers died over one tile, the last at {last}") from None
    return TileSums(**{**told, "sizes": tuple(told["sizes"])})


def _save_those_in_hand(client: Client, futures: list[Any], enter: Callable[[TileSums], None]) -> None:
    """Wait a while for tiles that workers are at and enter them; the others are left for another time."""
    from distributed import wait

    with suppress(TimeoutError):
        wait(futures, timeout=_LAST_SECONDS)
    for future in futures:
        if future.status == "finished":
            enter(_result(future))
    client.cancel(futures)

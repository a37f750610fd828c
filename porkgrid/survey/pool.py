"""Tiles on threads of this process: kernels leave Python alone, so that threads are enough."""

from __future__ import annotations

from collections.abc import Callable, Generator, Sequence
from concurrent.futures import FIRST_COMPLETED, ThreadPoolExecutor, wait
from itertools import islice

from porkgrid.survey.plan import Tile
from porkgrid.survey.tiles import TileSums


def in_threads(work: Callable[[Tile], TileSums], tiles: Sequence[Tile], workers: int) -> Generator[TileSums]:
    """Yield what `work` makes of every tile, as they are done.

    Few tiles are in flight: stopping is a matter of those in hand, which are finished whatever happens.
    """
    waiting = iter(tiles)
    pool = ThreadPoolExecutor(workers)
    try:
        pending = {pool.submit(work, tile) for tile in islice(waiting, workers + 1)}
        while pending:
            done, pending = wait(pending, return_when=FIRST_COMPLETED)
            pending |= {pool.submit(work, tile) for tile in islice(waiting, len(done))}
            for future in done:
                yield future.result()
    finally:
        pool.shutdown(wait=True, cancel_futures=True)

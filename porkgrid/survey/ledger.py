"""The ledger of a sweep: one line per tile that has been written, so that a killed sweep can go on.

Lines are flushed as they come, which a killed process survives. Now and then the disk is asked to keep all
that was written, and a mark says how many tiles that was: after a power cut the tiles behind the last mark
are the ones to be doubted.
"""

from __future__ import annotations

import json
import os
import threading
import time
from collections.abc import Iterable
from contextlib import suppress
from dataclasses import asdict
from pathlib import Path
from typing import Any

from porkgrid.survey.tiles import TileSums

LEDGER = "tiles.jsonl"
KEEP_SECONDS = 20.0  # between two times that the disk is asked to keep what has been written
_MARK = "kept"


class Ledger:
    """The ledger open for writing, by any number of threads; a line torn by a crash is cut off first."""

    def __init__(self, folder: Path) -> None:
        path = folder / LEDGER
        if path.exists():
            whole = path.read_bytes().rpartition(b"\n")[0]
            with path.open("r+b") as file:
                file.truncate(len(whole) + 1 if whole else 0)
        self._tiles = sum(_entry(line) is not None for line in _lines(folder))
        self._file = path.open("ab")
        self._lock = threading.Lock()
        self._last_kept = time.monotonic()
        self._keeper: threading.Thread | None = None

    def __enter__(self) -> Ledger:
        return self

    def __exit__(self, *_: object) -> None:
        if self._keeper is not None:
            self._keeper.join()
        self._file.close()

    def enter(self, sums: TileSums) -> None:
        """Add a tile whose chunks have been written; now and then have the disk keep them."""
        with self._lock:
            self._append(asdict(sums))
            self._tiles += 1
            busy = self._keeper is not None and self._keeper.is_alive()
            if not busy and time.monotonic() - self._last_kept > KEEP_SECONDS:
                self._last_kept = time.monotonic()
                self._keeper = threading.Thread(target=self._keep, args=(self._tiles,))
                self._keeper.start()

    def _keep(self, tiles: int) -> None:
        os.sync()
        with self._lock, suppress(OSError):  # a full disk: without the mark these tiles stay in doubt
            self._append({_MARK: tiles})

    def _append(self, line: dict[str, Any]) -> None:
        self._file.write(json.dumps(line).encode() + b"\n")
        self._file.flush()


def read_ledger(folder: Path) -> dict[int, TileSums]:
    """The tiles that have been written, by number. A line that a crash has torn or blotted does not count."""
    return {sums.tile: sums for sums in map(_entry, _lines(folder)) if sums is not None}


def tiles_in_doubt(folder: Path) -> list[int]:
    """Numbers of the tiles behind the last mark, in the order in which they were entered."""
    tiles: list[int] = []
    kept = 0
    for line in _lines(folder):
        if isinstance(line.get(_MARK), int):
            kept = line[_MARK]
        elif (sums := _entry(line)) is not None:
            tiles.append(sums.tile)
    return tiles[kept:]


def _lines(folder: Path) -> Iterable[dict[str, Any]]:
    path = folder / LEDGER
    if not path.exists():
        return
    for line in path.read_bytes().splitlines(keepends=True):
        try:
            read = json.loads(line) if line.endswith(b"\n") else None
        except ValueError:
            continue
        if isinstance(read, dict):
            yield read


def _entry(line: dict[str, Any]) -> TileSums | None:
    """The tile of a line; None for a mark, or where a blot has left something else than a tile."""
    try:
        sums = TileSums(**{**line, "sizes": tuple(line["sizes"])})
        flags = (*sums.forbidden.values(), *sums.alone.values())
        counts = (sums.tile, sums.cells, sums.allowed, *sums.sizes, *flags)
    except (TypeError, KeyError, AttributeError):
        return None
    sound = all(isinstance(each, int) and each >= 0 for each in counts)
    return sums if sound and isinstance(sums.best, float | int | None) else None


def added(one: TileSums, other: TileSums, rank_sign: float) -> TileSums:
    """The sums of two tiles, or of many and one, as those of one tile with number −1."""
    both = [each.best for each in (one, other) if each.best is not None]
    return TileSums(
        -1,
        one.cells + other.cells,
        one.allowed + other.allowed,
        _sum(one.forbidden, other.forbidden),
        _sum(one.alone, other.alone),
        min(both, key=lambda best: rank_sign * best) if both else None,
    )


def totals(entries: Iterable[TileSums], rank_sign: float) -> TileSums:
    """The sums over all tiles, as those of one tile with number −1."""
    total = TileSums(-1, 0, 0, {}, {}, None)
    for sums in entries:
        total = added(total, sums, rank_sign)
    return total


def _sum(one: dict[str, int], other: dict[str, int]) -> dict[str, int]:
    return {name: one.get(name, 0) + other.get(name, 0) for name in one | other}

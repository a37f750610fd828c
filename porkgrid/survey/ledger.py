"""The ledger of a sweep: one line per tile that has been written, so that a killed sweep can go on.

Lines are flushed as they come, which a killed process survives. Now and then the disk is asked to keep all
that was written, and a mark says how many lines that was: after a power cut the tiles of the lines behind are
the ones to be doubted.
"""

from __future__ import annotations

import json
import os
import threading
import time
from collections import Counter
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
        whole = path.read_bytes().rpartition(b"\n")[0] if path.exists() else b""
        self._lines = whole.count(b"\n") + 1 if whole else 0
        if path.exists():
            os.truncate(path, len(whole) + 1 if whole else 0)
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
            busy = self._keeper is not None and self._keeper.is_alive()
            if not busy and time.monotonic() - self._last_kept > KEEP_SECONDS:
                self._last_kept = time.monotonic()
                self._keeper = threading.Thread(target=self._keep, args=(self._lines,))
                self._keeper.start()

    def _keep(self, lines: int) -> None:
        os.sync()
        with self._lock, suppress(OSError):  # a full disk: without the mark these tiles stay in doubt
            self._append({_MARK: lines})

    def _append(self, line: dict[str, Any]) -> None:
        self._file.write(json.dumps(line).encode() + b"\n")
        self._file.flush()
        self._lines += 1


def read_ledger(folder: Path) -> dict[int, TileSums]:
    """The tiles that have been written, by number. A line that a crash has torn or blotted does not count."""
    return {sums.tile: sums for sums in map(_entry, _lines(folder)) if sums is not None}


def tiles_in_doubt(folder: Path) -> list[int]:
    """Numbers of the tiles in the lines behind the last mark's, in the order in which they were entered."""
    lines = _lines(folder)
    marks = (_read(line).get(_MARK) for line in lines if _MARK in line)
    kept = max((mark for mark in marks if isinstance(mark, int)), default=0)
    return [sums.tile for sums in map(_entry, lines[kept:]) if sums is not None]


def _lines(folder: Path) -> list[str]:
    """The whole lines, in order."""
    path = folder / LEDGER
    text = path.read_bytes().decode("latin-1") if path.exists() else ""  # blots too are text in this
    return text.split("\n")[:-1]


def _read(line: str) -> dict[str, Any]:
    """What a line holds; nothing where it is blotted."""
    try:
        held = json.loads(line)
    except ValueError:
        return {}
    return held if isinstance(held, dict) else {}


def _entry(line: str) -> TileSums | None:
    """The tile of a line; None for a mark, or where a blot has left something else than a tile."""
    held = _read(line)
    try:
        sums = TileSums(**{**held, "sizes": tuple(held["sizes"])})
        counts = (sums.tile, sums.cells, sums.allowed, *sums.sizes)
        flags = (*sums.forbidden.values(), *sums.alone.values())
    except (TypeError, KeyError, AttributeError):
        return None
    sound = {int}.issuperset(map(type, counts + flags)) and min(counts + flags) >= 0
    return sums if sound and isinstance(sums.best, float | int | None) else None


def added(one: TileSums, other: TileSums, rank_sign: float) -> TileSums:
    """The sums of two tiles, or of many and one, as those of one tile with number −1."""
    return totals((one, other), rank_sign)


def totals(entries: Iterable[TileSums], rank_sign: float) -> TileSums:
    """The sums over all tiles, as those of one tile with number −1."""
    cells = allowed = 0
    forbidden: Counter[str] = Counter()
    alone: Counter[str] = Counter()
    best: float | None = None
    for sums in entries:
        cells, allowed = cells + sums.cells, allowed + sums.allowed
        forbidden.update(sums.forbidden)
        alone.update(sums.alone)
        if best is None or (sums.best is not None and rank_sign * sums.best < rank_sign * best):
            best = sums.best
    return TileSums(-1, cells, allowed, dict(forbidden), dict(alone), best)

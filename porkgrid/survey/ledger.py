"""The ledger of a sweep: one line per tile that is safely on disk, so that a killed sweep can go on."""

from __future__ import annotations

import json
import os
from collections.abc import Iterable
from dataclasses import asdict
from pathlib import Path
from typing import IO

from porkgrid.survey.tiles import TileSums

LEDGER = "tiles.jsonl"


def open_ledger(folder: Path) -> IO[bytes]:
    """The ledger, ready for appending; a line torn by a crash is cut off first."""
    path = folder / LEDGER
    if path.exists():
        whole = path.read_bytes().rpartition(b"\n")[0]
        with path.open("r+b") as file:
            file.truncate(len(whole) + 1 if whole else 0)
    return path.open("ab")


def enter(ledger: IO[bytes], sums: TileSums) -> None:
    """Add a tile whose chunks have been written; the line is on disk when this returns."""
    ledger.write(json.dumps(asdict(sums)).encode() + b"\n")
    ledger.flush()
    os.fsync(ledger.fileno())


def read_ledger(folder: Path) -> dict[int, TileSums]:
    """The tiles that are on disk, by number. A line that a crash has torn or blotted does not count."""
    path = folder / LEDGER
    if not path.exists():
        return {}
    entries = {}
    for line in path.read_bytes().splitlines(keepends=True):
        sums = _entry(line) if line.endswith(b"\n") else None
        if sums is not None:
            entries[sums.tile] = sums
    return entries


def _entry(line: bytes) -> TileSums | None:
    try:
        return TileSums(**json.loads(line))
    except (ValueError, TypeError):
        return None


def totals(entries: Iterable[TileSums], rank_sign: float) -> TileSums:
    """The sums over all tiles, as those of one tile with number −1."""
    cells = allowed = 0
    forbidden: dict[str, int] = {}
    alone: dict[str, int] = {}
    best: float | None = None
    for sums in entries:
        cells, allowed = cells + sums.cells, allowed + sums.allowed
        for name in sums.forbidden:
            forbidden[name] = forbidden.get(name, 0) + sums.forbidden[name]
            alone[name] = alone.get(name, 0) + sums.alone[name]
        if sums.best is not None and (best is None or rank_sign * sums.best < rank_sign * best):
            best = sums.best
    return TileSums(-1, cells, allowed, forbidden, alone, best)

"""Whether the tiles that the ledger names are on disk as they were written."""

from __future__ import annotations

from collections.abc import Mapping
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

from porkgrid.survey.chunks import is_whole, size_of
from porkgrid.survey.ledger import tiles_in_doubt
from porkgrid.survey.plan import Plan
from porkgrid.survey.store import STORE, chunk_of, tiled
from porkgrid.survey.tiles import TileSums

# Bytes that are read and checked beside the tiles in doubt, newest first; of older tiles only the sizes are.
# A second or so of reading. What goes wrong later is found by the checksum when it is read.
READ_BYTES = 1_000_000_000


def damaged_tiles(folder: Path, plan: Plan, entries: Mapping[int, TileSums]) -> list[int]:
    """Numbers of the tiles of which a chunk is missing, cut short or changed."""
    names = tiled(plan)
    suspects = _to_be_read(folder, entries)

    def damaged(number: int) -> bool:
        place, sizes = chunk_of(plan, plan.tiles[number]), entries[number].sizes
        arrays = [f"{folder}/{STORE}/{name}" for name in names]
        if [size_of(array, place) for array in arrays] != list(sizes):
            return True
        return number in suspects and not all(is_whole(array, place) for array in arrays)

    numbers = [number for number in entries if number < len(plan.tiles)]
    with ThreadPoolExecutor() as pool:
        return [n for n, bad in zip(numbers, pool.map(damaged, numbers), strict=True) if bad]


def _to_be_read(folder: Path, entries: Mapping[int, TileSums]) -> set[int]:
    suspects = set(tiles_in_doubt(folder))
    room = READ_BYTES
    for number in reversed(list(entries)):
        room -= sum(entries[number].sizes)
        if room < 0:
            break
        suspects.add(number)
    return suspects

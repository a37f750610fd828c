"""Whether the tiles that the ledger names are on disk as they were written."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

from porkgrid.survey.chunks import is_whole, size_of
from porkgrid.survey.ledger import tiles_in_doubt
from porkgrid.survey.plan import Plan
from porkgrid.survey.store import STORE, chunk_of, tiled
from porkgrid.survey.tiles import TileSums

# Bytes that are read and checked beside the tiles in doubt, newest first; of older tiles only the sizes are.
# A second or so of reading. What goes wrong later is found by the checksum when it is read.
READ_BYTES = 1_000_000_000
_OPENING_BYTES = 50_000  # that could be read in the time it takes to open a file


def damaged_tiles(folder: Path, plan: Plan, entries: Mapping[int, TileSums]) -> list[int]:
    """Numbers of the tiles of which a chunk is missing, cut short or changed."""
    arrays = [f"{folder}/{STORE}/{name}" for name in tiled(plan)]
    suspects = _to_be_read(folder, entries)

    def damaged(number: int) -> bool:
        place, sizes = chunk_of(plan, plan.tiles[number]), entries[number].sizes
        if [size_of(array, place) for array in arrays] != list(sizes):
            return True
        return number in suspects and not all(is_whole(array, place) for array in arrays)

    # One thread: several wait for each other between calls that take a few microseconds each.
    return [number for number in entries if number < len(plan.tiles) and damaged(number)]


def _to_be_read(folder: Path, entries: Mapping[int, TileSums]) -> set[int]:
    suspects = set(tiles_in_doubt(folder))
    room = READ_BYTES
    for number in reversed(list(entries)):
        room -= sum(entries[number].sizes) + _OPENING_BYTES * len(entries[number].sizes)
        if room < 0:
            break
        suspects.add(number)
    return suspects

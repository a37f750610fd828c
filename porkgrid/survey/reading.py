"""The grid on disk, opened for reading: what is missing or damaged is said, never read as if it were sound.

zarr reads a chunk that is not there as one full of the fill value, which a survey would show as dates that
nobody may fly on. Every chunk of a finished survey is there, so that one that is not is a fault.
"""

from __future__ import annotations

import re
from collections.abc import Hashable, Mapping, Sequence
from pathlib import Path

import xarray as xr
from zarr.abc.store import ByteRequest
from zarr.core.buffer import Buffer, BufferPrototype
from zarr.storage import LocalStore

from porkgrid.errors import RequestError
from porkgrid.survey.chunks import is_sound
from porkgrid.survey.store import BLOCKED_BY, STORE

_CHUNK = re.compile(r"/c(/\d+)*$")
_TILE = re.compile(r"/c/\d+/\d+$")


def open_grid(folder: Path, shape: tuple[int, int], stored: Sequence[str]) -> xr.Dataset:
    """The measures of every cell of a survey, read as they are asked for.

    `shape` is departure × arrival dates and `stored` the measures that the survey keeps. RequestError, here
    or when values are read, where the store is foreign, incomplete or damaged.
    """
    path = folder / STORE
    if not path.is_dir():
        raise RequestError(f"{path}: there is no such folder, and a survey keeps its grid there; {_ANEW}")
    try:
        grid = xr.open_zarr(_SoundStore(path, read_only=True), chunks=None, consolidated=True)
    except RequestError:
        raise
    except Exception as error:  # what zarr and xarray raise over foreign metadata has no common class
        reason = " ".join(str(error).split())[:200]
        raise RequestError(
            f"{path}: cannot be opened as a survey's grid ({type(error).__name__}: {reason}); {_ANEW}"
        ) from None
    if BLOCKED_BY in grid.variables:
        _refuse_shape(path, grid[BLOCKED_BY].sizes, shape)
    missing = {str(name) for name in grid.variables if not (path / str(name) / "zarr.json").is_file()}
    missing |= {*stored, BLOCKED_BY} - grid.variables.keys()
    if missing:
        raise RequestError(f"{path}: has no array {', '.join(sorted(missing))}; {_ANEW}")
    return grid


def _refuse_shape(path: Path, found: Mapping[Hashable, int], shape: tuple[int, int]) -> None:
    if dict(found) != {"departure": shape[0], "arrival": shape[1]}:
        sizes = " × ".join(f"{size} {name}s" for name, size in found.items())
        right = f"{shape[0]} × {shape[1]} dates"
        raise RequestError(
            f"{path}: is the grid of another survey: {sizes}, and this one has {right}; {_ANEW}"
        )


_AGAIN = "`porkgrid sweep` with the same scenario computes it again"
_ANEW = "sweep the survey's scenario anew with --fresh"


class _SoundStore(LocalStore):
    """A store on disk in which a chunk that is missing or not as it was written is a fault."""

    async def get(
        self, key: str, prototype: BufferPrototype | None = None, byte_range: ByteRequest | None = None
    ) -> Buffer | None:
        found = await super().get(key, prototype, byte_range)
        if not _CHUNK.search(key):
            return found
        remedy = _AGAIN if _TILE.search(key) else _ANEW
        if found is None:
            raise RequestError(f"{self.root / key}: this part of the survey's grid is missing; {remedy}")
        if _TILE.search(key) and not is_sound(found.to_bytes()):
            what = "this part of the survey's grid is damaged: its checksum is wrong"
            raise RequestError(f"{self.root / key}: {what}; {remedy}")
        return found

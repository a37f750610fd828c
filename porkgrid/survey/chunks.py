"""The chunk files of a grid: written whole or not at all, each with its checksum, looked over before trusted.

What is written here is Zarr v3 (https://zarr-specs.readthedocs.io): little-endian bytes, Blosc, CRC32C. zarr
itself takes ten times as long for a chunk as compressing and writing it does, and does not rename into place.
"""

from __future__ import annotations

import os
from contextlib import suppress
from pathlib import Path
from typing import Literal

import google_crc32c
import numpy as np
from numcodecs import Blosc
from zarr.codecs import BloscCodec, Crc32cCodec

# Of those measured (tests/benchmarks/bench_compression.py) the fastest; others save a twentieth of the disk.
_COMPRESSOR: Literal["lz4"] = "lz4"
_LEVEL = 5
_BLOSC = Blosc(cname=_COMPRESSOR, clevel=_LEVEL, shuffle=Blosc.SHUFFLE)
CHECKSUM_BYTES = 4


def codecs(dtype: np.dtype) -> list[BloscCodec | Crc32cCodec]:
    """How zarr is told to read the chunks of an array."""
    return [
        BloscCodec(cname=_COMPRESSOR, clevel=_LEVEL, shuffle="shuffle", typesize=dtype.itemsize, blocksize=0),
        Crc32cCodec(),
    ]


def encode(values: np.ndarray) -> bytes:
    """The bytes of a chunk's file."""
    packed = _BLOSC.encode(np.ascontiguousarray(values))
    return bytes(packed) + google_crc32c.value(packed).to_bytes(CHECKSUM_BYTES, "little")


def write_chunk(array: str, place: tuple[int, int], content: bytes) -> None:
    """Write the file of a chunk of an array's folder, under a temporary name first."""
    folder, column = f"{array}/c/{place[0]}", place[1]
    part = f"{folder}/.{column}.{os.getpid()}.part"  # two workers may be at one tile, if one was thought dead
    try:
        file = open(part, "wb")  # noqa: SIM115 - closed below, whichever of the two opened it
    except FileNotFoundError:
        os.makedirs(folder, exist_ok=True)
        file = open(part, "wb")  # noqa: SIM115
    try:
        with file:
            file.write(content)
        os.replace(part, f"{folder}/{column}")
    except OSError:  # a full disk, say: leave it as it was
        with suppress(OSError):
            os.unlink(part)
        raise


def remove_parts(store: Path) -> None:
    """Remove what writers that were killed have left half-written."""
    for part in store.glob("*/c/*/.*.part"):
        part.unlink(missing_ok=True)


def is_whole(array: str, place: tuple[int, int]) -> bool:
    """Whether the file of a chunk is there and its checksum right."""
    try:
        with open(f"{array}/c/{place[0]}/{place[1]}", "rb") as file:
            return is_sound(file.read())
    except OSError:
        return False


def is_sound(content: bytes) -> bool:
    """Whether the checksum in the bytes of a chunk's file is theirs."""
    body = content[:-CHECKSUM_BYTES]
    told = int.from_bytes(content[-CHECKSUM_BYTES:], "little")
    return len(body) > 0 and google_crc32c.value(body) == told


def size_of(array: str, place: tuple[int, int]) -> int:
    """Bytes of a chunk's file; −1 where there is none."""
    try:
        return os.stat(f"{array}/c/{place[0]}/{place[1]}").st_size
    except OSError:
        return -1

"""Chunk files, against zarr and xarray reading them, and against what disks and crashes do to them."""

from __future__ import annotations

import os
import threading

import numpy as np
import pytest
import zarr
from hypothesis import given, settings
from hypothesis import strategies as st

from porkgrid.survey import chunks
from porkgrid.survey.chunks import codecs, encode, is_whole, remove_parts, size_of, write_chunk

SHAPE, CHUNKS = (7, 11), (3, 4)  # neither side is a multiple: the last chunks stick out of the grid
KINDS = {np.float32: np.nan, np.float64: np.nan, np.uint32: 0xFFFFFFFF}


def new_array(folder, dtype, fill, shape=SHAPE, size=CHUNKS):
    """An empty array as the store makes it, and the folder of its chunks."""
    group = zarr.open_group(folder, mode="a")
    array = group.create_array(
        "a", shape=shape, chunks=size, dtype=dtype, fill_value=fill, compressors=codecs(np.dtype(dtype))
    )
    return array, str(folder / "a")


def odd_values(dtype, shape):
    """Values whose every bit matters: NaN with payload, both zeros, infinities, subnormals, the extremes."""
    dtype = np.dtype(dtype)
    bits = np.random.default_rng(6).integers(0, 256, (*shape, dtype.itemsize), dtype=np.uint8)
    values = bits.view(dtype)[..., 0].copy()
    if dtype.kind == "f":
        odd = [np.nan, np.inf, -np.inf, 0.0, -0.0, np.finfo(dtype).tiny / 4, np.finfo(dtype).max]
        values.flat[: len(odd)] = odd
    return values


@pytest.fixture
def one(tmp_path):
    """A chunk on disk: its array's folder, its path and its bytes."""
    _, array = new_array(tmp_path, np.float32, np.nan)
    content = encode(odd_values(np.float32, CHUNKS))
    write_chunk(array, (1, 2), content)
    return array, tmp_path / "a" / "c" / "1" / "2", content


# Zarr reads what is written


@pytest.mark.parametrize("dtype", KINDS)
def test_zarr_reads_every_bit_that_was_written_edges_included(tmp_path, dtype):
    array, folder = new_array(tmp_path, dtype, KINDS[dtype])
    whole = odd_values(dtype, (9, 12))
    for i in range(3):
        for j in range(3):
            write_chunk(folder, (i, j), encode(whole[3 * i : 3 * i + 3, 4 * j : 4 * j + 4]))
    read = zarr.open_array(folder, mode="r")[:]
    assert read.dtype == np.dtype(dtype)
    assert read.tobytes() == whole[:7, :11].tobytes()
    assert array[2:5, 3:9].tobytes() == whole[2:5, 3:9].tobytes()


@pytest.mark.parametrize("dtype", KINDS)
def test_a_chunk_is_what_zarr_itself_would_have_written(tmp_path, dtype):
    values = odd_values(dtype, CHUNKS)
    array, folder = new_array(tmp_path, dtype, KINDS[dtype], CHUNKS, CHUNKS)
    array[:] = values
    by_zarr = (tmp_path / "a" / "c" / "0" / "0").read_bytes()
    write_chunk(folder, (0, 0), encode(values))
    assert len(by_zarr) == size_of(folder, (0, 0))
    assert array[:].tobytes() == values.tobytes()
    assert is_whole(folder, (0, 0))
    (tmp_path / "a" / "c" / "0" / "0").write_bytes(by_zarr)
    assert is_whole(folder, (0, 0))


def test_a_chunk_all_of_the_fill_value_is_written_all_the_same(tmp_path):
    array, folder = new_array(tmp_path, np.float32, np.nan, CHUNKS, CHUNKS)
    write_chunk(folder, (0, 0), encode(np.full(CHUNKS, np.nan, dtype=np.float32)))
    assert is_whole(folder, (0, 0))
    assert np.isnan(array[:]).all()


@settings(max_examples=30, deadline=None)
@given(rows=st.integers(1, 9), columns=st.integers(1, 9), dtype=st.sampled_from(sorted(KINDS, key=str)))
def test_a_block_cut_out_of_a_larger_array_is_read_back(tmp_path_factory, rows, columns, dtype):
    """Views that are not contiguous, and in the other order of memory."""
    array, folder = new_array(
        tmp_path_factory.mktemp("z"), dtype, KINDS[dtype], (rows, columns), (rows, columns)
    )
    for block in (odd_values(dtype, (12, 10))[1 : rows + 1, :columns], odd_values(dtype, (columns, rows)).T):
        write_chunk(folder, (0, 0), encode(block))
        assert array[:].tobytes() == np.ascontiguousarray(block).tobytes()


def test_the_same_values_are_the_same_bytes():
    values = odd_values(np.float32, (64, 64))
    assert encode(values) == encode(np.asfortranarray(values)) == encode(values.copy())


# Damage is found


def test_a_chunk_as_it_was_written_is_whole(one):
    array, path, content = one
    assert path.read_bytes() == content
    assert is_whole(array, (1, 2))
    assert size_of(array, (1, 2)) == len(content)


def test_a_chunk_cut_short_at_any_byte_is_not_whole(one):
    array, path, content = one
    for length in range(len(content)):
        path.write_bytes(content[:length])
        assert not is_whole(array, (1, 2)), length


def test_any_byte_that_has_changed_is_found(one):
    array, path, content = one
    for place in range(len(content)):
        for flip in (0x01, 0x80, 0xFF):
            changed = bytearray(content)
            changed[place] ^= flip
            path.write_bytes(changed)
            assert not is_whole(array, (1, 2)), place


@pytest.mark.parametrize("content", [b"", b"\0" * 3, b"\0" * 4, b"\0" * 5, b"\0" * 4096, b"\xff" * 100])
def test_what_a_power_cut_leaves_in_place_of_a_chunk_is_not_whole(one, content):
    array, path, _ = one
    path.write_bytes(content)
    assert not is_whole(array, (1, 2))


def test_bytes_behind_the_end_are_found(one):
    array, path, content = one
    path.write_bytes(content + b"\0" * 16)
    assert not is_whole(array, (1, 2))


def test_a_chunk_that_is_not_there_is_not_whole_and_has_no_size(one):
    array, path, _ = one
    path.unlink()
    assert not is_whole(array, (1, 2))
    assert size_of(array, (1, 2)) == -1
    assert size_of(array, (7, 7)) == -1
    path.mkdir()
    assert not is_whole(array, (1, 2))


# Written whole or not at all


def files(folder):
    return sorted(str(path.relative_to(folder)) for path in folder.rglob("*") if path.is_file())


@pytest.mark.parametrize("fails", ["write", "replace"])
def test_a_full_disk_leaves_the_chunk_of_before_and_no_part(one, tmp_path, monkeypatch, fails):
    array, path, content = one

    def full(*_):
        raise OSError(28, "No space left on device")

    if fails == "replace":
        monkeypatch.setattr(os, "replace", full)
    else:
        real = open

        def opened(*arguments):
            file = real(*arguments)
            return Full(file)

        monkeypatch.setattr(chunks, "open", opened, raising=False)
    before = files(tmp_path)
    for place in ((1, 2), (1, 3)):
        with pytest.raises(OSError, match="No space"):
            write_chunk(array, place, b"other")
    assert files(tmp_path) == before
    assert path.read_bytes() == content


class Full:
    """A file on a full disk."""

    def __init__(self, file):
        self._file = file

    def __enter__(self):
        return self

    def __exit__(self, *_):
        self._file.close()

    def write(self, content):
        self._file.write(content[: len(content) // 2])
        raise OSError(28, "No space left on device")


def test_a_reader_finds_the_old_or_the_new_chunk_and_nothing_between(one):
    array, path, content = one
    new = encode(np.zeros(CHUNKS, dtype=np.float32))
    seen, stop = set(), threading.Event()

    def read():
        while not stop.is_set():
            seen.add(path.read_bytes())

    reader = threading.Thread(target=read)
    reader.start()
    for _ in range(200):
        write_chunk(array, (1, 2), new)
        write_chunk(array, (1, 2), content)
    stop.set()
    reader.join()
    assert seen <= {content, new}


def test_parts_that_killed_writers_have_left_are_removed_and_nothing_else(one, tmp_path):
    _, path, _ = one
    before = files(tmp_path)
    for number in (17, 4711):
        path.with_name(f".2.{number}.part").write_bytes(b"half")
    path.with_name(".3.9.part").write_bytes(b"")
    remove_parts(tmp_path)
    assert files(tmp_path) == before


def test_threads_that_make_the_same_folders_do_not_hinder_each_other(tmp_path):
    content = encode(np.zeros(CHUNKS, dtype=np.uint32))
    for number in range(20):
        array, gate = str(tmp_path / f"a{number}"), threading.Barrier(4)

        def write(column, array=array, gate=gate):
            gate.wait()
            write_chunk(array, (0, column), content)

        threads = [threading.Thread(target=write, args=(column,)) for column in range(4)]
        for thread in threads:
            thread.start()
        for thread in threads:
            thread.join()
        assert all(is_whole(array, (0, column)) for column in range(4))

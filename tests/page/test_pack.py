from __future__ import annotations

import base64
import zlib

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from porkgrid.page.pack import packed_bytes, packed_grid


def unpacked(text: str, shape: tuple[int, int]) -> np.ndarray:
    """The bit patterns of a packed grid, undone as pack.py says."""
    planes = np.frombuffer(zlib.decompress(base64.b64decode(text)), dtype=np.uint8).reshape(4, -1)
    words = np.ascontiguousarray(planes.T).view("<u4").reshape(shape)
    return np.cumsum(np.cumsum(words, axis=1, dtype=np.uint32), axis=0, dtype=np.uint32)


@given(arrays(np.uint32, st.tuples(st.integers(1, 9), st.integers(1, 9))))
def test_any_bits_come_back_as_they_were(words):
    np.testing.assert_array_equal(unpacked(packed_grid(words), words.shape), words)
    as_numbers = packed_grid(words.view(np.float32))
    np.testing.assert_array_equal(unpacked(as_numbers, words.shape), words)


@pytest.mark.parametrize("turned", [False, True])
def test_a_view_that_is_not_contiguous_is_packed_as_it_reads(turned):
    grid = np.arange(48, dtype=np.float32).reshape(6, 8)[::2, ::3]
    grid = grid.T if turned else grid
    np.testing.assert_array_equal(unpacked(packed_grid(grid), grid.shape).view(np.float32), grid)


def test_a_smooth_surface_takes_less_than_half_of_its_bytes():
    x, y = np.meshgrid(np.linspace(0, 3, 300), np.linspace(0, 4, 300))
    surface = (10.0 + np.sin(x) * np.cos(y)).astype(np.float32)
    assert len(base64.b64decode(packed_grid(surface))) < 0.5 * surface.nbytes


def test_a_file_comes_back_as_it_was():
    content = bytes(range(256)) * 40
    assert zlib.decompress(base64.b64decode(packed_bytes(content))) == content

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from hypothesis import given
from hypothesis import strategies as st

from porkgrid.page.thin import swept_part, thinned, thinning_for
from porkgrid.survey.plan import Tile


@pytest.mark.parametrize(
    ("sides", "steps"),
    [((300, 400), (1, 1)), ((1000, 1000), (3, 3)), ((400, 500), (1, 2)), ((20, 60_000), (1, 10))],
)
def test_dates_are_thinned_where_there_are_most(sides, steps):
    thinning = thinning_for(*sides, 125_000)
    assert (thinning.departure_step, thinning.arrival_step) == steps
    assert thinning.cells <= 125_000


@given(st.integers(1, 5000), st.integers(1, 5000), st.integers(1000, 200_000))
def test_a_thinned_grid_never_has_more_cells_than_asked(departures, arrivals, most):
    thinning = thinning_for(departures, arrivals, most)
    kept = np.empty((departures, arrivals))[:: thinning.departure_step, :: thinning.arrival_step]
    assert kept.size == thinning.cells <= most


def test_thinning_is_said_in_words_and_a_whole_grid_says_nothing():
    assert thinning_for(100, 100, 20_000).words == ""
    words = thinning_for(1000, 700, 20_000).words
    assert "every 8th departure date and every 5th arrival date" in words
    assert "1000 × 700" in words


@pytest.mark.parametrize(
    ("most_cells", "words"), [(250_000, "every 2nd"), (111_600, "every 3rd"), (8_300, "every 11th")]
)
def test_steps_are_spelt_as_they_are_said(most_cells, words):
    assert f"{words} departure date" in thinning_for(1000, 1000, most_cells).words


def numbered(rows: int, columns: int) -> xr.DataArray:
    values = np.arange(rows * columns, dtype=np.float32).reshape(rows, columns)
    return xr.DataArray(values, dims=("departure", "arrival"))


def test_kept_cells_are_those_of_the_dates_kept():
    variable = numbered(10, 12)
    thinning = thinning_for(10, 12, 20)
    kept = thinned(variable, thinning)
    np.testing.assert_array_equal(
        kept, variable.values[:: thinning.departure_step, :: thinning.arrival_step].T
    )


@given(st.integers(0, 6), st.integers(1, 4), st.integers(1, 4), st.sets(st.integers(0, 5)))
def test_a_part_holds_what_its_tiles_hold_and_nothing_else(start, row_step, column_step, numbers):
    variable = numbered(11, 9)
    blocks = [(slice(r, min(r + 4, 11)), slice(c, min(c + 5, 9))) for r in (0, 4, 8) for c in (0, 5)]
    tiles = [Tile(number, *blocks[number]) for number in sorted(numbers)]
    wanted = np.full((11, 9), -1.0)
    for tile in tiles:
        wanted[tile.rows, tile.columns] = variable.values[tile.rows, tile.columns]
    rows, columns = slice(start, 11, row_step), slice(0, 9, column_step)
    part = swept_part(variable, tiles, rows, columns, -1.0)
    np.testing.assert_array_equal(part, wanted[rows, columns])

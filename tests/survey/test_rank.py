"""Local bests and distinct windows, against looking at every cell and every pair."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as arrays

from porkgrid.survey import rank
from porkgrid.survey.rank import distinct, local_bests

SHAPES = st.tuples(st.integers(1, 12), st.integers(1, 9))
SIGN = st.sampled_from([1.0, -1.0])


@st.composite
def grids(draw):
    """Values with many ties and some NaN, and blocked words."""
    shape = draw(SHAPES)
    value = st.one_of(st.integers(0, 6).map(float), st.just(np.nan))
    values = draw(arrays.arrays(float, shape, elements=value))
    return values, draw(arrays.arrays(np.uint32, shape, elements=st.sampled_from([0, 0, 0, 8])))


def reader(values, blocked):
    return lambda rows: (values[rows], blocked[rows])


def neighbours(cell, shape):
    i, j = cell
    for a in range(max(i - 1, 0), min(i + 2, shape[0])):
        for b in range(max(j - 1, 0), min(j + 2, shape[1])):
            if (a, b) != cell:
                yield a, b


def by_hand(values, blocked, sign):
    """Cells that no neighbour beats; of equal neighbours the first in row order counts as better."""
    cost = np.where((blocked == 0) & ~np.isnan(values), sign * values, np.inf)
    return [
        cell
        for cell in np.ndindex(values.shape)
        if np.isfinite(cost[cell])
        and all((cost[cell], cell) < (cost[other], other) for other in neighbours(cell, values.shape))
    ]


@given(grids(), SIGN)
def test_local_bests_are_the_allowed_cells_that_no_neighbour_beats(grid, sign):
    i, j, values = local_bests(reader(*grid), len(grid[0]), sign)
    assert sorted(zip(i, j, strict=True)) == by_hand(*grid, sign)
    assert np.array_equal(values, grid[0][i, j])
    assert np.all(np.diff(sign * values) >= 0.0)


@settings(max_examples=60)
@given(grids(), SIGN, st.integers(1, 5))
def test_reading_in_bands_finds_what_reading_the_whole_finds(grid, sign, band):
    whole = local_bests(reader(*grid), len(grid[0]), sign)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(rank, "BAND_ROWS", band)
        banded = local_bests(reader(*grid), len(grid[0]), sign)
    for one, other in zip(whole, banded, strict=True):
        assert np.array_equal(one, other)


@given(grids(), SIGN)
def test_the_best_allowed_cell_of_all_comes_first(grid, sign):
    values, blocked = grid
    allowed = values[(blocked == 0) & ~np.isnan(values)]
    _, _, found = local_bests(reader(values, blocked), len(values), sign)
    assert found[:1].tolist() == ([sign * (sign * allowed).min()] if allowed.size else [])


DAYS = arrays.arrays(float, st.tuples(st.integers(0, 25), st.just(2)), elements=st.integers(0, 60).map(float))


@given(DAYS, st.floats(0.0, 30.0), st.integers(1, 10))
def test_distinct_windows_are_those_not_near_a_better_one(epochs, apart, keep):
    kept = []
    for index in range(len(epochs)):
        near = [k for k in kept if all(abs(epochs[k][side] - epochs[index][side]) < apart for side in (0, 1))]
        if not near:
            kept.append(index)
    assert list(distinct(epochs, apart, keep)) == kept[:keep]


def test_two_windows_are_one_only_if_they_are_close_in_every_date():
    same_departure = np.array([[0.0, 0.0], [0.0, 10.0], [3.0, 4.0], [9.9, 9.9]])
    assert list(distinct(same_departure, 10.0, 20)) == [0, 1]
    assert list(distinct(same_departure, 4.0, 20)) == [0, 1, 2, 3]


def test_a_valley_of_equal_cells_is_one_window():
    values = np.full((5, 7), 9.0)
    values[2, 1:6] = 1.0
    i, j, _ = local_bests(reader(values, np.zeros(values.shape, np.uint32)), 5, 1.0)
    assert (i[0], j[0]) == (2, 1)
    assert np.count_nonzero(values[i, j] == 1.0) == 1

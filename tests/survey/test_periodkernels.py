"""The loops over tables of costs, against trying every run."""

from itertools import combinations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from porkgrid.survey.periodkernels import least_run_costs, run_costs

# few values, so that there are ties; infinity closes a day
COSTS = st.sampled_from([np.inf, np.inf, 1.0, 2.0, 3.0, 5.5, -4.0])


@st.composite
def tables(draw, most_days=9, most_columns=4):
    days, columns = draw(st.integers(1, most_days)), draw(st.integers(1, most_columns))
    cells = draw(st.lists(COSTS, min_size=days * columns, max_size=days * columns))
    return np.array(cells, dtype=draw(st.sampled_from([np.float32, np.float64]))).reshape(days, columns)


def brute_least(table, count, spare):
    """Every choice of `count` days that span at most count + spare, held to every column."""
    runs = [run for run in combinations(range(len(table)), count) if run[-1] - run[0] < count + spare]
    return min((table[list(run), j].max() for run in runs for j in range(table.shape[1])), default=np.inf)


@settings(max_examples=150, deadline=None)
@given(tables(), st.integers(0, 3), st.integers(1, 12))
def test_the_least_cost_of_every_length_is_that_of_trying_every_choice_of_days(table, spare, up_to):
    least = np.full(up_to, np.inf)
    least_run_costs(table, spare, least)
    assert least.tolist() == [brute_least(table, count, spare) for count in range(1, up_to + 1)]


@settings(max_examples=150, deadline=None)
@given(tables(), st.integers(0, 3), st.integers(1, 6))
def test_each_span_costs_what_its_best_column_costs(table, spare, count):
    starts = len(table) - count - spare + 1
    if starts < 1:
        return
    cost, column = np.empty(starts), np.empty(starts, dtype=np.int64)
    run_costs(table, count, spare, cost, column)
    for start in range(starts):
        by_column = np.sort(table[start : start + count + spare], axis=0)[count - 1]
        assert cost[start] == by_column.min()
        assert column[start] == (np.argmin(by_column) if np.isfinite(by_column.min()) else -1)


@pytest.mark.parametrize("spare", [0, 2])
def test_lengths_that_no_run_reaches_stay_as_they_were(spare):
    table = np.array([[1.0], [np.inf], [2.0], [np.inf]])
    least = np.full(6, 77.0)
    least_run_costs(table, spare, least)
    assert least.tolist() == ([1.0] if spare == 0 else [1.0, 2.0]) + [77.0] * (5 if spare == 0 else 4)

"""Runs of departure days, worst day by worst day: the loops over tables of day × what is held.

A table (days, columns) holds the cost of leaving on a day with what a column holds fixed: an arrival date, a
set of dates, or nothing at all where there is one column. Less is better; infinity closes a day. A run of
`count` days may leave out `spare` days inside: it costs what its worst day costs, which is the (spare + 1)-th
largest cost of the count + spare days that it lies in.
"""

from __future__ import annotations

import numpy as np
from numba import njit

from porkgrid.physics.timeflight import PLAIN, ROW


@njit(**PLAIN)
def run_costs(table, count, spare, cost, column):
    """Fill cost and column (starts,): of the run within each span of count + spare days, in its best column.

    table: (days, columns), days ≥ count + spare; starts = days − count − spare + 1. Of equal columns the
    first; −1 where all are closed.
    """
    days, columns = table.shape
    span = count + spare
    largest = np.empty((spare + 1, columns), dtype=table.dtype)
    for start in range(days - span + 1):
        largest[:] = -np.inf
        for row in table[start : start + span]:
            _insert(largest, row)
        best, where = np.inf, -1
        for j in range(columns):
            if largest[spare, j] < best:
                best, where = largest[spare, j], j
        cost[start], column[start] = best, where


@njit(**PLAIN)
def least_run_costs(table, spare, least):
    """Lower least (up_to,) to the cost of the best run of 1, 2, … days; what no run reaches is left as it is.

    table: (days, columns). The runs of n days of one start grow out of those of n − 1, at two comparisons per
    column, and more with days left out; columns outside those that the start has open are passed over. A
    table too short for all the days left out leaves out fewer.
    """
    days, columns = table.shape
    up_to = least.shape[0]
    largest = np.empty((spare + 1, columns), dtype=table.dtype)
    lowest = np.full((up_to, columns), np.inf, dtype=table.dtype)  # over the starts, per length and column
    for start in range(days):
        span = min(up_to + spare, days - start)
        left, right = _open_columns(table[start : start + min(spare + 1, span)])
        largest[:, left:right] = -np.inf
        for k in range(span):
            _insert(largest[:, left:right], table[start + k, left:right])
            if k >= spare:
                _lower_to(lowest[k - spare, left:right], largest[spare, left:right])
        if start == 0:  # a span that is the whole table leaves out what is left of it, down to nothing
            for count in range(max(1, span - spare + 1), min(up_to, span) + 1):
                _lower_to(lowest[count - 1, left:right], largest[span - count, left:right])
    for count in range(up_to):
        least[count] = min(least[count], lowest[count].min())


@njit(**PLAIN)
def _open_columns(rows):
    """The range of columns outside which rows (k, columns) are closed in every row."""
    left, right = rows.shape[1], 0
    for row in rows:
        j = 0
        while j < left and row[j] == np.inf:
            j += 1
        left = min(left, j)
        j = row.shape[0]
        while j > right and row[j - 1] == np.inf:
            j -= 1
        right = max(right, j)
    return min(left, right), right


@njit(**PLAIN)
def _insert(largest, row):
    """Keep the largest costs seen so far of every column, (kept, columns) in falling order."""
    if largest.shape[0] == 1:
        _raise_to(largest[0], row)
        return
    for j in range(row.shape[0]):
        falling = row[j]
        for k in range(largest.shape[0]):
            falling, largest[k, j] = min(falling, largest[k, j]), max(falling, largest[k, j])


# Both sides are loaded before they are compared, or LLVM stores under a mask: half as fast.
@njit(**ROW)
def _raise_to(level, row):
    for j in range(row.shape[0]):
        old, new = level[j], row[j]
        level[j] = new if new > old else old


@njit(**ROW)
def _lower_to(level, row):
    for j in range(row.shape[0]):
        old, new = level[j], row[j]
        level[j] = new if new < old else old

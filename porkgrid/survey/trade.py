"""The trade front of a survey: the allowed cells that no other beats in all of two or three measures."""

from __future__ import annotations

import difflib
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numba import njit

from porkgrid.errors import RequestError
from porkgrid.survey.candidates import picked_at, tabulate
from porkgrid.survey.folder import write_whole
from porkgrid.survey.surveys import Survey
from porkgrid.survey.view import better_sign, row_bands

TRADE_CSV = "trade.csv"


@dataclass(frozen=True, eq=False)
class Front:
    """A trade front, best cell by the first measure first.

    measures: names, the one ranked by and the one or two traded against it; signs: +1 where less is better.
    rows, columns: (n,) indices of the cells; values: (n, measures) as stored. allowed: how many cells of the
    survey are allowed and have all measures.
    """

    measures: tuple[str, ...]
    signs: tuple[float, ...]
    rows: np.ndarray
    columns: np.ndarray
    values: np.ndarray
    allowed: int

    @property
    def costs(self) -> np.ndarray:
        """(n, measures) values turned so that less is better."""
        return self.values * np.array(self.signs)


def trade_front(survey: Survey, by: str | None, traded: Sequence[str], order: str | None = None) -> Front:
    """The front of the rank measure (or `by`) and one or two others, each in its better direction.

    `order` overrides which end of `by` is better. RequestError for measures that cannot be traded so.
    """
    by = by or survey.plan.rank_by
    _refuse(survey, by, traded)
    measures = (by, *traded)
    first = better_sign(survey, by) if order is None else {"least": 1.0, "most": -1.0}[order]
    signs = (first, *(better_sign(survey, name) for name in traded))
    kept = [(np.empty(0, np.intp), np.empty(0, np.intp), np.empty((0, len(measures))))]
    allowed = 0
    for start, inside, values in allowed_bands(survey, measures):
        allowed += len(values)
        on = non_dominated(values * signs)
        rows, columns = np.nonzero(inside)
        kept.append((rows[on] + start, columns[on], values[on]))
    rows, columns, values = (np.concatenate(parts) for parts in zip(*kept, strict=True))
    on = non_dominated(values * signs)  # the front of the bands' fronts is the front of all
    costs = values[on] * signs
    best_first = on[np.lexsort((columns[on], rows[on], *costs.T[::-1]))]
    return Front(measures, signs, rows[best_first], columns[best_first], values[best_first], allowed)


def allowed_bands(survey: Survey, measures: Sequence[str]) -> Iterator[tuple[int, np.ndarray, np.ndarray]]:
    """Yield a band's first row, which of its cells (k, m) are allowed, and their measures (cells, names)."""
    start = 0
    for bands in zip(*(row_bands(survey, name) for name in measures), strict=True):
        inside = bands[0][1] == 0
        for values, _ in bands:
            inside = inside & ~np.isnan(values)
        yield start, inside, np.column_stack([values[inside].astype(np.float64) for values, _ in bands])
        start += len(inside)


def non_dominated(costs: np.ndarray) -> np.ndarray:
    """Indices, ascending, of the rows of costs (n, 2 or 3) that no other row dominates.

    A row dominates another if it is nowhere more and somewhere less; equal rows stand together. No NaN.
    """
    around = np.flatnonzero(~_dominated_by_compromise(costs))
    near = costs[around]
    if costs.shape[1] == 2:
        near = np.column_stack([near, np.zeros(len(near))])
    order = np.lexsort(near.T[::-1])
    return np.sort(around[order[_staircase(near[order])]])


def spread(costs: np.ndarray, keep: int) -> np.ndarray:
    """Indices, ascending, of at most `keep` rows of a front (n, measures), evenly spread, its ends included.

    The best row of each measure comes first; then always the row farthest from all that are chosen, each
    measure scaled to its range on the front. Gonzalez 1985, "Clustering to minimize the maximum intercluster
    distance": no choice has less than half the largest gap.
    """
    if len(costs) <= keep:
        return np.arange(len(costs))
    reach = np.ptp(costs, axis=0)
    scaled = (costs - costs.min(axis=0)) / np.where(reach > 0.0, reach, 1.0)
    gap = np.full(len(costs), np.inf)
    chosen: list[int] = []
    ends = [int(np.lexsort((*costs.T[::-1], costs[:, each]))[0]) for each in range(costs.shape[1])]
    while len(chosen) < keep:
        following = ends.pop(0) if ends else int(np.argmax(gap))
        if following in chosen:
            continue
        chosen.append(following)
        gap = np.minimum(gap, np.sum(np.square(scaled - scaled[following]), axis=1))
        gap[following] = -1.0  # equal rows have no gap either, and each is taken once
    return np.sort(np.array(chosen, dtype=np.intp))


def front_table(survey: Survey, front: Front, keep: int) -> pd.DataFrame:
    """Every measure of at most `keep` cells of the front, evenly spread along it, at full precision."""
    chosen = spread(front.costs, keep)
    return tabulate(
        survey.plan, picked_at(survey.grid, survey.plan, front.rows[chosen], front.columns[chosen])
    )


def write_front(survey: Survey, table: pd.DataFrame) -> str:
    """Write the table into the survey's folder; the path."""
    path = survey.path / TRADE_CSV
    write_whole(path, table.to_csv(index=False))
    return str(path)


def _refuse(survey: Survey, by: str, traded: Sequence[str]) -> None:
    """Raise RequestError for measures that are not stored, named twice, or too many."""
    stored = survey.plan.stored
    faults = []
    for name in (by, *traded):
        if name not in stored:
            near = difflib.get_close_matches(name, stored, n=1, cutoff=0.4)
            hint = f"the nearest is {near[0]!r}" if near else f"it has {', '.join(stored)}"
            faults.append(f"{survey.path}: the survey does not store {name!r}; {hint}")
    if len({by, *traded}) < 1 + len(traded):
        faults.append(f"{survey.path}: --trade names a measure twice, or the one ranked by ({by})")
    if len(traded) > 2:
        faults.append(f"{survey.path}: --trade takes one measure or two, not {len(traded)}")
    if faults:
        raise RequestError(*faults)


def _dominated_by_compromise(costs: np.ndarray) -> np.ndarray:
    """Rows that one good compromise dominates: most of a grid, and sorting is what takes the time."""
    if not len(costs) or not np.isfinite(costs).all():
        return np.zeros(len(costs), dtype=bool)
    with np.errstate(over="ignore"):
        reach = costs.max(axis=0) - costs.min(axis=0)
    weights = np.divide(1.0, reach, out=np.zeros_like(reach), where=reach > np.finfo(float).tiny)
    no_less, more = np.ones(len(costs), dtype=bool), np.zeros(len(costs), dtype=bool)
    for column, middle in zip(costs.T, costs[np.argmin(costs @ weights)], strict=True):
        no_less &= column >= middle
        more |= column > middle
    return no_less & more


@njit(cache=True, nogil=True)
def _staircase(costs: np.ndarray) -> np.ndarray:
    """Which rows of costs (n, 3), sorted by all columns, none dominates; bool (n,).

    Rows before a row are no worse in the first column, so one of them dominates it if it is no worse in the
    other two: a staircase of second and third columns, rising and falling, holds the best of them. Kung,
    Luccio and Preparata 1975, "On finding the maxima of a set of vectors".
    """
    n = len(costs)
    kept = np.zeros(n, dtype=np.bool_)
    second, third = np.empty(n), np.empty(n)
    size = 0
    for row in range(n):
        a, b, c = costs[row]
        if row and costs[row - 1, 0] == a and costs[row - 1, 1] == b and costs[row - 1, 2] == c:
            kept[row] = kept[row - 1]
            continue
        after = np.searchsorted(second[:size], b, side="right")
        if after > 0 and third[after - 1] <= c:
            continue
        kept[row] = True
        # steps from the first that is no better in the second column, while no better in the third
        start = np.searchsorted(second[:size], b, side="left")
        end = start
        while end < size and third[end] >= c:
            end += 1
        shift = 1 - (end - start)
        if shift == 1:
            for k in range(size, start, -1):
                second[k], third[k] = second[k - 1], third[k - 1]
        elif shift < 0:
            for k in range(end, size):
                second[k + shift], third[k + shift] = second[k], third[k]
        second[start], third[start] = b, c
        size += shift
    return kept

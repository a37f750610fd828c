"""The local best of a cost under limits that a start leads to: sequential quadratic programming.

Many searches run side by side, so that each step evaluates the points of all of them at once. A search
takes Newton steps on the Lagrangian, with slopes and curvatures from differences, no farther in one step than
a reach in each variable: it walks down its own valley and does not leap into another. A step counts when cost
and weighted breach of limits fall together (Nocedal and Wright, Numerical Optimization, chapter 18; memory).

A cost with sizes of burns has a kink wherever a burn is zero, and that is where its optimum likes to be. So
each burn is given a side, on which it counts with its sign and may not be negative; there all is smooth. A
search that ends with a burn closed is repeated from the other side of the kink.
"""

from __future__ import annotations

from collections.abc import Callable, Generator
from dataclasses import dataclass

import numpy as np

from porkgrid.survey.quadratic import least_quadratic
from porkgrid.survey.stencil import derivatives, stencil

# Values (searches, 1 + limits + flybys, p) of the searches numbered (searches,) at points
# (searches, variables, p) with the flybys' sides (searches, flybys): the cost, the slack of every limit,
# negative where it is broken, and the burns in km/s.
Evaluate = Callable[[np.ndarray, np.ndarray, np.ndarray], np.ndarray]

_MOST_STEPS, _MOST_TURNS = 200, 8
_CLOSED_KM_S = 1e-5
# These are in units of what the cost or the slack varies by within a reach
_SETTLED = 1e-9  # what the next step would gain
_UNSURE = 1e-6  # what the rounding of differences may make a step seem to gain
_INSIDE = 1e-7  # by which limits are kept: more than bodies are misplaced by while searching
_FORBIDDING = 1e3  # the cost, and what a limit is broken by, where nothing flies
_SHORTEST, _NEAR = 1e-7, 0.1  # reaches: of a step; of the last one, which must promise nothing


@dataclass(frozen=True)
class Box:
    """Where a search may go, (variables,) each; `reach` is the longest step, `width` that of differences."""

    low: np.ndarray
    high: np.ndarray
    reach: np.ndarray
    width: np.ndarray


@dataclass(frozen=True)
class Descent:
    """Where a search has come to (variables,), and whether no step from there gains anything."""

    point: np.ndarray
    settled: bool


@dataclass(frozen=True)
class _Ask:
    point: np.ndarray
    width: np.ndarray
    sides: np.ndarray


def descend(evaluate: Evaluate, starts: list[np.ndarray], boxes: list[Box], flybys: int) -> list[Descent]:
    """The local bests that starts (variables,) lead to; a start itself where nothing better is found."""
    offsets = stencil(len(starts[0]))
    searches = [_search(start, box, flybys) for start, box in zip(starts, boxes, strict=True)]
    asks = {number: next(search) for number, search in enumerate(searches)}
    found: dict[int, Descent] = {}
    while asks:
        which = np.array(list(asks))
        points = np.array([ask.point[:, None] + ask.width[:, None] * offsets for ask in asks.values()])
        values = evaluate(which, points, np.array([ask.sides for ask in asks.values()]))
        for number, rows in zip(which.tolist(), values, strict=True):
            try:
                asks[number] = searches[number].send(rows)
            except StopIteration as end:
                found[number] = end.value
                del asks[number]
    return [found[number] for number in range(len(searches))]


@dataclass(frozen=True)
class _Scale:
    """What the cost and the slacks (limits + flybys,) vary by within a reach of the start."""

    start_cost: float
    cost: float
    slacks: np.ndarray


@dataclass(frozen=True)
class _Local:
    """Cost and slacks about a point, scaled, with slopes and curvatures per reach."""

    point: np.ndarray
    cost: float
    slope: np.ndarray
    curvature: np.ndarray
    slacks: np.ndarray
    slack_slopes: np.ndarray
    slack_curvatures: np.ndarray

    @property
    def kept(self) -> bool:
        """Whether all limits are kept."""
        return bool(np.all(self.slacks >= -_INSIDE))

    def breach(self, weights: np.ndarray) -> float:
        """Weighted sum of what limits are broken by."""
        return float(weights @ np.maximum(-self.slacks, 0.0))


def _search(start: np.ndarray, box: Box, flybys: int) -> Generator[_Ask, np.ndarray, Descent]:
    rows = yield _Ask(start, box.reach, np.ones(flybys))
    scale = _scale(rows, flybys)
    signed = rows[len(rows) - flybys :, 0]
    sides = np.where(signed < 0.0, -1.0, 1.0)
    best, settled = yield from _settle(start, box, sides, scale)
    untried = set(range(flybys))
    for _ in range(_MOST_TURNS):
        burns = best.slacks[len(best.slacks) - flybys :] * scale.slacks[len(best.slacks) - flybys :]
        turn = next((n for n in untried if burns[n] < _CLOSED_KM_S), None)
        if turn is None:
            break
        untried.remove(turn)
        turned = np.where(np.arange(flybys) == turn, -sides, sides)
        other, other_settled = yield from _settle(best.point, box, turned, scale)
        if other.kept and best.cost - other.cost > _SETTLED:
            best, settled, sides = other, other_settled, turned
            untried = set(range(flybys)) - {turn}
    return Descent(best.point, settled)


def _scale(rows: np.ndarray, flybys: int) -> _Scale:
    """The typical change of each row on a stencil a reach wide; a burn's is no more than 1 km/s."""
    changes = np.abs(rows - rows[:, :1])
    spread = np.ones(len(rows))
    for n, change in enumerate(changes):
        felt = change[np.isfinite(change) & (change > 0.0)]
        if felt.size:
            spread[n] = np.median(felt)
    spread[len(rows) - flybys :] = np.minimum(spread[len(rows) - flybys :], 1.0)
    return _Scale(float(rows[0, 0]), float(spread[0]), spread[1:])


def _settle(
    start: np.ndarray, box: Box, sides: np.ndarray, scale: _Scale
) -> Generator[_Ask, np.ndarray, tuple[_Local, bool]]:
    """Walk from a start to where no step gains; the best point on the way that keeps the limits."""
    here = yield from _look(start, box, sides, scale)
    best, radius = here, 0.5
    multipliers, weights = np.zeros(len(here.slacks)), np.zeros(len(here.slacks))
    for _ in range(_MOST_STEPS):
        step, multipliers = _step(here, here.slacks, multipliers, radius, box)
        weights = np.maximum(0.5 * weights, 1.5 * multipliers + 1e-3)
        hoped = _hoped(here, step, multipliers, weights)
        if hoped < _SETTLED or radius < _SHORTEST:
            step, multipliers = _step(here, here.slacks, multipliers, _NEAR, box)
            return best, here.kept and _hoped(here, step, multipliers, weights) < _UNSURE
        there = yield from _look(here.point + step * box.reach, box, sides, scale)
        if _gain(here, there, weights) < 0.25 * hoped and there.breach(weights) > here.breach(weights):
            # A curved limit was broken: mend the step by what the limits are there (Nocedal and Wright, 18.3)
            slacks = there.slacks - here.slack_slopes @ step
            mended, _ = _step(here, slacks, multipliers, radius, box)
            other = yield from _look(here.point + mended * box.reach, box, sides, scale)
            if _gain(here, other, weights) > _gain(here, there, weights):
                there, step = other, mended
        gained, length = _gain(here, there, weights), float(np.max(np.abs(step)))
        if gained < 0.25 * hoped:
            radius = 0.4 * min(length, radius)
        elif gained > 0.75 * hoped and length > 0.99 * radius:
            radius = min(1.0, 2.0 * radius)
        if gained > 0.01 * hoped:
            here = there
            if here.kept and (here.cost < best.cost or not best.kept):
                best = here
    return best, False


def _look(
    point: np.ndarray, box: Box, sides: np.ndarray, scale: _Scale
) -> Generator[_Ask, np.ndarray, _Local]:
    """What is about a point, or about the nearest one in the box."""
    point = np.clip(point, box.low, box.high)
    return _local(point, (yield _Ask(point, box.width, sides)), box, scale)


def _gain(here: _Local, there: _Local, weights: np.ndarray) -> float:
    """What a move gains, breach of limits included."""
    return here.cost + here.breach(weights) - there.cost - there.breach(weights)


def _local(point: np.ndarray, rows: np.ndarray, box: Box, scale: _Scale) -> _Local:
    scaled = rows - np.r_[scale.start_cost, np.zeros(len(rows) - 1)][:, None]
    scaled /= np.r_[scale.cost, scale.slacks][:, None]
    slopes, curvatures = derivatives(scaled, len(point))
    per_reach = box.reach / box.width
    slopes *= per_reach
    curvatures *= per_reach[:, None] * per_reach
    cost = float(scaled[0, 0]) if np.isfinite(scaled[0, 0]) else _FORBIDDING
    slacks = np.nan_to_num(scaled[1:, 0] - _INSIDE, nan=-_FORBIDDING, posinf=_FORBIDDING, neginf=-_FORBIDDING)
    return _Local(point, cost, slopes[0], curvatures[0], *_calmed(slacks, slopes[1:], curvatures[1:]))


def _calmed(
    slacks: np.ndarray, slopes: np.ndarray, curvatures: np.ndarray
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Area sine of slacks (limits,), with its slopes (limits, n) and curvatures (limits, n, n).

    Slacks run up to millions of km; this keeps their zeros and what they do there, and calms the rest.
    """
    less = 1.0 / np.sqrt(1.0 + slacks * slacks)
    bent = (slacks * less**3)[:, None, None] * slopes[:, :, None] * slopes[:, None, :]
    return np.arcsinh(slacks), slopes * less[:, None], curvatures * less[:, None, None] - bent


def _step(
    here: _Local, slacks: np.ndarray, multipliers: np.ndarray, radius: float, box: Box
) -> tuple[np.ndarray, np.ndarray]:
    """The best step in reaches (variables,) of the local model, and the multipliers of its limits."""
    n = len(here.point)
    low = np.maximum((box.low - here.point) / box.reach, -radius)
    high = np.minimum((box.high - here.point) / box.reach, radius)
    rows = np.vstack([here.slack_slopes, np.eye(n), -np.eye(n)])
    breach = np.maximum(-slacks, 0.0)
    for share in (1.0, 0.5, 0.1, 0.0):  # of the breach of limits that this step is to mend
        least = np.r_[np.where(breach > 0.0, share * breach, -slacks), low, -high]
        solution = least_quadratic(here.slope, _bend(here, multipliers), rows, least)
        if solution is not None:
            return solution[0], solution[1][: len(breach)]
    return np.zeros(n), multipliers


def _bend(here: _Local, multipliers: np.ndarray) -> np.ndarray:
    """Curvature (n, n) of the Lagrangian."""
    return here.curvature - np.tensordot(multipliers, here.slack_curvatures, 1)


def _hoped(here: _Local, step: np.ndarray, multipliers: np.ndarray, weights: np.ndarray) -> float:
    """What a step should gain by the local model, breach of limits included."""
    fall = -(here.slope @ step + 0.5 * step @ _bend(here, multipliers) @ step)
    left = float(weights @ np.maximum(-(here.slacks + here.slack_slopes @ step), 0.0))
    return float(fall) + here.breach(weights) - left

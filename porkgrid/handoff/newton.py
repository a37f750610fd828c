"""Solve as many equations as unknowns by Newton's method, damped so that far starts get there too.

A step of length λ is taken if the next simplified step, J(x)⁻¹ F(x + λ Δx), is shorter than (1 − λ/4) |Δx|:
the natural monotonicity test, which no scaling of the equations can mislead (Deuflhard, Newton Methods for
Nonlinear Problems, section 3.3; memory).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
_LEAST_DAMPING = 1.0 / 64.0


@dataclass(frozen=True, eq=False)
class Linear:
    """A function of x, near x: value (n,) and Jacobian (n, n)."""

    value: Floats
    jacobian: Floats


@dataclass(frozen=True)
class Iteration:
    """One step of the way: the misses before it, and the damping λ that it was taken with (0: none taken)."""

    misses: tuple[float, ...]
    damping: float


@dataclass(frozen=True, eq=False)
class Solution:
    """Where Newton's method came to, whether that is a solution, and the way there."""

    x: Floats
    converged: bool
    history: tuple[Iteration, ...]
    ended: str  # in words


def solve(
    linearise: Callable[[Floats], Linear | None],
    misses: Callable[[Floats], tuple[float, ...]],
    x: Floats,
    tolerances: tuple[float, ...],
    most: int,
) -> Solution:
    """Find the zero of `linearise` from x (n,), until every one of `misses` of its value is under tolerance.

    The unknowns should be of one size. `linearise` gives None where it is not defined.
    """
    history: list[Iteration] = []
    here = linearise(x)
    if here is None:
        return Solution(x, False, (), "the first guess cannot be flown")
    for _ in range(most):
        now = misses(here.value)
        if all(miss <= limit for miss, limit in zip(now, tolerances, strict=True)):
            history.append(Iteration(now, 0.0))
            return Solution(_polished(linearise, here, x), True, tuple(history), "converged")
        found = _damped_step(linearise, here, x)
        if found is None:
            history.append(Iteration(now, 0.0))
            return Solution(x, False, tuple(history), "no step of any length leads closer")
        x, here, damping = found
        history.append(Iteration(now, damping))
    history.append(Iteration(misses(here.value), 0.0))
    return Solution(x, False, tuple(history), f"not converged in {most} iterations")


def _polished(linearise: Callable[[Floats], Linear | None], here: Linear, x: Floats) -> Floats:
    """One step more from a solution, kept where it leads closer still: near it a step squares the miss."""
    on = x + _newton_step(here, here.value)
    there = linearise(on)
    closer = there is not None and _length(there.value) < _length(here.value)
    return on if closer else x


def _damped_step(
    linearise: Callable[[Floats], Linear | None], here: Linear, x: Floats
) -> tuple[Floats, Linear, float] | None:
    full = _newton_step(here, here.value)
    length, damping = _length(full), 1.0
    while damping >= _LEAST_DAMPING:
        there = linearise(x + damping * full)
        if there is not None and _length(_newton_step(here, there.value)) <= (1.0 - 0.25 * damping) * length:
            return x + damping * full, there, damping
        damping *= 0.5
    return None


def _newton_step(here: Linear, value: Floats) -> Floats:
    return np.asarray(np.linalg.lstsq(here.jacobian, -value, rcond=None)[0], dtype=np.float64)


def _length(vector: Floats) -> float:
    return float(np.linalg.norm(vector))

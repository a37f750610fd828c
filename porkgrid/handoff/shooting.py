"""Multiple shooting: fly every leg from both of its ends, and join the halves in the middle.

The unknowns are the excess velocities at the encounters and the shifts of the flybys' epochs (stops.py); the
equations are that place and velocity agree where the halves of a leg meet, and one condition per flyby. So
patched conics are the first guess, and what is found compares with them number by number.

Source: Stoer and Bulirsch, Introduction to Numerical Analysis, section 7.3.5 (memory).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial

import numpy as np
from numpy.typing import NDArray

from porkgrid.handoff.flights import Outset, carry_with_sensitivity, rate
from porkgrid.handoff.forces import Forces
from porkgrid.handoff.newton import Linear, Solution, solve
from porkgrid.handoff.stops import (
    Pass,
    Stop,
    arriving,
    epoch_s,
    free_numbers,
    leaving,
    off_condition,
)  # fmt: skip
from porkgrid.physics.constants import AU_KM, DAY_S
from porkgrid.physics.nbody import FlightError

Floats = NDArray[np.float64]

# The joints, and the flybys' conditions (km/s, radii or days, whichever is held).
TOLERANCE_KM, TOLERANCE_KM_S, TOLERANCE_HELD = 0.1, 1e-8, 1e-7
MOST_ITERATIONS = 15

_SPEED_UNIT_KM_S = 30.0
_DIFFERENCE = 1e-5  # relative step of the numeric derivatives of formulas; central, so 1e-10 off


@dataclass(frozen=True, eq=False)
class Problem:
    """A route to be joined: its encounters in flying order, in a field of forces."""

    forces: Forces
    stops: tuple[Stop, ...]

    def blocks(self, x: Floats) -> list[Floats]:
        """The unknowns of every stop."""
        return np.split(x, np.cumsum([free_numbers(stop) for stop in self.stops])[:-1])

    def meeting_s(self, leg: int) -> float:
        """When the halves of a leg meet: half-way between the candidate's epochs."""
        return 0.5 * (self.stops[leg].t_s + self.stops[leg + 1].t_s)


def join(problem: Problem, x: Floats) -> Solution:
    """Solve from a first guess x. A route that cannot be joined comes back as not converged."""
    legs = len(problem.stops) - 1

    def try_at(x: Floats) -> Linear | None:
        try:
            return linearise(problem, x)
        except FlightError:
            return None

    def misses(value: Floats) -> tuple[float, ...]:
        joints = value[: 6 * legs].reshape(legs, 2, 3)
        km, km_s = np.linalg.norm(joints, axis=2).max(axis=0) * (AU_KM, _SPEED_UNIT_KM_S)
        return float(km), float(km_s), float(np.abs(value[6 * legs :]).max(initial=0.0))

    tolerances = (TOLERANCE_KM, TOLERANCE_KM_S, TOLERANCE_HELD)
    return solve(try_at, misses, x, tolerances, MOST_ITERATIONS)


def linearise(problem: Problem, x: Floats) -> Linear:
    """Mismatches of the joints in au and units of speed, then those of the flybys; and their derivatives."""
    blocks = problem.blocks(x)
    ends = np.cumsum([0, *map(len, blocks)])
    legs, passes = len(blocks) - 1, [(k, one) for k, one in enumerate(problem.stops) if isinstance(one, Pass)]
    value, jacobian = np.zeros(6 * legs + len(passes)), np.zeros((6 * legs + len(passes), x.size))
    unit = np.repeat([AU_KM, _SPEED_UNIT_KM_S], 3)
    for leg in range(legs):
        rows = slice(6 * leg, 6 * leg + 6)
        for k, of_body, sign in ((leg, leaving, 1.0), (leg + 1, arriving, -1.0)):
            met, slope = _half_leg(problem, k, blocks[k], problem.meeting_s(leg), of_body)
            value[rows] += sign * met / unit
            jacobian[rows, ends[k] : ends[k + 1]] = sign * slope / unit[:, None]
    for row, (k, passed) in enumerate(passes, start=6 * legs):
        off = partial(off_condition, passed)
        value[row] = off(blocks[k])
        jacobian[row, ends[k] : ends[k + 1]] = _slope(off, blocks[k])
    return Linear(value, jacobian)


def _half_leg(
    problem: Problem, k: int, free: Floats, until_s: float, of_body: Callable[[Stop, Floats], Floats]
) -> tuple[Floats, Floats]:
    """State (6,) where the half of a leg that begins at stop k ends, and its slope by the stop's unknowns."""
    stop = problem.stops[k]
    relative = of_body(stop, free)
    flight = Outset(stop.body, epoch_s(stop, free), relative)
    end, sensitivity = carry_with_sensitivity(problem.forces, flight, until_s)
    slope = sensitivity @ _slope(partial(of_body, stop), free)
    if isinstance(stop, Pass):
        # What starts later is further back on its path: −y' of the state from the body.
        slope[:, 6] = -sensitivity @ rate(problem.forces, flight) * DAY_S
    return end, slope


def _slope(function: Callable[[Floats], Floats | float], free: Floats) -> Floats:
    """Derivative (..., n) by central differences."""
    columns = []
    for k, number in enumerate(free):
        step = np.zeros_like(free)
        step[k] = _DIFFERENCE * max(1.0, abs(number))
        ahead, behind = np.asarray(function(free + step)), np.asarray(function(free - step))
        columns.append((ahead - behind) / (2.0 * step[k]))
    return np.stack(columns, axis=-1)

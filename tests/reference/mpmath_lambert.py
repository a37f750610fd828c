"""Solve Lambert's problem to 50 digits, slowly: the judge of the fast solver.

Universal variables (mpmath_flight), unknown z = ΔE². The inputs are taken as the exact numbers that the
doubles are. The root is bracketed at 50 digits, so nothing depends on a good start.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from mpmath_flight import (
    Geometry,
    Vector,
    cross,
    distance,
    dot,
    make_geometry,
    mp,
    norm,
    stumpff,
    time,
    time_from,
    time_slope,
    velocities,
    y_of,
)

NUDGE = mp.mpf(10) ** -25  # half the digits: finite differences good to 25 digits
OBLIQUITY = math.radians(84381.448 / 3600)  # IAU 1976, as SPICE's ECLIPJ2000
ECLIPTIC_POLE_ICRF = (0.0, -math.sin(OBLIQUITY), math.cos(OBLIQUITY))


@dataclass(frozen=True)
class Transfer:
    """Velocities (three mpf each, units of the inputs) and how sensitive they are.

    ``condition1``, ``condition2``: the most that v1, v2 can change, relative to their size, per unit of
    relative change of every input at once (each vector perturbed by that fraction of its length along each
    axis, the time and gm by that fraction of themselves).  Rounding the inputs to doubles alone may cost
    condition · 1.1e-16.
    """

    v1: Vector
    v2: Vector
    z: Any
    condition1: float
    condition2: float

    def errors(self, v1: np.ndarray, v2: np.ndarray) -> tuple[float, float]:
        """Relative error of a double-precision answer, each velocity against its own length."""
        return _relative_error(v1, self.v1), _relative_error(v2, self.v2)


def solve(
    r1, r2, tof, gm, revs=0, branch="left", retrograde=False, pole=ECLIPTIC_POLE_ICRF
) -> Transfer | None:
    """Solve for one transfer; None where N revolutions do not fit or the plane is undefined.

    ``branch`` "left" is the root with the larger z (more ΔE beyond the full revolutions), "right" the other.
    """
    geometry = _geometry(r1, r2, gm, retrograde, pole)
    if geometry is None:
        return None
    flight = mp.mpf(float(tof))
    bracket = _bracket(geometry, flight, revs, branch)
    if bracket is None:
        return None
    start = _rough_root(geometry, flight, *bracket)
    z = _root(lambda z: _log_time_excess(geometry, flight, z), *bracket, start)
    return _transfer(geometry, flight, z)


def least_time(r1, r2, gm, revs, retrograde=False, pole=ECLIPTIC_POLE_ICRF):
    """Return the least flight time (mpf) for N >= 1 revolutions."""
    geometry = _geometry(r1, r2, gm, retrograde, pole)
    if geometry is None:
        raise ValueError("r1 and r2 span no plane")
    return time(geometry, _exact_least_time_z(geometry, revs))


def _geometry(r1, r2, gm, retrograde, pole) -> Geometry | None:
    r1, r2 = ([mp.mpf(float(x)) for x in r] for r in (r1, r2))
    normal = cross(r1, r2)
    if not any(normal):
        return None
    up = dot(normal, [mp.mpf(float(x)) for x in pole])
    sign = -1 if (up < 0) != retrograde else 1
    return make_geometry(r1, r2, mp.mpf(float(gm)), sign)


def _log_time_excess(g: Geometry, flight, z) -> tuple[Any, Any]:
    """ln(t(z)/flight) and its slope; the logarithm tames both ends, where t is 0 or infinite."""
    c, s = stumpff(z)
    y = y_of(g, z, c, s)
    if y <= 0:
        return mp.mpf("-inf"), mp.mpf(0)
    t = time_from(g, y, c, s)
    return mp.log(t / flight), time_slope(g, z, y, c, s) / t


def _bracket(g: Geometry, flight, revs: int, branch: str) -> tuple[Any, Any] | None:
    """Two z with the flight time between theirs: (too short, too long)."""
    ceiling = (2 * mp.pi * (revs + 1)) ** 2
    if revs == 0:
        return _shorter_end(g, flight), ceiling
    middle = mp.mpf(_rough_least_time_z(g, revs))
    if time(g, middle) >= flight:  # too short, or so near the least time that doubles cannot tell
        middle = _exact_least_time_z(g, revs)
    if time(g, middle) >= flight:
        return None
    return middle, (ceiling if branch == "left" else (2 * mp.pi * revs) ** 2)


def _shorter_end(g: Geometry, flight):
    """A z whose flight is too short: where y = 0, or for θ > 180° some way down the hyperbolas."""
    if g.a > 0:
        return -((2 * mp.acosh(g.total / (mp.sqrt(2) * g.a))) ** 2)
    z = mp.mpf(-1)
    while time(g, z) > flight:
        z *= 4
    return z


def _exact_least_time_z(g: Geometry, revs: int):
    """The z of least time for N >= 1: dt/dz changes sign once, near where doubles put it."""

    def slope(z):
        c, s = stumpff(z)
        return time_slope(g, z, y_of(g, z, c, s), c, s)

    floor, ceiling = (2 * mp.pi * revs) ** 2, (2 * mp.pi * (revs + 1)) ** 2
    middle = mp.mpf(_rough_least_time_z(g, revs))
    reach = mp.mpf(10) ** -7
    low, high = middle - (middle - floor) * reach, middle + (ceiling - middle) * reach
    while slope(low) > 0:
        low = floor + (low - floor) / 2
    while slope(high) < 0:
        high = ceiling - (ceiling - high) / 2
    return mp.findroot(
        slope, (low, high), solver="anderson", tol=mp.mpf(10) ** -80, verify=False, maxsteps=40
    )


def _rough_time(total: float, a: float, z: float) -> float:
    """The flight time in doubles, for gm = 1; good enough to start from, no better."""
    if abs(z) < 1e-2:
        c, s = 0.5 - z / 24 + z * z / 720, 1 / 6 - z / 120 + z * z / 5040
    elif z > 0:
        root = math.sqrt(z)
        c, s = 2 * math.sin(root / 2) ** 2 / z, (1 - math.sin(root) / root) / z
    else:
        root = math.sqrt(-z)
        c, s = (math.cosh(root) - 1) / -z, (math.sinh(root) / root - 1) / -z
    y = total + a * (z * s - 1) / math.sqrt(max(c, 1e-300))
    return (y / max(c, 1e-300)) ** 1.5 * s + a * math.sqrt(y) if y > 0 else 0.0


def _rough_root(g: Geometry, flight, short, long):
    """Bisect in doubles between two z."""
    total, a, wanted = float(g.total), float(g.a), float(flight * mp.sqrt(g.gm))
    low, high = float(short), float(long)
    for _ in range(50):
        middle = (low + high) / 2
        low, high = (middle, high) if _rough_time(total, a, middle) < wanted else (low, middle)
    return mp.mpf((low + high) / 2)


def _rough_least_time_z(g: Geometry, revs: int) -> float:
    """Narrow the interval of the one minimum by thirds, in doubles."""
    total, a = float(g.total), float(g.a)
    low, high = (2 * math.pi * revs) ** 2, (2 * math.pi * (revs + 1)) ** 2
    for _ in range(60):
        third = (high - low) / 3
        if _rough_time(total, a, low + third) < _rough_time(total, a, high - third):
            high -= third
        else:
            low += third
    return (low + high) / 2


def _root(f: Callable[[Any], tuple[Any, Any]], short, long, start):
    """Newton steps kept inside the bracket, which every step narrows; bisection when a step leaves it.

    Ends of the domain, where f is infinite, may be given as the bracket: they are never evaluated.
    """
    z = start if min(short, long) < start < max(short, long) else (short + long) / 2
    small = abs(short - long) * mp.mpf(10) ** -35  # Newton squares the error: then all digits are there
    for _ in range(400):
        value, slope = f(z)
        if value == 0:
            return z
        if value < 0:
            short = z
        else:
            long = z
        step = value / slope if slope else mp.inf
        trial = z - step
        if not min(short, long) < trial < max(short, long):
            trial = (short + long) / 2
        if abs(trial - z) <= small:
            return trial
        z = trial
    raise ArithmeticError("the 50-digit root search did not end")


def _transfer(g: Geometry, flight, z) -> Transfer:
    c, s = stumpff(z)
    y = y_of(g, z, c, s)
    v1, v2 = velocities(g, y)
    slope = time_slope(g, z, y, c, s)
    shape, shape_slope = (z * s - 1) / mp.sqrt(c), mp.sqrt(c) / 4
    moved1 = moved2 = mp.mpf(0)
    for nudged, wanted in _nudged(g, flight):
        # One Newton step from the root is exact to the square of the nudge.
        dz = (wanted - time_from(nudged, nudged.total + nudged.a * shape, c, s)) / slope
        w1, w2 = velocities(nudged, nudged.total + nudged.a * (shape + shape_slope * dz))
        moved1 += distance(w1, v1)
        moved2 += distance(w2, v2)
    return Transfer(v1, v2, z, float(moved1 / norm(v1) / NUDGE), float(moved2 / norm(v2) / NUDGE))


def _nudged(g: Geometry, flight):
    """The problem with each input moved a little in turn, as (geometry, flight time)."""
    sign = 1 if g.a > 0 else -1
    for axis in range(3):
        for which, length in ((0, g.n1), (1, g.n2)):
            vectors = [list(g.r1), list(g.r2)]
            vectors[which][axis] += NUDGE * length
            yield make_geometry(vectors[0], vectors[1], g.gm, sign), flight
    yield g, flight * (1 + NUDGE)
    yield make_geometry(g.r1, g.r2, g.gm * (1 + NUDGE), sign), flight


def _relative_error(found: np.ndarray, exact: Vector) -> float:
    if not np.isfinite(found).all():
        return math.inf
    return float(distance([mp.mpf(float(x)) for x in found], exact) / norm(exact))

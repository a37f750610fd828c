"""Solve Lambert's problem to 50 digits, slowly: the judge of the fast solver.

Universal variables with Stumpff functions (Curtis, Orbital Mechanics for Engineering Students, section 5.3;
Bate, Mueller and White, section 5.3), unknown z = ΔE² (negative on hyperbolas).  The inputs are taken as the
exact numbers that the doubles are.  The root is bracketed at 50 digits, so nothing depends on a good start.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import mpmath
import numpy as np

mp = mpmath.MPContext()  # our own context: no other code's precision is touched
mp.dps = 50

SERIES_WITHIN = 1.0  # |z| below which the Stumpff functions are summed; beyond it their closed forms keep > 45 digits
SERIES_TERMS = 24  # 1/(2·24+2)! < 1e-64
NUDGE = mp.mpf(10) ** -25  # half the digits: finite differences good to 25 digits
ECLIPTIC_POLE_ICRF = (0.0, -math.sin(math.radians(84381.448 / 3600)), math.cos(math.radians(84381.448 / 3600)))

Vector = list[Any]  # of three mpf


@dataclass(frozen=True)
class Transfer:
    """Velocities (three mpf each, units of the inputs) and how sensitive they are.

    ``condition1``, ``condition2``: the most that v1, v2 can change, relative to their size, per unit of relative
    change of every input at once (each vector perturbed by that fraction of its length along each axis, the
    time and gm by that fraction of themselves).  Rounding the inputs to doubles alone costs condition · 1.1e-16.
    """

    v1: Vector
    v2: Vector
    z: Any
    condition1: float
    condition2: float

    def errors(self, v1: np.ndarray, v2: np.ndarray) -> tuple[float, float]:
        """Relative error of a double-precision answer, each velocity against its own length."""
        return _relative_error(v1, self.v1), _relative_error(v2, self.v2)


@dataclass(frozen=True)
class _Geometry:
    r1: Vector
    r2: Vector
    n1: Any
    n2: Any
    total: Any  # |r1| + |r2|
    a: Any  # A = ± sqrt(|r1||r2| + r1·r2), + for θ < 180°
    gm: Any


def solve(r1, r2, tof, gm, revs=0, branch="left", retrograde=False, pole=ECLIPTIC_POLE_ICRF) -> Transfer | None:
    """Solve for one transfer; None where N revolutions do not fit or the plane is undefined.

    ``branch`` "left" is the root with the larger z (larger ΔE beyond the full revolutions), "right" the smaller.
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
    return _time(geometry, _exact_least_time_z(geometry, revs))


def _geometry(r1, r2, gm, retrograde, pole) -> _Geometry | None:
    r1, r2 = ([mp.mpf(float(x)) for x in r] for r in (r1, r2))
    normal = _cross(r1, r2)
    if not any(normal):
        return None
    up = _dot(normal, [mp.mpf(float(x)) for x in pole])
    sign = -1 if (up < 0) != retrograde else 1
    return _make_geometry(r1, r2, mp.mpf(float(gm)), sign)


def _make_geometry(r1: Vector, r2: Vector, gm, sign: int) -> _Geometry:
    n1, n2 = mp.sqrt(_dot(r1, r1)), mp.sqrt(_dot(r2, r2))
    return _Geometry(r1, r2, n1, n2, n1 + n2, sign * mp.sqrt(n1 * n2 + _dot(r1, r2)), gm)


def _stumpff(z) -> tuple[Any, Any]:
    """C(z) = (1 - cos √z)/z and S(z) = (√z - sin √z)/√z³, with their analytic continuation to z <= 0."""
    if abs(z) < SERIES_WITHIN:
        c = s = mp.mpf(0)
        term = mp.mpf(1) / 2
        for k in range(SERIES_TERMS):  # term = (-z)^k / (2k + 2)!
            c += term
            term /= 2 * k + 3
            s += term
            term *= -z / (2 * k + 4)
        return c, s
    if z > 0:
        root = mp.sqrt(z)
        cos, sin = mp.cos_sin(root / 2)
        return 2 * sin * sin / z, (1 - 2 * sin * cos / root) / z
    root = mp.sqrt(-z)
    grown = mp.exp(root)
    return ((grown + 1 / grown) / 2 - 1) / -z, ((grown - 1 / grown) / (2 * root) - 1) / -z


def _y(g: _Geometry, z, c, s):
    return g.total + g.a * (z * s - 1) / mp.sqrt(c)


def _time(g: _Geometry, z):
    """Flight time t(z), Curtis eq. 5.40."""
    c, s = _stumpff(z)
    y = _y(g, z, c, s)
    return _time_from(g, y, c, s) if y > 0 else mp.mpf(0)


def _time_from(g: _Geometry, y, c, s):
    ratio = y / c
    return (ratio * mp.sqrt(ratio) * s + g.a * mp.sqrt(y)) / mp.sqrt(g.gm)


def _time_slope(g: _Geometry, z, y, c, s):
    """dt/dz; with dC/dz and dS/dz from the Stumpff identities and dy/dz = A √C / 4."""
    dy = g.a * mp.sqrt(c) / 4
    if abs(z) < SERIES_WITHIN:
        dc, ds = _stumpff_slopes(z)
    else:
        dc, ds = (1 - z * s - 2 * c) / (2 * z), (c - 3 * s) / (2 * z)
    ratio = y / c
    d_ratio = (dy - ratio * dc) / c
    root = mp.sqrt(ratio)
    return (1.5 * root * d_ratio * s + ratio * root * ds + g.a * dy / (2 * mp.sqrt(y))) / mp.sqrt(g.gm)


def _stumpff_slopes(z) -> tuple[Any, Any]:
    dc = ds = mp.mpf(0)
    term = mp.mpf(-1) / 24
    for k in range(1, SERIES_TERMS):  # term = d/dz of (-z)^k / (2k + 2)!, over k
        dc += k * term
        term /= 2 * k + 3
        ds += k * term
        term *= -z / (2 * k + 4)
    return dc, ds


def _log_time_excess(g: _Geometry, flight, z) -> tuple[Any, Any]:
    """ln(t(z)/flight) and its slope; the logarithm tames both ends, where t is 0 or infinite."""
    c, s = _stumpff(z)
    y = _y(g, z, c, s)
    if y <= 0:
        return mp.mpf("-inf"), mp.mpf(0)
    t = _time_from(g, y, c, s)
    return mp.log(t / flight), _time_slope(g, z, y, c, s) / t


def _bracket(g: _Geometry, flight, revs: int, branch: str) -> tuple[Any, Any] | None:
    """Two z with the flight time between theirs: (too short, too long)."""
    ceiling = (2 * mp.pi * (revs + 1)) ** 2
    if revs == 0:
        return _shorter_end(g, flight), ceiling
    middle = mp.mpf(_rough_least_time_z(g, revs))
    if _time(g, middle) >= flight:  # too short, or so near the least time that doubles cannot tell
        middle = _exact_least_time_z(g, revs)
    if _time(g, middle) >= flight:
        return None
    return middle, (ceiling if branch == "left" else (2 * mp.pi * revs) ** 2)


def _shorter_end(g: _Geometry, flight):
    """A z whose flight is too short: where y = 0, or for θ > 180° some way down the hyperbolas."""
    if g.a > 0:
        return -((2 * mp.acosh(g.total / (mp.sqrt(2) * g.a))) ** 2)
    z = mp.mpf(-1)
    while _time(g, z) > flight:
        z *= 4
    return z


def _exact_least_time_z(g: _Geometry, revs: int):
    """The z of least time for N >= 1: dt/dz changes sign once, near where doubles put it."""

    def slope(z):
        c, s = _stumpff(z)
        return _time_slope(g, z, _y(g, z, c, s), c, s)

    floor, ceiling = (2 * mp.pi * revs) ** 2, (2 * mp.pi * (revs + 1)) ** 2
    middle = mp.mpf(_rough_least_time_z(g, revs))
    reach = mp.mpf(10) ** -7
    low, high = middle - (middle - floor) * reach, middle + (ceiling - middle) * reach
    while slope(low) > 0:
        low = floor + (low - floor) / 2
    while slope(high) < 0:
        high = ceiling - (ceiling - high) / 2
    return mp.findroot(slope, (low, high), solver="anderson", tol=mp.mpf(10) ** -80, verify=False, maxsteps=40)


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


def _rough_root(g: _Geometry, flight, short, long):
    """Bisect in doubles between two z."""
    total, a, wanted = float(g.total), float(g.a), float(flight * mp.sqrt(g.gm))
    low, high = float(short), float(long)
    for _ in range(50):
        middle = (low + high) / 2
        low, high = (middle, high) if _rough_time(total, a, middle) < wanted else (low, middle)
    return mp.mpf((low + high) / 2)


def _rough_least_time_z(g: _Geometry, revs: int) -> float:
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
    small = abs(short - long) * mp.mpf(10) ** -35  # Newton squares the error: the next step has all the digits
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


def _velocities(g: _Geometry, y) -> tuple[Vector, Vector]:
    f, g_dot, g_lag = 1 - y / g.n1, 1 - y / g.n2, g.a * mp.sqrt(y / g.gm)
    v1 = [(b - f * a) / g_lag for a, b in zip(g.r1, g.r2, strict=True)]
    v2 = [(g_dot * b - a) / g_lag for a, b in zip(g.r1, g.r2, strict=True)]
    return v1, v2


def _transfer(g: _Geometry, flight, z) -> Transfer:
    c, s = _stumpff(z)
    y = _y(g, z, c, s)
    v1, v2 = _velocities(g, y)
    slope = _time_slope(g, z, y, c, s)
    shape, shape_slope = (z * s - 1) / mp.sqrt(c), mp.sqrt(c) / 4
    moved1 = moved2 = mp.mpf(0)
    for nudged, wanted in _nudged(g, flight):
        # One Newton step from the root is exact to the square of the nudge.
        dz = (wanted - _time_from(nudged, nudged.total + nudged.a * shape, c, s)) / slope
        w1, w2 = _velocities(nudged, nudged.total + nudged.a * (shape + shape_slope * dz))
        moved1 += _distance(w1, v1)
        moved2 += _distance(w2, v2)
    return Transfer(v1, v2, z, float(moved1 / _norm(v1) / NUDGE), float(moved2 / _norm(v2) / NUDGE))


def _nudged(g: _Geometry, flight):
    """The problem with each input moved a little in turn, as (geometry, flight time)."""
    sign = 1 if g.a > 0 else -1
    for axis in range(3):
        for which, length in ((0, g.n1), (1, g.n2)):
            vectors = [list(g.r1), list(g.r2)]
            vectors[which][axis] += NUDGE * length
            yield _make_geometry(*vectors, g.gm, sign), flight
    yield g, flight * (1 + NUDGE)
    yield _make_geometry(g.r1, g.r2, g.gm * (1 + NUDGE), sign), flight


def _dot(a: Vector, b: Vector):
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2]


def _cross(a: Vector, b: Vector) -> Vector:
    return [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]]


def _norm(a: Vector):
    return mp.sqrt(_dot(a, a))


def _distance(a: Vector, b: Vector):
    return _norm([x - y for x, y in zip(a, b, strict=True)])


def _relative_error(found: np.ndarray, exact: Vector) -> float:
    if not np.isfinite(found).all():
        return math.inf
    return float(_distance([mp.mpf(float(x)) for x in found], exact) / _norm(exact))

"""Time of flight on a conic through two points, to 50 digits, in universal variables.

Stumpff functions and the equation of Curtis, Orbital Mechanics for Engineering Students, section 5.3 (Bate,
Mueller and White, section 5.3); z = ΔE², negative on hyperbolas.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import mpmath

mp = mpmath.MPContext()  # our own context: no other code's precision is touched
mp.dps = 50

SERIES_WITHIN = 1.0  # |z| below which the Stumpff functions are summed; beyond, closed forms keep > 45 digits
SERIES_TERMS = 24  # 1/(2·24+2)! < 1e-64

Vector = list[Any]  # of three mpf


@dataclass(frozen=True)
class Geometry:
    """Two positions, their lengths, and the constant A that holds the angle and the way round."""

    r1: Vector
    r2: Vector
    n1: Any
    n2: Any
    total: Any  # |r1| + |r2|
    a: Any  # A = ± sqrt(|r1||r2| + r1·r2), + for θ < 180°
    gm: Any


def make_geometry(r1: Vector, r2: Vector, gm, sign: int) -> Geometry:
    """Measure two positions; sign is + for θ < 180°, - for the long way."""
    n1, n2 = mp.sqrt(dot(r1, r1)), mp.sqrt(dot(r2, r2))
    return Geometry(r1, r2, n1, n2, n1 + n2, sign * mp.sqrt(n1 * n2 + dot(r1, r2)), gm)


def stumpff(z) -> tuple[Any, Any]:
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


def y_of(g: Geometry, z, c, s):
    """y(z), Curtis eq. 5.38; it must be positive."""
    return g.total + g.a * (z * s - 1) / mp.sqrt(c)


def time(g: Geometry, z):
    """Flight time t(z), Curtis eq. 5.40."""
    c, s = stumpff(z)
    y = y_of(g, z, c, s)
    return time_from(g, y, c, s) if y > 0 else mp.mpf(0)


def time_from(g: Geometry, y, c, s):
    """Flight time where y, C and S are known."""
    ratio = y / c
    return (ratio * mp.sqrt(ratio) * s + g.a * mp.sqrt(y)) / mp.sqrt(g.gm)


def time_slope(g: Geometry, z, y, c, s):
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


def velocities(g: Geometry, y) -> tuple[Vector, Vector]:
    """v1 and v2 by the Lagrange coefficients, Curtis eq. 5.46."""
    f, g_dot, g_lag = 1 - y / g.n1, 1 - y / g.n2, g.a * mp.sqrt(y / g.gm)
    v1 = [(b - f * a) / g_lag for a, b in zip(g.r1, g.r2, strict=True)]
    v2 = [(g_dot * b - a) / g_lag for a, b in zip(g.r1, g.r2, strict=True)]
    return v1, v2


def dot(a: Vector, b: Vector):
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2]


def cross(a: Vector, b: Vector) -> Vector:
    return [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]]


def norm(a: Vector):
    return mp.sqrt(dot(a, a))


def distance(a: Vector, b: Vector):
    return norm([x - y for x, y in zip(a, b, strict=True)])

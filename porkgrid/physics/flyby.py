"""One flyby: a hyperbola about a planet, unpowered or with a burn at its periapsis.

With a = |v∞ in|, b = |v∞ out|, δ the angle between them and y = r_p/GM:

    sin δ₁ = 1/(1 + a²y),  sin δ₂ = 1/(1 + b²y),  δ = δ₁ + δ₂            half-turns before and after periapsis
    burn = | sqrt(b² + 2/y) − sqrt(a² + 2/y) |                           along the velocity, at periapsis

(patched conics; any astrodynamics text for a = b, and Prado 1996 or Battin for the two halves). δ falls as y
grows, so y is unique; the burn for given a and b rises with y, from 0 to |b − a|.

Vectors have their components first, (3, ...), and broadcast; km, km/s, radians, GM in km³/s².
"""

from __future__ import annotations

import math

from numba import njit

from porkgrid.physics.timeflight import ROW

# Newton steps that settle y to the last digits from the start below (tests/physics/test_flyby.py).
NEWTON_STEPS = 4


@njit(**ROW, inline="always")
def half_turn(v2y):
    """Sine and cosine of the half-turn of a hyperbola with v∞² r_p/GM = v2y."""
    e = 1.0 + v2y
    s = 1.0 / e
    return s, math.sqrt(v2y * (2.0 + v2y)) * s


@njit(**ROW, inline="always")
def periapsis_start(a2, b2, cosine):
    """y for which a hyperbola with the mean of a² and b² turns by δ; exact for a = b."""
    sine_half = math.sqrt(max(0.5 * (1.0 - cosine), 1e-30))
    return 2.0 * (1.0 - sine_half) / (sine_half * (a2 + b2))


@njit(**ROW, inline="always")
def periapsis_step(a2, b2, cosine, y):
    """One Newton step on ln y for cos(δ₁ + δ₂) = cos δ."""
    s1, c1 = half_turn(a2 * y)
    s2, c2 = half_turn(b2 * y)
    miss = (c1 * c2 - s1 * s2) - cosine
    slope = (s1 * c2 + c1 * s2) * (a2 * s1 * s1 * c2 + b2 * s2 * s2 * c1)
    return y * math.exp(0.0) - miss * c1 * c2 / slope


@njit(**ROW, inline="always")
def burn_at(a2, b2, y):
    """Burn at periapsis, without cancellation for a ≈ b."""
    w = 2.0 / y
    return abs(b2 - a2) / (math.sqrt(b2 + w) + math.sqrt(a2 + w))

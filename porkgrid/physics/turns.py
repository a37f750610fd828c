"""The periapsis of a flyby that turns by a given angle: the kernels that joins of legs run.

With a = |v∞ in|, b = |v∞ out|, δ the angle between them and y = r_p/GM:

    sin δ₁ = 1/(1 + a²y),  sin δ₂ = 1/(1 + b²y),  δ = δ₁ + δ₂         half-turns before and after periapsis
    burn = | sqrt(b² + 2/y) − sqrt(a² + 2/y) |                        along the velocity, at periapsis

δ falls as y grows, so y is unique; for given a and b the burn grows with y, from 0 to |b − a|. Of a hyperbola
with a = b, 1/sin(δ/2) = 1 + a²y: Newton's method on 1/sin(δ/2), which is then linear in y and nearly so for
a ≠ b, settles in three steps from y = (1/sin(δ/2) − 1)/(ab).
"""

from __future__ import annotations

import math

from numba import njit

from porkgrid.physics.timeflight import ROW

# Under this sine of half the turn, y is past any distance at which patched conics mean something.
_LEAST_SINE = 1e-9


@njit(**ROW, inline="always")
def half_turn(v2y):
    """Sine and cosine of the half-turn of a hyperbola with v∞² r_p/GM = v2y."""
    s = 1.0 / (1.0 + v2y)
    return s, math.sqrt(v2y * (2.0 + v2y)) * s


@njit(**ROW, inline="always")
def periapsis_start(a2, b2, per_sine):
    """y of the hyperbola with v∞² = ab that turns by δ; per_sine = 1/sin(δ/2)."""
    return (per_sine - 1.0) / math.sqrt(a2 * b2)


@njit(**ROW, inline="always")
def periapsis_step(a2, b2, per_sine, y):
    """One Newton step on y."""
    s1, c1 = half_turn(a2 * y)
    s2, c2 = half_turn(b2 * y)
    cosine = c1 * c2 - s1 * s2
    sine_half = math.sqrt(max(0.5 - 0.5 * cosine, _LEAST_SINE * _LEAST_SINE))
    cosine_half = math.sqrt(max(0.5 + 0.5 * cosine, 0.0))
    # −dδ/dy = a² s₁²/c₁ + b² s₂²/c₂
    fall = (a2 * s1 * s1 * c2 + b2 * s2 * s2 * c1) / (c1 * c2)
    miss = sine_half * per_sine - 1.0
    new = y + 2.0 * sine_half * miss / (fall * cosine_half)
    return max(new, 0.1 * y)


@njit(**ROW, inline="always")
def periapsis(a2, b2, cosine):
    """y = r_p/GM of the flyby that turns by δ, given cos δ; settled for speeds within a factor of 2."""
    per_sine = 1.0 / math.sqrt(max(0.5 - 0.5 * cosine, _LEAST_SINE * _LEAST_SINE))
    y = periapsis_start(a2, b2, per_sine)
    y = periapsis_step(a2, b2, per_sine, y)
    y = periapsis_step(a2, b2, per_sine, y)
    return periapsis_step(a2, b2, per_sine, y)


@njit(**ROW, inline="always")
def burn_at(a2, b2, y):
    """Burn at periapsis, without cancellation for a ≈ b."""
    w = 2.0 / y
    return abs(b2 - a2) / (math.sqrt(b2 + w) + math.sqrt(a2 + w))

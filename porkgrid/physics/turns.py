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

from porkgrid.physics.timeflight import PLAIN, ROW

# Under this sine of half the turn, y is past any distance at which patched conics mean something.
_LEAST_SINE = 1e-9


@njit(**ROW, inline="always")
def periapsis_step(a2, b2, per_sine, y):
    """One Newton step on y."""
    x1, x2 = a2 * y, b2 * y
    r = 1.0 / ((1.0 + x1) * (1.0 + x2))
    s1, s2 = r * (1.0 + x2), r * (1.0 + x1)
    c1, c2 = math.sqrt(x1 * (2.0 + x1)) * s1, math.sqrt(x2 * (2.0 + x2)) * s2
    sine2_half = max(0.5 - 0.5 * (c1 * c2 - s1 * s2), _LEAST_SINE * _LEAST_SINE)
    miss = math.sqrt(sine2_half) * per_sine - 1.0
    # −dδ/dy = fall/(c₁c₂); the derivative of 1/sin(δ/2) by δ is −sin δ/(4 sin³(δ/2))
    fall = a2 * s1 * s1 * c2 + b2 * s2 * s2 * c1
    new = y + 4.0 * sine2_half * miss * c1 * c2 / (fall * (s1 * c2 + c1 * s2))
    return max(new, 0.1 * y)


@njit(**ROW, inline="always")
def periapsis(a2, b2, cosine):
    """y = r_p/GM of the flyby that turns by δ, given cos δ; settled for speeds within a factor of 3."""
    sine_half = math.sqrt(max(0.5 - 0.5 * cosine, _LEAST_SINE * _LEAST_SINE))
    mean = math.sqrt(a2 * b2)
    r = 1.0 / (sine_half * mean)
    per_sine = r * mean
    y = (1.0 - sine_half) * r
    y = periapsis_step(a2, b2, per_sine, y)
    y = periapsis_step(a2, b2, per_sine, y)
    return periapsis_step(a2, b2, per_sine, y)


@njit(**PLAIN)
def periapsis_far(a2, b2, cosine, y):
    """The same for speeds that differ more, from what `periapsis` made of it: steps until they are lost."""
    per_sine = 1.0 / math.sqrt(max(0.5 - 0.5 * cosine, _LEAST_SINE * _LEAST_SINE))
    for _ in range(60):
        new = periapsis_step(a2, b2, per_sine, y)
        if abs(new - y) < 1e-12 * y:
            break
        y = new
    return y


@njit(**ROW, inline="always")
def burn_at(a2, b2, y):
    """Burn at periapsis, without cancellation for a ≈ b."""
    w = 2.0 / y
    return abs(b2 - a2) / (math.sqrt(b2 + w) + math.sqrt(a2 + w))

"""The Lambert time equation: how long a transfer of given shape takes, and its inverse.

The cosine form of Arora and Russell (2013; "vercosine" in Russell 2022), scaled. With |r1|, |r2| the radii,
c the chord, R = |r1| + |r2|, θ the transfer angle:

    σ = ± sqrt(2 (|r1||r2| + r1·r2)) / R     + for θ < 180°, − for θ > 180°
    u = cos(ΔE/2) on an ellipse, cosh(ΔH/2) on a hyperbola, 1 on a parabola;   q = 1 + u > 0
    p = 1 − σu
    t = √2 · TOF / sqrt(R³/μ) = √p · (σ + p Φ(u)),      Φ = F + Nπ/(1 − u²)^(3/2) with N revolutions
    F(u) = (acos(u)/sqrt(1 − u²) − u)/(1 − u²),  F(1) = 2/3

δ = 1 − |σ| comes in from outside, computed without cancellation, so that p keeps its digits near
θ = 0 and 360°: p = a − σq with a = 1 + σ for σ > 0 and a = δ for σ < 0.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numba import njit

# No reassociation: δ and the compensated products rely on the order of operations.
ROW: dict[str, Any] = {
    "nogil": True,
    "cache": True,
    "error_model": "numpy",
    "fastmath": {"contract", "nsz", "arcp"},
}
PLAIN: dict[str, Any] = {"nogil": True, "cache": True, "error_model": "numpy"}

# F(w) on 0.7 <= w <= 1.4 as a polynomial in w − 1: interpolation at Chebyshev nodes in 40-digit arithmetic,
# 5.9e-16 relative (tests/physics/test_timeflight.py measures it against mpmath).
_C0, _C1, _C2, _C3, _C4 = (0.666666666666667, -0.39999999999999114, 0.22857142857112295,
                           -0.12698412698665737, 0.06926406931297546)  # fmt: skip
_C5, _C6, _C7, _C8, _C9 = (-0.03729603710707985, 0.019891216896475744, -0.010530650883718112,
                           0.005542533735712357, -0.0029031563855779047)  # fmt: skip
_C10, _C11, _C12, _C13, _C14 = (0.0015133560685193185, -0.0007868076488705766, 0.00041840284470617795,
                                -0.00022487810086257046, 8.369392232890001e-05)  # fmt: skip

# The same on 0.7 <= w <= 3 in (w − 1)/(w + 1), which puts F's singularity at infinity: 1.4e-16 relative,
# for one division more.
_D0, _D1, _D2 = 0.6666666666666667, -0.7999999999999992, 0.11428571428568292
_D3, _D4, _D5 = 0.012698412698017542, 0.003463203472342802, 0.0013320013738410408
_D6, _D7, _D8 = 0.0006215995856600642, 0.0003290824678420794, 0.00019057427413791725
_D9, _D10, _D11 = 0.00011779958102221992, 7.588174741474438e-05, 5.834308354618376e-05
_D12, _D13, _D14 = 3.4588035982012144e-05, -3.595427037425169e-05, 0.00023215004167027127
_D15, _D16 = -0.0002876413198481164, 0.000190127154533125

# Two half-angle steps bring u to within the polynomials' ranges up to here: w = 1.4 and w = 3.
U_MAX_ROW, U_MAX_WIDE = 16.0, 576.0

# The derivatives of F are had by dividing by 1 − u². So close to a parabola a step starts this far from it.
_OFF_PARABOLA = 1e-7

# Relative error of the time before the last Halley step below which that step has settled the root:
# its error is cubic in this one (tests/physics/test_timeflight.py measures it).
SETTLED = 2e-5

# A smaller p has lost digits to the subtraction p = a − σq; the one-by-one solver takes p as its unknown.
LEAST_P_ROW = 1e-3

# Seed and step of the inverse cube root, fitted together: 0.1 % at the most.
_CBRT_SEED, _CBRT_A, _CBRT_B = 0x553E069F, 1.38422271, 0.38610342

# F = 1/(u + κ): κ is ½ on a parabola and more by this at u = 0.
_KAPPA_RISE = 2.0 / math.pi - 0.5

HALF_PI_23 = math.pi ** (2 / 3) / 2


@njit(**ROW, inline="always")
def _near_one(w):
    """F(w) for 0.7 <= w <= 1.4."""
    x = w - 1.0
    # Estrin's order instead of Horner's: a third of the latency, and the row loops wait for latency
    x2 = x * x
    x4 = x2 * x2
    low = (_C0 + _C1 * x) + x2 * (_C2 + _C3 * x) + x4 * ((_C4 + _C5 * x) + x2 * (_C6 + _C7 * x))
    high = (_C8 + _C9 * x) + x2 * (_C10 + _C11 * x) + x4 * ((_C12 + _C13 * x) + x2 * _C14)
    return low + (x4 * x4) * high


@njit(**ROW, inline="always")
def _near_one_wide(w):
    """F(w) for 0.7 <= w <= 3."""
    x = (w - 1.0) / (w + 1.0)
    x2 = x * x
    x4 = x2 * x2
    x8 = x4 * x4
    low = (_D0 + _D1 * x) + x2 * (_D2 + _D3 * x) + x4 * ((_D4 + _D5 * x) + x2 * (_D6 + _D7 * x))
    high = (_D8 + _D9 * x) + x2 * (_D10 + _D11 * x) + x4 * ((_D12 + _D13 * x) + x2 * (_D14 + _D15 * x))
    return low + x8 * (high + x8 * _D16)


@njit(**ROW, inline="always")
def _half_angle_quotient(q, wide):
    """F(u) at u = q − 1 as (n, d): F = n/(d q); u up to U_MAX_ROW, or `wide` up to U_MAX_WIDE.

    F(u) = (2 + F(v)/v)/(4v²) with v = sqrt((1 + u)/2), taken twice.
    """
    v = math.sqrt(0.5 * q)
    w = math.sqrt(0.5 + 0.5 * v)
    doubled = 2.0 * w * (1.0 + v)
    return 2.0 * v * doubled + 2.0 * w + (_near_one_wide(w) if wide else _near_one(w)), 2.0 * v * doubled


@njit(**PLAIN)
def shape_function(q):
    """F(u) at u = q − 1 for any q > 0, by as many half-angle steps as it takes."""
    if q <= 1.0 + U_MAX_WIDE:
        numerator, rest = _half_angle_quotient(q, True)
        return numerator / (rest * q)
    v = math.sqrt(0.5 * q)
    return (2.0 + shape_function(1.0 + v) / v) / (2.0 * q)


@njit(**ROW, inline="always")
def _inverse_cube_root(x):
    """x^(−1/3) to 0.1 %: a seed from the exponent's bits and a step like Newton's, free of library calls."""
    high = np.float64(x).view(np.int64) >> 32
    seed = np.int64((_CBRT_SEED - ((high * 0x55555556) >> 32)) << 32).view(np.float64)
    return seed * (_CBRT_A - _CBRT_B * x * seed * seed * seed)


@njit(**ROW)
def start_row(sigma, delta, t, q):
    """Fill q with starting values for transfers without revolutions; within a few per cent.

    Hyperbolas, and ellipses with u > 0 for σ > 0.3: with F ≈ 1/(u + κ), κ between its known values, the time
    equation turns into a quadratic.
    Other ellipses: t ~ q^(−3/2) as q → 0, so with y = t^(−2/3) the quotient q/y (y/q for σ < −0.3) varies
    little; it is taken from a parabola in y through its known values at q = 0, u = 0 and u = 1.
    """
    for j in range(t.shape[0]):
        s, d, tj = sigma[j], delta[j], t[j]
        below = d if s > 0.0 else 1.0 - s  # 1 − σ
        above = 1.0 + s if s > 0.0 else d  # 1 + σ
        parabolic = math.sqrt(below) * (2.0 + s) * (1.0 / 3.0)

        middle = s + 0.5 * math.pi
        # x^(−1/3) of t, t(u = 0) and t(u = 1)
        ct = _inverse_cube_root(tj)
        c0 = _inverse_cube_root(middle)
        c1 = _inverse_cube_root(parabolic)

        hyperbola = tj < parabolic
        beyond = tj - parabolic
        rise = 0.225 - 0.375 * s if hyperbola else _KAPPA_RISE
        kappa = 0.5 + rise * beyond / (parabolic if hyperbola else middle - parabolic)
        k = 1.0 + s * kappa

        y, y0, y1 = ct * ct, c0 * c0, c1 * c1
        per_y0, per_y1 = middle * c0, parabolic * c1
        slope = above * HALF_PI_23  # dq/dy at q = 0
        flip = s < -0.3
        g0 = 1.0 if flip else slope
        d1 = ((y0 * slope if flip else per_y0) - g0) * per_y0
        d2 = ((0.5 * y1 * slope if flip else 2.0 * per_y1) - g0) * per_y1
        span = y1 - y0
        g = g0 * span + y * (d1 * span + (d2 - d1) * (y - y0))

        # one division for either way
        fast = hyperbola | ((s > 0.3) & (tj < middle))
        above_line = 2.0 * k * k if fast else y * (slope * span if flip else g)
        root = math.sqrt(s * s * k * k + 4.0 * tj * tj * k)
        below_line = s * k + root if fast else (g if flip else span)
        q[j] = above_line / below_line + (1.0 - kappa if fast else 0.0)


@njit(**ROW, inline="always")
def _time_at(s, d, q, wide):
    """(1/t, g, a, b) at q with t = √p g, dt/du = √p a, d²t/du² = √p b."""
    u = q - 1.0
    x = 2.0 - q
    p = (1.0 + s if s > 0.0 else d) - s * q
    # F and 1/(1 − u²) from one division
    numerator, rest = _half_angle_quotient(q, wide)
    r = 1.0 / (rest * q * x)
    f = numerator * x * r
    i = rest * r
    f1 = (3.0 * u * f - 2.0) * i
    f2 = (3.0 * f + 5.0 * u * f1) * i
    g = s + p * f
    per_time = 1.0 / (math.sqrt(p) * g)
    half = 0.5 * s / p
    a = p * f1 - 1.5 * s * f - s * half
    b = p * f2 - 2.5 * s * f1 - 2.0 * s * half * half - half * a
    return per_time, g, a, b


@njit(**ROW, inline="always")
def _off_parabola(q):
    x = 2.0 - q
    return 2.0 - (_OFF_PARABOLA if abs(x) < _OFF_PARABOLA else x)


@njit(**ROW, inline="always")
def halley_step(s, d, t, q, wide):
    """One step of Halley's method on t: (new q, relative error of the time before the step)."""
    q = _off_parabola(q)
    per_time, g, a, b = _time_at(s, d, q, wide)
    e = t * per_time - 1.0
    return q + e * g * a / (a * a + 0.5 * e * g * b), e


@njit(**ROW, inline="always")
def _first_step(s, d, t, q, wide):
    """One Halley step from a starting value.

    On t^m, with m chosen so that t^m is nearly linear in u: −2/3 on ellipses, −2 on hyperbolas beyond 180°,
    2 on hyperbolas below.
    """
    q = _off_parabola(q)
    per_time, g, a, b = _time_at(s, d, q, wide)
    e = t * per_time - 1.0
    m1 = (-3.0 if s < 0.0 else 1.0) if q > 2.0 else -5.0 / 3.0  # m − 1
    n = e + e * e * m1 * (0.5 + e * (m1 - 1.0) * (1.0 / 6.0))  # ((1 + e)^m − 1)/m
    return q + n * g * a / (a * a + 0.5 * n * (g * b + m1 * a * a))


@njit(**ROW)
def first_step_row(sigma, delta, t, q, wide):
    """One Halley step on every q from its starting value."""
    if wide:
        for j in range(t.shape[0]):
            q[j] = _first_step(sigma[j], delta[j], t[j], q[j], True)
    else:
        for j in range(t.shape[0]):
            q[j] = _first_step(sigma[j], delta[j], t[j], q[j], False)


@njit(**ROW, inline="always")
def _last_step(s, d, t, q, q_max, wide):
    """A Halley step and what it leads to: (error before it, p, h = σ − u, 1 where that is not settled)."""
    q, e = halley_step(s, d, t, q, wide)
    above = 1.0 + s if s > 0.0 else d
    p = above - s * q
    settled = (abs(e) < SETTLED) & (q < q_max) & (p > LEAST_P_ROW)
    return e, p, above - q, 0 if settled else 1


@njit(**ROW)
def last_step_row(sigma, delta, t, q, error, p, h, wide):
    """One Halley step on every q, which stays as it was; p and h = σ − u get the shapes it leads to.

    error gets the relative error of the time before the step. Returns how many are not settled.
    """
    unsettled = 0
    if wide:
        for j in range(t.shape[0]):
            error[j], p[j], h[j], left = _last_step(sigma[j], delta[j], t[j], q[j], 1.0 + U_MAX_WIDE, True)
            unsettled += left
    else:
        for j in range(t.shape[0]):
            error[j], p[j], h[j], left = _last_step(sigma[j], delta[j], t[j], q[j], 1.0 + U_MAX_ROW, False)
            unsettled += left
    return unsettled


@njit(**ROW)
def any_beyond(q, limit):
    """Whether any q is greater than the limit."""
    count = 0
    for j in range(q.shape[0]):
        count += 1 if q[j] > limit else 0
    return count > 0

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

# F(w) on 0.7 <= w <= 2.2 as a polynomial in (w − 1)/(w + 1), which has F's singularity w = −1 at infinity:
# interpolation at Chebyshev nodes in 40-digit arithmetic, 4.8e-16 relative (tests/physics/test_timeflight.py
# measures it against mpmath).
_C0, _C1, _C2 = 0.6666666666666667, -0.8000000000000064, 0.11428571428563128
_C3, _C4, _C5 = 0.012698412701614556, 0.003463203478440827, 0.0013320008555931563
_C6, _C7, _C8 = 0.0006216001940879652, 0.00032911252129552346, 0.00019047366548775814
_C9, _C10, _C11 = 0.00011715167336575934, 7.980015372467549e-05, 5.737951766991778e-05
_C12, _C13 = -5.108137484801659e-06, 9.524384489721683e-05

# Two half-angle steps bring u to within the polynomial's range up to here: w = 2.2.
U_MAX_ROW = 149.0

# Taylor coefficients of F at u = 1, in powers of x = 1 − u: c(k+1) = c(k) (k + 3)/(2k + 5).
_T1, _T2, _T3, _T4 = 2 / 5, 8 / 35, 8 / 63, 16 / 231
# Within this of u = 1 the derivatives come from the Taylor series: their closed form divides by 1 − u².
_NEAR_PARABOLA = 1e-4

# Relative error of the time before the last Halley step below which that step has settled the root:
# its error is cubic in this one (tests/physics/test_timeflight.py measures it).
SETTLED = 2e-5

# F = 1/(u + κ): κ is ½ on a parabola and more by this at u = 0.
_KAPPA_RISE = 2.0 / math.pi - 0.5

HALF_PI_23 = math.pi ** (2 / 3) / 2


@njit(**ROW, inline="always")
def _near_one(w):
    """F(w) for 0.7 <= w <= 2.2."""
    x = (w - 1.0) / (w + 1.0)
    # Estrin's order instead of Horner's: a third of the latency, and the row loops wait for latency
    x2 = x * x
    x4 = x2 * x2
    low = (_C0 + _C1 * x) + x2 * (_C2 + _C3 * x) + x4 * ((_C4 + _C5 * x) + x2 * (_C6 + _C7 * x))
    high = (_C8 + _C9 * x) + x2 * (_C10 + _C11 * x) + x4 * (_C12 + _C13 * x)
    return low + (x4 * x4) * high


@njit(**ROW, inline="always")
def _half_angle_quotient(q):
    """F(u) at u = q − 1 <= U_MAX_ROW as (n, d): F = n/(d q).

    F(u) = (2 + F(v)/v)/(4v²) with v = sqrt((1 + u)/2), taken twice.
    """
    v = math.sqrt(0.5 * q)
    w = math.sqrt(0.5 + 0.5 * v)
    doubled = 2.0 * w * (1.0 + v)
    return 2.0 * v * doubled + 2.0 * w + _near_one(w), 2.0 * v * doubled


@njit(**PLAIN)
def shape_function(q):
    """F(u) at u = q − 1 for any q > 0, by as many half-angle steps as it takes."""
    if q <= 1.0 + U_MAX_ROW:
        numerator, rest = _half_angle_quotient(q)
        return numerator / (rest * q)
    v = math.sqrt(0.5 * q)
    return (2.0 + shape_function(1.0 + v) / v) / (2.0 * q)


@njit(**ROW, inline="always")
def _inverse_cube_root(x):
    """x^(−1/3) to 1e-5: a seed from the exponent's bits and two Newton steps, free of library calls."""
    high = np.float64(x).view(np.int64) >> 32
    seed = np.int64((0x553EF0FF - ((high * 0x55555556) >> 32)) << 32).view(np.float64)
    third = x * (1.0 / 3.0)
    y = seed * (4.0 / 3.0 - third * seed * seed * seed)
    return y * (4.0 / 3.0 - third * y * y * y)


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
        bent = (0.45 - 0.75 * s) * beyond / parabolic
        kappa = 0.5 + (0.5 * bent if hyperbola else _KAPPA_RISE * beyond / (middle - parabolic))
        k = 1.0 + s * kappa
        fast = 2.0 * k * k / (s * k + math.sqrt(s * s * k * k + 4.0 * tj * tj * k)) - kappa

        y, y0, y1 = ct * ct, c0 * c0, c1 * c1
        per_y0, per_y1 = middle * c0, parabolic * c1
        slope = above * HALF_PI_23  # dq/dy at q = 0
        flip = s < -0.3
        g0 = 1.0 if flip else slope
        d1 = ((y0 * slope if flip else per_y0) - g0) * per_y0
        d2 = ((0.5 * y1 * slope if flip else 2.0 * per_y1) - g0) * per_y1
        span = y1 - y0
        g = g0 * span + y * (d1 * span + (d2 - d1) * (y - y0))
        slow = y * (slope * span if flip else g) / (g if flip else span)

        q[j] = 1.0 + fast if hyperbola or (s > 0.3 and tj < middle) else slow


@njit(**ROW, inline="always")
def halley_step(s, d, t, q):
    """One Halley step from q <= 1 + U_MAX_ROW: (new q, relative error of the time before the step).

    Halley's method on t^m, with m chosen so that t^m is nearly linear in u: −2/3 on ellipses, −2 on
    hyperbolas beyond 180°, 2 on hyperbolas below.
    """
    above = 1.0 + s if s > 0.0 else d
    u = q - 1.0
    x = 1.0 - u
    p = above - s * q
    near = abs(x) < _NEAR_PARABOLA
    # F and 1/(1 − u²) from one division
    numerator, rest = _half_angle_quotient(q)
    x_safe = 1.0 if near else x
    r = 1.0 / (rest * q * x_safe)
    f = numerator * x_safe * r
    i = rest * r
    f1 = -(_T1 + x * (2.0 * _T2 + x * 3.0 * _T3)) if near else (3.0 * u * f - 2.0) * i
    f2 = 2.0 * _T2 + x * (6.0 * _T3 + x * 12.0 * _T4) if near else (3.0 * f + 5.0 * u * f1) * i

    # t = √p g, t' = √p a, t'' = √p b
    root = math.sqrt(p)
    half = 0.5 * s / p
    g = s + p * f
    a = p * f1 - 1.5 * s * f - s * half
    b = p * f2 - 2.5 * s * f1 - 2.0 * s * half * half - half * a
    e = t / (root * g) - 1.0

    m1 = (-3.0 if s < 0.0 else 1.0) if u > 1.0 else -5.0 / 3.0  # m − 1
    n = e * (1.0 + 0.5 * m1 * e * (1.0 + (m1 - 1.0) * e * (1.0 / 3.0)))  # ((1 + e)^m − 1)/m
    return q + n * g * a / (a * a + 0.5 * n * (g * b + m1 * a * a)), e


@njit(**ROW)
def halley_row(sigma, delta, t, q, error):
    """One Halley step on every q; error gets the relative error of the time before the step."""
    for j in range(t.shape[0]):
        q[j], error[j] = halley_step(sigma[j], delta[j], t[j], q[j])

"""Solve Lambert problems one at a time by Izzo's published method: the yardstick for our kernel.

D. Izzo, "Revisiting Lambert's problem", Celestial Mechanics and Dynamical Astronomy 121 (2015) 1-15.
Section and equation words below refer to that paper; lambda is its signed geometry parameter, x its unknown
(x² = 1 - s/2a), T its time of flight in units of sqrt(s³/2μ).  Written as one would write it to win:
scalars only, no allocation inside a loop, everything inlined, fastmath, norms of a grid's dates hoisted.
"""

from __future__ import annotations

import math

import numpy as np
from numba import njit

ZERO_REV_STEP = 1e-5  # the paper's stopping rules: a step this small leaves about its 4th power
MULTI_REV_STEP = 1e-8
MAX_ITERATIONS = 15
BATTIN_WITHIN = 0.01  # |x - 1| where Lancaster's expression cancels and Battin's series is short
LN2 = math.log(2.0)

# fastmath=True but for the promise that no NaN occurs: a problem without a transfer must come out as NaN.
FASTMATH = {"ninf", "nsz", "arcp", "contract", "afn", "reassoc"}
_inlined = njit(inline="always", fastmath=FASTMATH, error_model="numpy")


@_inlined
def hypergeometric_3_1_5half(z: float) -> float:
    """Sum 2F1(3, 1; 5/2; z), the series in Battin's time of flight expression; for small |z|."""
    total = 1.0
    term = 1.0
    for j in range(12):
        term *= (3.0 + j) / (2.5 + j) * z
        total += term
        if abs(term) < 1e-16:
            break
    return total


@_inlined
def time_of_flight(x: float, y: float, lam: float, revs: int) -> float:
    """Evaluate T(x): Battin's expression beside the parabola, Lancaster and Blanchard's everywhere else."""
    w = 1.0 - x * x
    if revs == 0 and abs(x - 1.0) < BATTIN_WITHIN:
        eta = y - lam * x
        q = 4.0 / 3.0 * hypergeometric_3_1_5half(0.5 * (1.0 - lam - x * eta))
        return 0.5 * (eta * eta * eta * q + 4.0 * lam * eta)
    if w > 0.0:
        root = math.sqrt(w)
        psi = math.acos(min(1.0, max(-1.0, x * y + lam * w))) + revs * math.pi
    else:
        root = math.sqrt(-w)
        psi = math.log((y - lam * x) * root + x * y + lam * w)
    return (psi / root - x + lam * y) / w


@_inlined
def derivatives(x: float, y: float, lam: float, lam2: float, t: float) -> tuple[float, float, float]:
    """Evaluate dT/dx, d²T/dx² and d³T/dx³ from T by the paper's recursion."""
    over_w = 1.0 / (1.0 - x * x)
    over_y = 1.0 / y
    over_y2 = over_y * over_y
    lam3_y = lam2 * lam * over_y
    one = 1.0 - lam2
    d1 = (3.0 * t * x - 2.0 + 2.0 * lam3_y * x) * over_w
    d2 = (3.0 * t + 5.0 * x * d1 + 2.0 * one * lam3_y * over_y2) * over_w
    d3 = (7.0 * x * d2 + 8.0 * d1 - 6.0 * one * lam2 * lam3_y * over_y2 * over_y2 * x) * over_w
    return d1, d2, d3


@_inlined
def householder(x: float, t_wanted: float, lam: float, lam2: float, revs: int, step: float) -> float:
    """Iterate Householder's third-order step from the start x until it moves less than ``step``."""
    for _ in range(MAX_ITERATIONS):
        y = math.sqrt(1.0 - lam2 * (1.0 - x * x))
        t = time_of_flight(x, y, lam, revs)
        d1, d2, d3 = derivatives(x, y, lam, lam2, t)
        f = t - t_wanted
        d1_d1 = d1 * d1
        dx = f * (d1_d1 - 0.5 * f * d2) / (d1 * (d1_d1 - f * d2) + d3 * f * f / 6.0)
        x -= dx
        if abs(dx) < step:
            break
    return x


@_inlined
def zero_rev_start(t: float, lam: float, lam2: float) -> float:
    """Start of the paper: power laws through the known times at x = 0 and x = 1, linear for hyperbolas."""
    t_at_0 = math.acos(lam) + lam * math.sqrt(1.0 - lam2)
    if t >= t_at_0:
        return (t_at_0 / t) ** (2.0 / 3.0) - 1.0
    t_at_1 = 2.0 / 3.0 * (1.0 - lam2 * lam)
    if t < t_at_1:
        return 2.5 * t_at_1 * (t_at_1 - t) / (t * (1.0 - lam2 * lam2 * lam)) + 1.0
    return math.exp(LN2 * math.log(t / t_at_0) / math.log(t_at_1 / t_at_0)) - 1.0


@_inlined
def multi_rev_start(t: float, revs: int, left: bool) -> float:
    """Start of the paper for N revolutions: the asymptote of T at x = -1 (left) or x = +1 (right)."""
    power = ((revs + 1) * math.pi / (8.0 * t)) if left else (8.0 * t / (revs * math.pi))
    power = power ** (2.0 / 3.0)
    return (power - 1.0) / (power + 1.0)


@njit(fastmath=FASTMATH, error_model="numpy", nogil=True)
def least_time(lam: float, revs: int) -> float:
    """Find the least T for N >= 1 revolutions by Halley's iteration on dT/dx = 0, from x = 0."""
    lam2 = lam * lam
    x = 0.0
    t = math.acos(lam) + lam * math.sqrt(1.0 - lam2) + revs * math.pi
    for _ in range(MAX_ITERATIONS):
        y = math.sqrt(1.0 - lam2 * (1.0 - x * x))
        d1, d2, d3 = derivatives(x, y, lam, lam2, t)
        dx = 2.0 * d1 * d2 / (2.0 * d2 * d2 - d1 * d3)
        x -= dx
        t = time_of_flight(x, math.sqrt(1.0 - lam2 * (1.0 - x * x)), lam, revs)
        if abs(dx) < 1e-13:
            break
    return t


@_inlined
def solve_x(t: float, lam: float, revs: int, left: bool) -> float:
    """Solve T(x) = t; NaN where N revolutions do not fit into t."""
    lam2 = lam * lam
    if revs == 0:
        return householder(zero_rev_start(t, lam, lam2), t, lam, lam2, 0, ZERO_REV_STEP)
    t_at_0 = math.acos(lam) + lam * math.sqrt(1.0 - lam2) + revs * math.pi
    if t < revs * math.pi or (t < t_at_0 and t < least_time(lam, revs)):
        return math.nan
    return householder(multi_rev_start(t, revs, left), t, lam, lam2, revs, MULTI_REV_STEP)


@_inlined
def velocity_components(x: float, lam: float, r1: float, r2: float, chord: float, s: float, gm: float):
    """Return radial and transverse speeds (vr1, vt1, vr2, vt2) of the solution x."""
    y = math.sqrt(1.0 - lam * lam * (1.0 - x * x))
    gamma = math.sqrt(0.5 * gm * s)
    rho = (r1 - r2) / chord
    sigma = math.sqrt(1.0 - rho * rho)
    near, far = lam * y - x, rho * (lam * y + x)
    transverse = gamma * sigma * (y + lam * x)
    return gamma * (near - far) / r1, transverse / r1, -gamma * (near + far) / r2, transverse / r2


@_inlined
def solve_one(ax, ay, az, ra, bx, by, bz, rb, tof, gm, revs, left, px, py, pz):
    """Solve one problem from (ax, ay, az), radius ra, to (bx, by, bz), radius rb; six velocity components.

    Flies the way round whose angular momentum points along the pole (px, py, pz).
    """
    cx, cy, cz = bx - ax, by - ay, bz - az
    chord = math.sqrt(cx * cx + cy * cy + cz * cz)
    s = 0.5 * (ra + rb + chord)
    nx, ny, nz = ay * bz - az * by, az * bx - ax * bz, ax * by - ay * bx
    over_n = 1.0 / math.sqrt(nx * nx + ny * ny + nz * nz)
    lam = math.sqrt(max(0.0, 1.0 - chord / s))
    if nx * px + ny * py + nz * pz < 0.0:
        lam = -lam
        over_n = -over_n
    nx, ny, nz = nx * over_n, ny * over_n, nz * over_n
    x = solve_x(math.sqrt(2.0 * gm / (s * s * s)) * tof, lam, revs, left)
    vr1, vt1, vr2, vt2 = velocity_components(x, lam, ra, rb, chord, s, gm)
    ax, ay, az = ax / ra, ay / ra, az / ra
    bx, by, bz = bx / rb, by / rb, bz / rb
    return (
        vr1 * ax + vt1 * (ny * az - nz * ay),
        vr1 * ay + vt1 * (nz * ax - nx * az),
        vr1 * az + vt1 * (nx * ay - ny * ax),
        vr2 * bx + vt2 * (ny * bz - nz * by),
        vr2 * by + vt2 * (nz * bx - nx * bz),
        vr2 * bz + vt2 * (nx * by - ny * bx),
    )


@njit(fastmath=FASTMATH, error_model="numpy", nogil=True)
def solve_list(r1, r2, tof, gm, revs, left, pole, v1, v2):
    """Fill v1, v2 (n, 3) km/s for n problems: r1, r2 (n, 3) km, tof (n,) s, one gm, one N and branch."""
    for i in range(tof.size):
        ra = math.sqrt(r1[i, 0] * r1[i, 0] + r1[i, 1] * r1[i, 1] + r1[i, 2] * r1[i, 2])
        rb = math.sqrt(r2[i, 0] * r2[i, 0] + r2[i, 1] * r2[i, 1] + r2[i, 2] * r2[i, 2])
        v1[i, 0], v1[i, 1], v1[i, 2], v2[i, 0], v2[i, 1], v2[i, 2] = solve_one(
            r1[i, 0], r1[i, 1], r1[i, 2], ra, r2[i, 0], r2[i, 1], r2[i, 2], rb,
            tof[i], gm, revs, left, pole[0], pole[1], pole[2],
        )  # fmt: skip


@njit(fastmath=FASTMATH, error_model="numpy", nogil=True)
def solve_grid(r1, u1, t1, r2, u2, t2, radius2, gm, pole, c3, arrival_speed):
    """Fill c3 and arrival_speed (rows, n2) for every pair of dates with zero revolutions.

    r1, u1 (3, rows) and r2, u2 (3, n2) are positions and velocities of the two bodies in km and km/s,
    t1, t2 their times in s, radius2 (n2,) the norms of r2.  NaN where the arrival is not after the departure.
    """
    for i in range(t1.size):
        ax, ay, az = r1[0, i], r1[1, i], r1[2, i]
        ra = math.sqrt(ax * ax + ay * ay + az * az)
        for j in range(t2.size):
            tof = t2[j] - t1[i]
            if tof <= 0.0:
                c3[i, j] = np.nan
                arrival_speed[i, j] = np.nan
                continue
            v1x, v1y, v1z, v2x, v2y, v2z = solve_one(
                ax, ay, az, ra, r2[0, j], r2[1, j], r2[2, j], radius2[j],
                tof, gm, 0, True, pole[0], pole[1], pole[2],
            )  # fmt: skip
            v1x, v1y, v1z = v1x - u1[0, i], v1y - u1[1, i], v1z - u1[2, i]
            v2x, v2y, v2z = v2x - u2[0, j], v2y - u2[1, j], v2z - u2[2, j]
            c3[i, j] = v1x * v1x + v1y * v1y + v1z * v1z
            arrival_speed[i, j] = math.sqrt(v2x * v2x + v2y * v2y + v2z * v2z)

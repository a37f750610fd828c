"""Lambert's problem: the velocities that carry a body from r1 to r2 in a given time.

The time equation is solved in `timeflight` (whole rows at a time) and `timeroot` (what the rows leave, and
revolutions). With h = σ − u, K = sqrt(2 GM/R) and s = √p the velocities are radial and transverse parts that
need no division by sin θ:

    v1 = K/s · [ (h + σ(r2 − r1)/(2 r1)) r̂1 + (r1 × r2) × r1 / (σ R r1²) ]
    v2 = K/s · [ −(h − σ(r2 − r1)/(2 r2)) r̂2 + (r1 × r2) × r2 / (σ R r2²) ]

which are the Lagrange coefficients f = 1 − pR/r1, ġ = 1 − pR/r2, g = σ sqrt(R³/GM) √p/√2, rearranged.
Row kernels take vectors as (3, m) arrays, one problem per column.
"""

from __future__ import annotations

import math

import numpy as np
from numba import njit
from numpy.typing import ArrayLike

from porkgrid.physics.constants import OBLIQUITY_J2000_ARCSEC
from porkgrid.physics.products import cross
from porkgrid.physics.timeflight import (
    LEAST_P_ROW,
    PLAIN,
    ROW,
    SETTLED,
    U_MAX_ROW,
    U_MAX_WIDE,
    any_beyond,
    first_step_row,
    halley_step,
    last_step_row,
    start_row,
)
from porkgrid.physics.timeroot import solve

_OBLIQUITY = math.radians(OBLIQUITY_J2000_ARCSEC / 3600.0)
ECLIPTIC_POLE_ICRF = (0.0, -math.sin(_OBLIQUITY), math.cos(_OBLIQUITY))

# What became of a problem.
FLOWN, NOT_AFTER, NO_PLANE, NO_TRANSFER, BAD_INPUT = 0, 1, 2, 3, 4

# Below this sine of the transfer angle the plane is taken as undefined: the direction of r1 × r2 then rests
# on the last digits of the positions.
_LEAST_SINE = 1e-10

# Rows of scratch that one call of `lambert_row` needs.
SCRATCH_ROWS = 8

# Problems a call of `lambert_row` should get: its twenty or so arrays then stay in the second-level cache.
BLOCK = 512


@njit(**ROW)
def norm_row(r, d):
    """d (m,) gets the lengths of the columns of r (3, m)."""
    for j in range(d.shape[0]):
        d[j] = math.sqrt(r[0, j] * r[0, j] + r[1, j] * r[1, j] + r[2, j] * r[2, j])


@njit(**ROW, inline="always")
def _geometry(ax, ay, az, a, bx, by, bz, b, tof, gm, pole, way):
    """The scaled problem: σ, δ = 1 − |σ|, the time t, and a number < 0 where the plane is undefined.

    `way` is +1 prograde, −1 retrograde.
    """
    nx, ny, nz = cross(ax, ay, az, bx, by, bz)
    dx, dy, dz = bx - ax, by - ay, bz - az
    total = a + b
    dot = ax * bx + ay * by + az * bz
    n2 = nx * nx + ny * ny + nz * nz
    # |r1||r2| + r1·r2 without cancellation: their product with the minus sign is |r1 × r2|²
    large = a * b + abs(dot)
    per_both = 1.0 / (large * total)
    per_total = per_both * large
    plus = large if dot > 0.0 else n2 * (per_both * total)
    size = math.sqrt(2.0 * plus) * per_total
    up = (nx * pole[0] + ny * pole[1] + nz * pole[2]) * way
    delta = (dx * dx + dy * dy + dz * dz) * per_total * per_total / (1.0 + size)
    t = tof * per_total * math.sqrt(2.0 * gm * per_total)
    apart = n2 - (_LEAST_SINE * a * b) * (_LEAST_SINE * a * b)
    return size if up >= 0.0 else -size, delta, t, apart


@njit(**ROW)
def _geometry_row(r1, d1, r2, d2, tof, gm, pole, way, sigma, delta, t, apart):
    for j in range(tof.shape[0]):
        sigma[j], delta[j], t[j], apart[j] = _geometry(
            r1[0, j], r1[1, j], r1[2, j], d1[j], r2[0, j], r2[1, j], r2[2, j], d2[j], tof[j], gm, pole, way
        )


@njit(**ROW)
def _geometry_fan(x, y, z, d, r2, d2, tof, gm, pole, way, sigma, delta, t, apart):
    for j in range(tof.shape[0]):
        sigma[j], delta[j], t[j], apart[j] = _geometry(
            x, y, z, d, r2[0, j], r2[1, j], r2[2, j], d2[j], tof[j], gm, pole, way
        )


@njit(**ROW, inline="always")
def _velocities(ax, ay, az, a, bx, by, bz, b, gm, s, p, h):
    """Components of v1 and v2 from the shape; the formulas are in the module's docstring."""
    nx, ny, nz = cross(ax, ay, az, bx, by, bz)
    total, ab = a + b, a * b
    # every quotient below from one division
    per_all = 1.0 / (s * total * p * ab)
    per_total = per_all * s * p * ab
    per_ab = per_all * s * total * p
    per_a, per_b = b * per_ab, a * per_ab
    k = math.sqrt(2.0 * gm * per_all * s * ab)
    across = k * per_all * p * ab
    # r2 − r1 as a difference of squares keeps its digits where the radii are nearly equal
    rise = ((bx - ax) * (bx + ax) + (by - ay) * (by + ay) + (bz - az) * (bz + az)) * per_total
    radial1 = k * (h + 0.5 * s * rise * per_a) * per_a
    radial2 = -k * (h - 0.5 * s * rise * per_b) * per_b
    turn1, turn2 = across * per_a * per_a, across * per_b * per_b
    return (
        radial1 * ax + turn1 * (ny * az - nz * ay),
        radial1 * ay + turn1 * (nz * ax - nx * az),
        radial1 * az + turn1 * (nx * ay - ny * ax),
        radial2 * bx + turn2 * (ny * bz - nz * by),
        radial2 * by + turn2 * (nz * bx - nx * bz),
        radial2 * bz + turn2 * (nx * by - ny * bx),
    )


@njit(**ROW)
def _velocity_row(r1, d1, r2, d2, gm, sigma, p, h, v1, v2):
    for j in range(p.shape[0]):
        v1[0, j], v1[1, j], v1[2, j], v2[0, j], v2[1, j], v2[2, j] = _velocities(
            r1[0, j], r1[1, j], r1[2, j], d1[j], r2[0, j], r2[1, j], r2[2, j], d2[j], gm, sigma[j], p[j], h[j]
        )


@njit(**ROW)
def _velocity_fan(x, y, z, d, r2, d2, gm, sigma, p, h, v1, v2):
    for j in range(p.shape[0]):
        v1[0, j], v1[1, j], v1[2, j], v2[0, j], v2[1, j], v2[2, j] = _velocities(
            x, y, z, d, r2[0, j], r2[1, j], r2[2, j], d2[j], gm, sigma[j], p[j], h[j]
        )


@njit(**ROW)
def _sort_out_row(t, apart, status):
    """Mark the problems that have no answer before they are tried; how many they are."""
    count = 0
    for j in range(t.shape[0]):
        code = NO_PLANE if apart[j] < 0.0 else FLOWN
        code = NOT_AFTER if t[j] <= 0.0 else code
        # x − x is 0 for finite x only
        code = code if (t[j] - t[j]) + (apart[j] - apart[j]) == 0.0 else BAD_INPUT
        status[j] = code
        count += 0 if code == FLOWN else 1
    return count


@njit(**PLAIN)
def _settle_row(sigma, delta, t, error, p, h, status, q_max):
    """Finish what two Halley steps have not settled: with more of them, else in a bracket."""
    for j in range(t.shape[0]):
        above = 1.0 + sigma[j] if sigma[j] > 0.0 else delta[j]
        q = above - h[j]
        if status[j] != FLOWN:
            p[j] = h[j] = math.nan
        elif not (abs(error[j]) < SETTLED and q < q_max and p[j] > LEAST_P_ROW):
            p[j], h[j] = _settle(sigma[j], delta[j], t[j], q)


@njit(**PLAIN)
def _settle(sigma, delta, t, q):
    above = 1.0 + sigma if sigma > 0.0 else delta
    for _ in range(3):
        if not (0.0 < q < 1.0 + U_MAX_WIDE and above - sigma * q > LEAST_P_ROW):
            break
        q, error = halley_step(sigma, delta, t, q, True)
        if abs(error) < SETTLED and above - sigma * q > LEAST_P_ROW:
            return above - sigma * q, above - q
    p, h, _ = solve(sigma, delta, t, 0, False)
    return p, h


@njit(**PLAIN)
def _revolutions_row(sigma, delta, t, revs, right, p, h, status):
    for j in range(t.shape[0]):
        p[j] = h[j] = math.nan
        if status[j] == FLOWN:
            p[j], h[j], found = solve(sigma[j], delta[j], t[j], revs, right)
            if not found:
                status[j] = NO_TRANSFER


@njit(**PLAIN)
def _shape_row(sigma, delta, t, apart, revs, right, q, error, p, h, status):
    """p and h of every scaled problem, and what became of it."""
    unflown = _sort_out_row(t, apart, status)
    if revs > 0:
        _revolutions_row(sigma, delta, t, revs, right, p, h, status)
        return
    start_row(sigma, delta, t, q)
    wide = any_beyond(q, 1.0 + U_MAX_ROW)  # short flights; most rows have none
    first_step_row(sigma, delta, t, q, wide)
    unsettled = last_step_row(sigma, delta, t, q, error, p, h, wide)
    if unflown + unsettled > 0:
        _settle_row(sigma, delta, t, error, p, h, status, 1.0 + (U_MAX_WIDE if wide else U_MAX_ROW))


@njit(**PLAIN)
def lambert_row(r1, d1, r2, d2, tof, gm, pole, way, revs, right, scratch, v1, v2, status):
    """Solve a row of problems.

    r1, r2, v1, v2 (3, m) km and km/s; d1, d2 (m,) lengths of r1 and r2; tof (m,) s; status (m,) int8 gets
    what became of each problem; scratch (SCRATCH_ROWS, m). Velocities of problems not FLOWN are NaN.
    """
    sigma, delta, t, apart = scratch[0], scratch[1], scratch[2], scratch[3]
    q, error, p, h = scratch[4], scratch[5], scratch[6], scratch[7]
    _geometry_row(r1, d1, r2, d2, tof, gm, pole, way, sigma, delta, t, apart)
    _shape_row(sigma, delta, t, apart, revs, right, q, error, p, h, status)
    _velocity_row(r1, d1, r2, d2, gm, sigma, p, h, v1, v2)


@njit(**PLAIN)
def lambert_fan(r1, r2, d2, tof, gm, pole, way, revs, right, scratch, v1, v2, status):
    """The same from one position r1 (3,) to many: a row of a grid of dates."""
    x, y, z = r1[0], r1[1], r1[2]
    d = math.sqrt(x * x + y * y + z * z)
    sigma, delta, t, apart = scratch[0], scratch[1], scratch[2], scratch[3]
    q, error, p, h = scratch[4], scratch[5], scratch[6], scratch[7]
    _geometry_fan(x, y, z, d, r2, d2, tof, gm, pole, way, sigma, delta, t, apart)
    _shape_row(sigma, delta, t, apart, revs, right, q, error, p, h, status)
    _velocity_fan(x, y, z, d, r2, d2, gm, sigma, p, h, v1, v2)


@njit(**PLAIN)
def _lambert_blocks(r1, r2, tof, gm, pole, way, revs, right, v1, v2, status):
    """`lambert_row` over long arrays, a block at a time."""
    for start in range(0, tof.shape[0], BLOCK):
        stop = min(start + BLOCK, tof.shape[0])
        n = stop - start
        scratch = np.empty((SCRATCH_ROWS, n))
        a, b, c, d = np.empty((3, n)), np.empty((3, n)), np.empty((3, n)), np.empty((3, n))
        d1, d2 = np.empty(n), np.empty(n)
        for j in range(n):
            for i in range(3):
                a[i, j] = r1[start + j, i]
                b[i, j] = r2[start + j, i]
        norm_row(a, d1)
        norm_row(b, d2)
        lambert_row(
            a, d1, b, d2, tof[start:stop], gm, pole, way, revs, right, scratch, c, d, status[start:stop]
        )
        for j in range(n):
            for i in range(3):
                v1[start + j, i] = c[i, j]
                v2[start + j, i] = d[i, j]


def lambert(
    r1: ArrayLike,
    r2: ArrayLike,
    tof: ArrayLike,
    gm: float,
    *,
    revs: int = 0,
    branch: str = "left",
    retrograde: bool = False,
    pole: ArrayLike = ECLIPTIC_POLE_ICRF,
) -> tuple[np.ndarray, np.ndarray]:
    """Solve Lambert's problem for arrays of position pairs.

    Parameters
    ----------
    r1, r2 : (..., 3) positions, km
    tof : (...) times of flight, s; broadcasts with r1 and r2
    gm : GM of the central body, km³/s²
    revs : whole revolutions before arrival
    branch : with revolutions, "left" for the solution of smaller u = cos(ΔE/2), "right" for the larger
    retrograde : fly against the direction that is counter-clockwise about `pole`
    pole : (3,) direction about which prograde is counted; by default the ecliptic pole in ICRF axes

    Returns
    -------
    v1, v2 : (..., 3) velocities at r1 and r2, km/s. NaN rows where there is no such transfer: a time of
        flight that is not positive or, with revolutions, under their least time; a transfer angle of 0, 180°
        or 360° (sine under 1e-10), where the plane is undefined; input that is not finite.

    Raises
    ------
    ValueError
        for shapes that do not broadcast, gm <= 0, revs < 0 or another branch.

    Source: Arora and Russell 2013, Russell 2022 (time equation); see the module's docstring.

    Example
    -------
    A quarter of a circle of 1 au about the Sun takes a quarter of a year:

    >>> au, gm_sun = 149597870.7, 132712440041.94
    >>> quarter_s = math.pi / 2 * math.sqrt(au**3 / gm_sun)
    >>> v1, v2 = porkgrid.lambert([au, 0, 0], [0, au, 0], quarter_s, gm_sun, pole=(0, 0, 1))
    >>> v1.round(3) + 0.0, v2.round(3) + 0.0
    (array([ 0.   , 29.785,  0.   ]), array([-29.785,   0.   ,   0.   ]))
    """
    if not (math.isfinite(gm) and gm > 0.0):
        raise ValueError(f"gm must be positive and finite, in km³/s²; it is {gm!r}")
    if int(revs) != revs or revs < 0:
        raise ValueError(f"revs must be a whole number, 0 or more; it is {revs!r}")
    if branch not in ("left", "right"):
        raise ValueError(f"branch must be 'left' or 'right'; it is {branch!r}")
    a, b, seconds = (np.asarray(x, dtype=np.float64) for x in (r1, r2, tof))
    if a.shape[-1:] != (3,) or b.shape[-1:] != (3,):
        raise ValueError(f"r1 and r2 must end in an axis of 3; their shapes are {a.shape} and {b.shape}")
    shape = np.broadcast_shapes(a.shape[:-1], b.shape[:-1], seconds.shape)
    a, b = (np.broadcast_to(x, (*shape, 3)).reshape(-1, 3) for x in (a, b))
    flat = np.ascontiguousarray(np.broadcast_to(seconds, shape).reshape(-1))
    v1, v2 = np.empty((flat.size, 3)), np.empty((flat.size, 3))
    status = np.empty(flat.size, dtype=np.int8)
    axis = np.asarray(pole, dtype=np.float64)
    _lambert_blocks(
        a, b, flat, float(gm), axis, -1.0 if retrograde else 1.0, int(revs), branch == "right", v1, v2, status
    )
    return v1.reshape(*shape, 3), v2.reshape(*shape, 3)

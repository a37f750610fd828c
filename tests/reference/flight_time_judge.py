"""Judge Lambert answers by the millions: flight time and shape of the conic that the velocities describe.

Everything is evaluated in numpy longdouble (64-bit mantissa, eps 1.1e-19) from the vectors themselves, in the
variables of Lancaster, Blanchard and Gooding: lambda² = 1 - c/s, x² = 1 - s/2a, y² = 1 - lambda²(1 - x²).
The velocities give x through quantities in which nothing cancels, so the judge's own rounding is far below
that of a double; what rounding the *answer* to doubles costs is computed beside each residual.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

LONG = np.longdouble
PI = LONG(4) * np.arctan(LONG(1))
HALF_ULP = 2.0**-53
LEAST_TIME_STEPS = 120  # 6 for most; the few with λ near 1 bisect first
SERIES_TERMS = 22  # S1 < 0.09 there: (0.09 · 1.1)^22 < 1e-22


@dataclass(frozen=True, eq=False)
class Shape:
    """Geometry of n problems, each (n,) longdouble; the normal (n, 3)."""

    n1: np.ndarray
    n2: np.ndarray
    chord: np.ndarray
    s: np.ndarray
    lam: np.ndarray
    c_over_s: np.ndarray
    rho: np.ndarray  # (|r1| - |r2|)/c
    sigma: np.ndarray  # sqrt(1 - ρ²) = sqrt(2|r1||r2|(1 - cos θ))/c
    normal: np.ndarray
    sine: np.ndarray  # |sin θ|

    def __getitem__(self, chosen) -> Shape:
        return Shape(*(getattr(self, name)[chosen] for name in self.__dataclass_fields__))


def shape(r1: np.ndarray, r2: np.ndarray, pole: np.ndarray) -> Shape:
    """Measure the triangle; lambda > 0 where the motion about the pole turns through less than 180°."""
    r1, r2 = np.asarray(r1, LONG), np.asarray(r2, LONG)
    way = r2 - r1  # exact for near neighbours, so that whatever is made of it keeps its digits
    n1, n2, chord = _norm(r1), _norm(r2), _norm(way)
    s = (n1 + n2 + chord) / 2
    cross, dot = np.cross(r1, way), _dot(r1, r2)
    area = _norm(cross)
    # n1·n2 + r1·r2 without cancellation on either side of 90°
    both = np.where(dot > 0, n1 * n2 + dot, area**2 / (n1 * n2 - np.minimum(dot, 0)))
    sign = np.where(_dot(cross, np.asarray(pole, LONG)) < 0, LONG(-1), LONG(1))
    normal = sign[:, None] * cross / area[:, None]
    rho = -_dot(way, r1 + r2) / ((n1 + n2) * chord)
    cosine, sine = dot / (n1 * n2), area / (n1 * n2)
    versine = np.where(cosine > 0, sine**2 / (1 + np.abs(cosine)), 1 - cosine)
    sigma = np.sqrt(2 * n1 * n2 * versine) / chord
    return Shape(n1, n2, chord, s, sign * np.sqrt(both / 2) / s, chord / s, rho, sigma, normal, sine)


def time_scale(g: Shape, gm: float) -> np.ndarray:
    """Seconds per unit of T: sqrt(s³ / 2 gm)."""
    return np.sqrt(g.s**3 / (2 * LONG(gm)))


def time_of_flight(x: np.ndarray, g: Shape, revs: np.ndarray) -> np.ndarray:
    """T(x) = η³ G + 2 λ η + N π / (1 - x²)^(3/2), with η = y - λx and G = (2/3) 2F1(3, 1; 5/2; sin²(ψ/2)).

    Battin's expression, G in closed form away from ψ = 0; on hyperbolas with λ < 0, where its terms cancel,
    Lancaster and Blanchard's.  Keeps the dtype of x if that is the wider one.
    """
    x = np.asarray(x)
    lam, c_s = g.lam, g.c_over_s
    w = (1 - x) * (1 + x)
    y = np.sqrt(c_s + (lam * x) ** 2)
    eta = np.where(lam * x > 0, c_s / (y + np.abs(lam * x)), y - lam * x)
    sine = eta * np.sqrt(np.abs(w))
    cosine = x * y + lam * w
    psi = np.where(w > 0, np.arctan2(sine, cosine), np.arcsinh(sine))
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        bulge = np.where(w > 0, psi - sine * cosine, sine * np.sqrt(1 + sine**2) - psi) / sine**3
        near = np.abs(psi) < 0.6
        bulge[near] = _series(sine[near] ** 2 * np.sign(w[near]), cosine[near])
        lancaster = (psi / np.sqrt(-w) - x + lam * y) / w
        turns = np.where(revs > 0, revs * x.dtype.type(PI) / (np.maximum(w, 0) * np.sqrt(np.abs(w))), 0)
    return np.where((lam < 0) & (x > 1.5), lancaster, eta**3 * bulge + 2 * lam * eta) + turns


def _series(signed_sine2: np.ndarray, cosine: np.ndarray) -> np.ndarray:
    """(2/3) 2F1(3, 1; 5/2; z) at z = sin²(ψ/2), negative on hyperbolas; |z| < 0.1."""
    z = signed_sine2 / (2 * (1 + cosine))
    total = np.ones_like(z)
    for j in reversed(range(SERIES_TERMS)):
        total = 1 + total * z * (z.dtype.type(3 + j) / z.dtype.type(2.5 + j))
    return total * 2 / 3


def least_time(g: Shape, revs: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Least T for N >= 1 revolutions, longdouble, and the x where it is.

    Newton on dT/dx = 0 in doubles (T is flat there), kept inside the interval where dT/dx changes sign, and
    bisection every third step: that interval must shrink from both ends.  Settled problems leave the loop.
    """
    rough = Shape(*(np.asarray(getattr(g, name), float) for name in g.__dataclass_fields__))
    x, low, high = np.zeros(g.s.shape), np.full(g.s.shape, -1.0), np.full(g.s.shape, 1.0)
    busy = np.arange(x.size)
    for count in range(1, LEAST_TIME_STEPS):
        here, part = x[busy], rough[busy]
        slope, curvature = _slope_and_curvature(here, part, revs[busy])
        low[busy], high[busy] = np.where(slope < 0, here, low[busy]), np.where(slope < 0, high[busy], here)
        new = here - slope / curvature
        inside = (new > low[busy] - 1e-9) & (new < high[busy] + 1e-9)  # rounding may step over the root
        settled = inside & (np.abs(new - here) < 1e-9 * np.sqrt(part.c_over_s))
        bisect = ~settled & (~inside | (count % 3 == 0))
        x[busy] = np.where(bisect, (low[busy] + high[busy]) / 2, new)
        busy = busy[~settled]
    if busy.size:
        raise ArithmeticError(f"{busy.size} least flight times were not found")
    return time_of_flight(np.asarray(x, LONG), g, revs), x


def _slope_and_curvature(x: np.ndarray, g: Shape, revs: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """dT/dx and d²T/dx²."""
    t = time_of_flight(x, g, revs)
    y, w = np.sqrt(g.c_over_s + (g.lam * x) ** 2), (1 - x) * (1 + x)
    slope = (3 * t * x - 2 + 2 * g.lam**3 * x / y) / w
    return slope, (3 * t + 5 * x * slope + 2 * g.c_over_s * g.lam**3 / y**3) / w


def recover_x(g: Shape, gm: float, r1, r2, v1, v2) -> tuple[np.ndarray, np.ndarray]:
    """Find x from the velocities, and how much half an ulp in each of their components can move it.

    With γ = sqrt(gm s/2):   r1·v1 - r2·v2 = 2γ(λy - x),
    r1·v1 + r2·v2 = -2γρ(λy + x),   |r1 × v1| = γσ(y + λx).  The first always serves; of the other two, the
    one whose factor is not small.
    """
    r1, r2, v1, v2 = (np.asarray(a, LONG) for a in (r1, r2, v1, v2))
    gamma = np.sqrt(LONG(gm) * g.s / 2)
    d = (_dot(r1, v1) - _dot(r2, v2)) / (2 * gamma)
    d_error = (_dot(np.abs(r1), np.abs(v1)) + _dot(np.abs(r2), np.abs(v2))) / (2 * gamma) * HALF_ULP
    with np.errstate(divide="ignore", invalid="ignore"):
        e = -(_dot(r1, v1) + _dot(r2, v2)) / (2 * gamma * g.rho)
        h = _dot(np.cross(r1, v1), g.normal) / (gamma * g.sigma)
        h_error = g.n1 * _norm(v1) / (gamma * g.sigma) * HALF_ULP
        by_radial = np.abs(g.rho) > g.sigma
        x = np.where(by_radial, (e - d) / 2, (g.lam * h - d) / (1 + g.lam**2))
        error = np.where(
            by_radial,
            d_error * (1 + 1 / np.abs(g.rho)) / 2,
            (np.abs(g.lam) * h_error + d_error) / (1 + g.lam**2),
        )
    return x, error


def time_residual(g: Shape, x: np.ndarray, x_error: np.ndarray, revs, tof, gm: float):
    """Relative flight-time error of x, and the part of it that rounding the velocities explains."""
    wanted = np.asarray(tof, LONG) / time_scale(g, gm)
    found = time_of_flight(x, g, revs)
    moved = [np.abs(time_of_flight(x + step, g, revs) - found) for step in (x_error, -x_error)]
    return np.abs(found / wanted - 1), np.fmax(*moved) / wanted


def velocities(g: Shape, x: np.ndarray, gm: float, r1, r2) -> tuple[np.ndarray, np.ndarray]:
    """Velocities (n, 3) longdouble of the conic x through both points: Izzo 2015, the last equations."""
    gamma = np.sqrt(LONG(gm) * g.s / 2)
    y = np.sqrt(g.c_over_s + (g.lam * x) ** 2)
    # (y + λx) = (c/s)/(y - λx): take the form that does not cancel
    total = np.where(g.lam * x < 0, g.c_over_s / (y + np.abs(g.lam * x)), y + g.lam * x)
    out = []
    for r, n, sign in ((r1, g.n1, 1), (r2, g.n2, -1)):
        radial = gamma * (sign * (g.lam * y - x) - g.rho * (g.lam * y + x)) / n
        unit = np.asarray(r, LONG) / n[:, None]
        out.append(radial[:, None] * unit + (gamma * g.sigma * total / n)[:, None] * np.cross(g.normal, unit))
    return out[0], out[1]


def _dot(a: np.ndarray, b: np.ndarray) -> np.ndarray:
    return (a * b).sum(-1)


def _norm(a: np.ndarray) -> np.ndarray:
    return np.sqrt(_dot(a, a))

"""Move a body along its conic: two-body motion, element axes, and the tilt between ecliptic and equator.

Motion is solved in the universal anomaly of Battin, *An Introduction to the Mathematics and Methods of
Astrodynamics* (sections 4.5 to 4.7), which has no seam between ellipse, parabola and hyperbola.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from porkgrid.physics.constants import OBLIQUITY_J2000_ARCSEC

Floats = NDArray[np.float64]

_OBLIQUITY_RAD = math.radians(OBLIQUITY_J2000_ARCSEC / 3600.0)
_ECLIPTIC_TO_ICRF = np.array(
    [
        [1.0, 0.0, 0.0],
        [0.0, math.cos(_OBLIQUITY_RAD), -math.sin(_OBLIQUITY_RAD)],
        [0.0, math.sin(_OBLIQUITY_RAD), math.cos(_OBLIQUITY_RAD)],
    ]
)

_EPS = float(np.finfo(float).eps)
_SERIES_BELOW = 4.0  # |z| under which sin x - x would lose digits, so a power series is summed instead
_SERIES_C2 = [1.0 / math.factorial(2 * k + 2) for k in range(12)]  # 4**12 / 26! is far below rounding
_SERIES_C3 = [1.0 / math.factorial(2 * k + 3) for k in range(12)]
_WIDEST_SINH = 350.0  # sinh and its square stay finite; no flight in seconds reaches e**350
_MOST_STEPS = 200  # bisection alone from the widest bracket to neighbouring doubles needs fewer


def propagate(r: ArrayLike, v: ArrayLike, dt_s: ArrayLike, gm: ArrayLike) -> tuple[Floats, Floats]:
    """Carry a state along its two-body conic by a time step of either sign.

    r (..., 3) km, v (..., 3) km/s, dt_s (...) s and gm (...) km³/s² broadcast together; returns r and v
    of the broadcast shape. Ellipse, parabola and hyperbola go the same way. Rows that are not finite, or
    that start at the centre, come back as NaN. Rounding costs about 1e-16 (r/q)² of relative accuracy on a
    flight in from r through a periapsis q, whose distance a state far out hardly holds: start at periapsis
    where that matters.
    """
    r, v = np.asarray(r, dtype=float), np.asarray(v, dtype=float)
    dt_s, gm = np.asarray(dt_s, dtype=float), np.asarray(gm, dtype=float)
    shape = np.broadcast_shapes(r.shape[:-1], v.shape[:-1], dt_s.shape, gm.shape)
    r = np.broadcast_to(r, (*shape, 3)).reshape(-1, 3)
    v = np.broadcast_to(v, (*shape, 3)).reshape(-1, 3)
    dt_s = np.broadcast_to(dt_s, shape).ravel()
    gm = np.broadcast_to(gm, shape).ravel()

    radius = np.sqrt(np.sum(r * r, axis=-1))
    sound = (
        np.isfinite(radius) & np.isfinite(v).all(axis=-1) & np.isfinite(dt_s) & (radius > 0.0) & (gm > 0.0)
    )
    moved_r, moved_v = np.full_like(r, np.nan), np.full_like(v, np.nan)
    moved_r[sound], moved_v[sound] = _moved(r[sound], v[sound], dt_s[sound], gm[sound], radius[sound])
    return moved_r.reshape(*shape, 3), moved_v.reshape(*shape, 3)


def elements_to_perihelion_state(
    q_km: float, e: float, incl_rad: float, node_rad: float, argp_rad: float, gm: float
) -> tuple[Floats, Floats]:
    """Turn an orbit's shape and angles into its state at periapsis, r (3,) km and v (3,) km/s.

    The axes are those the angles refer to. Any eccentricity >= 0: periapsis distance, unlike the
    semi-major axis, exists for the parabola too (Battin, section 3.5).
    """
    cos_o, sin_o = math.cos(node_rad), math.sin(node_rad)
    cos_w, sin_w = math.cos(argp_rad), math.sin(argp_rad)
    cos_i, sin_i = math.cos(incl_rad), math.sin(incl_rad)
    to_periapsis = np.array(
        [cos_o * cos_w - sin_o * sin_w * cos_i, sin_o * cos_w + cos_o * sin_w * cos_i, sin_w * sin_i]
    )
    along_motion = np.array(
        [-cos_o * sin_w - sin_o * cos_w * cos_i, -sin_o * sin_w + cos_o * cos_w * cos_i, cos_w * sin_i]
    )
    return q_km * to_periapsis, math.sqrt(gm * (1.0 + e) / q_km) * along_motion


def ecliptic_to_icrf(x: ArrayLike) -> Floats:
    """Turn vectors (..., 3) from the J2000 ecliptic (IAU 1976, as SPICE's ECLIPJ2000) to the ICRF axes."""
    return np.asarray(x, dtype=float) @ _ECLIPTIC_TO_ICRF.T


def icrf_to_ecliptic(x: ArrayLike) -> Floats:
    """Turn vectors (..., 3) from the ICRF axes to the J2000 ecliptic (IAU 1976, SPICE's ECLIPJ2000)."""
    return np.asarray(x, dtype=float) @ _ECLIPTIC_TO_ICRF


def _moved(r: Floats, v: Floats, dt_s: Floats, gm: Floats, radius: Floats) -> tuple[Floats, Floats]:
    """Apply Lagrange's coefficients, in units where the starting radius and gm are one."""
    speed_unit = np.sqrt(gm / radius)
    w = v / speed_unit[:, None]
    u = r / radius[:, None]
    sigma = np.sum(u * w, axis=-1)
    alpha = 2.0 - np.sum(w * w, axis=-1)  # reciprocal of the semi-major axis
    tau = _within_half_a_period(dt_s * speed_unit / radius, alpha)

    # Time run backwards is time run forwards with the radial speed turned round.
    back = np.where(tau < 0.0, -1.0, 1.0)
    chi = back * _universal_anomaly(np.abs(tau), sigma * back, alpha)

    u0, u1, u2, _ = _universal_functions(chi, alpha)
    new_radius = u0 + sigma * u1 + u2
    f, g = 1.0 - u2, u1 + sigma * u2
    f_dot, g_dot = -u1 / new_radius, 1.0 - u2 / new_radius
    new_u = f[:, None] * u + g[:, None] * w
    new_w = f_dot[:, None] * u + g_dot[:, None] * w
    return new_u * radius[:, None], new_w * speed_unit[:, None]


def _within_half_a_period(tau: Floats, alpha: Floats) -> Floats:
    """Take whole revolutions off an ellipse's time; leave open orbits as they are."""
    closed = alpha > 0.0
    turns = np.zeros_like(tau)
    period = np.ones_like(tau)
    period[closed] = 2.0 * math.pi * alpha[closed] ** -1.5
    turns[closed] = np.rint(tau[closed] / period[closed])
    return tau - turns * period


def _universal_anomaly(tau: Floats, sigma: Floats, alpha: Floats) -> Floats:
    """Solve Kepler's equation tau = U1 + sigma U2 + U3 for chi >= 0, by Newton steps kept in a bracket.

    Its slope is the radius, which is never negative, so one root lies in the bracket; a step that leaves
    the bracket, or is not at most half the one before, is replaced by a bisection.
    """
    low, high = np.zeros_like(tau), _widest_anomaly(tau, alpha)
    chi = np.where(tau > 0.0, np.minimum(tau, high), 0.0)  # exact on a circle
    last_step = high.copy()
    todo = np.flatnonzero(tau > 0.0)
    for _ in range(_MOST_STEPS):
        if todo.size == 0:
            break
        now, t, s = chi[todo], tau[todo], sigma[todo]
        u0, u1, u2, u3 = _universal_functions(now, alpha[todo])
        miss = u1 + s * u2 + u3 - t
        radius = u0 + s * u1 + u2
        low[todo] = np.where(miss <= 0.0, now, low[todo])
        high[todo] = np.where(miss >= 0.0, now, high[todo])

        with np.errstate(divide="ignore", invalid="ignore"):
            newton = now - miss / radius
        sound = (
            (newton >= low[todo]) & (newton <= high[todo]) & (np.abs(newton - now) <= 0.5 * last_step[todo])
        )
        following = np.where(sound, newton, 0.5 * (low[todo] + high[todo]))
        chi[todo] = following
        last_step[todo] = np.abs(following - now)

        # Once the equation holds to rounding the step just taken was the last that could tell anything.
        rounding = 4.0 * _EPS * (np.abs(u1) + np.abs(s * u2) + np.abs(u3) + t)
        settled = (sound & (np.abs(miss) <= rounding)) | (last_step[todo] <= _EPS * now)
        todo = todo[~settled]
    return chi


def _widest_anomaly(tau: Floats, alpha: Floats) -> Floats:
    """Bound chi from above: one revolution on an ellipse, cubic growth of time on an open orbit.

    On an open orbit the radius r obeys r'' = 1 - alpha r >= 1 in chi, so tau >= (chi - chi_q)³/6, and the
    periapsis lies at chi_q <= sqrt(2) because the starting radius is one.
    """
    widest = math.sqrt(2.0) + np.cbrt(6.0 * tau)
    root = np.sqrt(np.abs(alpha))
    limit = np.where(alpha > 0.0, 2.0 * math.pi, _WIDEST_SINH)
    bounded = np.divide(limit, root, out=np.full_like(tau, np.inf), where=root > 0.0)
    return np.where(alpha > 0.0, bounded, np.minimum(widest, bounded)) * (1.0 + 4.0 * _EPS)


def _universal_functions(chi: Floats, alpha: Floats) -> tuple[Floats, Floats, Floats, Floats]:
    """Evaluate U0, U1, U2, U3 of (chi, alpha) without loss of digits near the parabola."""
    z = alpha * chi * chi
    c2, c3 = _stumpff(z)
    return 1.0 - z * c2, chi * (1.0 - z * c3), chi * chi * c2, chi**3 * c3


def _stumpff(z: Floats) -> tuple[Floats, Floats]:
    """Evaluate c2 = (1 - cos x)/z and c3 = (x - sin x)/x³ with x = sqrt(z), hyperbolic for z < 0."""
    c2, c3 = np.zeros_like(z), np.zeros_like(z)
    small = np.abs(z) < _SERIES_BELOW
    for a, b in zip(reversed(_SERIES_C2), reversed(_SERIES_C3), strict=True):
        c2[small] = a - z[small] * c2[small]
        c3[small] = b - z[small] * c3[small]
    ellipse = z >= _SERIES_BELOW
    x = np.sqrt(z[ellipse])
    c2[ellipse] = 2.0 * (np.sin(0.5 * x) / x) ** 2
    c3[ellipse] = (x - np.sin(x)) / x**3
    hyperbola = z <= -_SERIES_BELOW
    x = np.sqrt(-z[hyperbola])
    c2[hyperbola] = 2.0 * (np.sinh(0.5 * x) / x) ** 2
    c3[hyperbola] = (np.sinh(x) - x) / x**3
    return c2, c3

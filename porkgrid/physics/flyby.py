"""One flyby in patched conics: turn, periapsis, burn, aim point, and the change of heliocentric velocity.

v_in and v_out are the excess velocities v∞ before and after, relative to the body. Where they differ in
speed, one burn along the velocity at periapsis makes the difference.

Vectors are (3, ...), components first, and broadcast with each other and with gm on the axes behind; km,
km/s, rad, km³/s². Rows that are not finite come back as NaN, and so does a turn of zero v∞, which has no
direction, or by a gm that is not above zero. Raises ValueError for vectors of another shape.

Sources: Curtis, Orbital Mechanics for Engineering Students, sections 2.9 (hyperbola) and 8.9 (flyby);
Battin, An Introduction to the Mathematics and Methods of Astrodynamics, section 9.5 (memory, all three).
"""

from __future__ import annotations

import math

import numpy as np
from numba import njit, vectorize
from numpy.typing import ArrayLike, NDArray

from porkgrid.physics.products import difference_of_products
from porkgrid.physics.timeflight import PLAIN

Floats = NDArray[np.float64]

_EPS = float(np.finfo(float).eps)
_TINY = float(np.finfo(float).tiny)
_LONGEST_STEP = 100.0  # in ln y: longer ones, which exp might not hold, leave the bracket all the same
_MOST_STEPS = 100  # 19 settle speeds that differ by a factor of 10¹²


def turn_angle(v_in: ArrayLike, v_out: ArrayLike) -> Floats:
    """Angle between two velocities (3, ...): (...) rad, 0 to π; NaN where one of them is zero.

    tan δ = |v_in × v_out| / v_in · v_out, which unlike arccos keeps the digits of the smallest turns.
    """
    a, b = _vectors(v_in, v_out)
    known = (_square(a) > 0.0) & (_square(b) > 0.0)
    return np.where(known, np.arctan2(_norm(_cross(a, b)), np.sum(a * b, axis=0)), np.nan)[()]


def periapsis_radius(v_in: ArrayLike, v_out: ArrayLike, gm: ArrayLike) -> Floats:
    """Radius of the one periapsis at which the body turns v_in into v_out, (...) km.

    It solves δ = arcsin 1/(1 + a²r/gm) + arcsin 1/(1 + b²r/gm), the turns before and after periapsis with
    a = |v_in|, b = |v_out| (Curtis, section 2.9, half a hyperbola each). The right side falls from π to 0 as
    r grows, so every turn between has one root. At the ends: inf for no turn, which is passed at infinity,
    and 0 for a full reversal, which would go through the centre. A radius under the body's own is a flyby
    that cannot be flown.
    """
    return _positive(gm) * _periapsis_over_gm(v_in, v_out)


def periapsis_speeds(v_in: ArrayLike, v_out: ArrayLike, gm: ArrayLike) -> tuple[Floats, Floats]:
    """Speeds at that periapsis just before and just after the burn, each (...) km/s (vis-viva)."""
    radius = periapsis_radius(v_in, v_out, gm)
    with np.errstate(divide="ignore"):
        escape2 = 2.0 * np.asarray(gm, dtype=float) / radius
    a, b = _vectors(v_in, v_out)
    return np.sqrt(_square(a) + escape2), np.sqrt(_square(b) + escape2)


def burn(v_in: ArrayLike, v_out: ArrayLike, gm: ArrayLike) -> Floats:
    """Size of the burn along the velocity at that periapsis, (...) km/s.

    The squares of the speeds differ at periapsis as they do at infinity, by b² − a², which keeps the digits
    of a small burn at a high speed. The value hangs on the velocities alone: a weaker body is passed lower.
    """
    before, after = periapsis_speeds(v_in, v_out, gm)
    a, b = _vectors(v_in, v_out)
    return np.abs(_square(b) - _square(a)) / (before + after)


def eccentricity(v_inf: ArrayLike, periapsis: ArrayLike, gm: ArrayLike) -> Floats:
    """Eccentricity of the hyperbola of this excess speed and periapsis radius: 1 + r v∞²/gm."""
    return 1.0 + np.asarray(periapsis, dtype=float) / _semi_axis(v_inf, gm)


def turn(v_inf: ArrayLike, periapsis: ArrayLike, gm: ArrayLike) -> Floats:
    """Turn of an unpowered flyby of this excess speed and periapsis radius, rad: 2 arcsin 1/e.

    As 2 arctan 1/sqrt(e² − 1), which keeps its digits near π. A powered flyby turns by half of it for v_in
    and half for v_out.
    """
    p = np.asarray(periapsis, dtype=float) / _semi_axis(v_inf, gm)
    return 2.0 * np.arctan2(1.0, np.sqrt(p * (2.0 + p)))


def aim_distance(v_inf: ArrayLike, periapsis: ArrayLike, gm: ArrayLike) -> Floats:
    """Distance B between the asymptote and the body's centre, km: gm/v∞² · sqrt(e² − 1)."""
    radius = np.asarray(periapsis, dtype=float)
    return np.sqrt(radius) * np.sqrt(radius + 2.0 * _semi_axis(v_inf, gm))


def aim_plane(v_in: ArrayLike, v_out: ArrayLike, gm: ArrayLike, pole: ArrayLike) -> tuple[Floats, Floats]:
    """Where the incoming asymptote pierces the aim plane: B·T and B·R, each (...) km.

    S is the direction of v_in, T = S × N/|S × N| and R = S × T (Kizner, JPL External Publication 674, 1959;
    memory). N is `pole`, (3,) or (3, ...) of any length, in the axes of the velocities: the pole of the
    body's equator or of the ecliptic, and whoever quotes the numbers has to say which. B belongs to the
    hyperbola before the burn. NaN where no plane holds the flyby, at a turn of 0 or π, and where v_in points
    along N.
    """
    a, b, n = _vectors(v_in, v_out, pole)
    distance = aim_distance(_norm(a), periapsis_radius(a, b, gm), gm)
    with np.errstate(invalid="ignore"):
        s, h, t = _unit(a), _unit(_cross(a, b)), _unit(_cross(a, n))
        # Motion turns about h = r × v, so the asymptote passes on the side that v_out turns away from.
        aim = distance * _cross(s, h)
        return np.sum(aim * t, axis=0), np.sum(aim * _cross(s, t), axis=0)


def gain(v_in: ArrayLike, v_out: ArrayLike, body_velocity: ArrayLike) -> Floats:
    """Change of heliocentric speed |V + v_out| − |V + v_in|, (...) km/s, V the body's velocity (3, ...) km/s.

    From the difference of the squares, which keeps the digits of a small gain.
    """
    a, b, body = _vectors(v_in, v_out, body_velocity)
    squares = np.sum((b - a) * (2.0 * body + a + b), axis=0)
    return squares / np.maximum(_norm(body + a) + _norm(body + b), _TINY)


def heliocentric_turn(v_in: ArrayLike, v_out: ArrayLike, body_velocity: ArrayLike) -> Floats:
    """Change of heliocentric direction, the angle between V + v_in and V + v_out, (...) rad."""
    a, b, body = _vectors(v_in, v_out, body_velocity)
    return turn_angle(body + a, body + b)


def _vectors(*vectors: ArrayLike) -> list[Floats]:
    """Line up arrays (3, ...) on their last axes, so that they broadcast; infinities become NaN."""
    arrays = [np.asarray(vector, dtype=float) for vector in vectors]
    for array in arrays:
        if array.shape[:1] != (3,):
            raise ValueError(f"a vector begins with an axis of 3 components; the shape is {array.shape}")
    arrays = [np.where(np.isfinite(array), array, np.nan) for array in arrays]
    ndim = max(array.ndim for array in arrays)
    return [array.reshape(3, *[1] * (ndim - array.ndim), *array.shape[1:]) for array in arrays]


def _positive(gm: ArrayLike) -> Floats:
    """NaN for what cannot attract."""
    gm = np.asarray(gm, dtype=float)
    return np.where((gm > 0.0) & np.isfinite(gm), gm, np.nan)


def _square(vector: Floats) -> Floats:
    return np.sum(vector * vector, axis=0)


def _norm(vector: Floats) -> Floats:
    return np.sqrt(_square(vector))


def _unit(vector: Floats) -> Floats:
    return vector / _norm(vector)


def _cross(a: Floats, b: Floats) -> Floats:
    """a × b (3, ...) with all digits, also of near parallels."""
    return np.stack([_difference_of_products(a[i], b[j], a[j], b[i]) for i, j in ((1, 2), (2, 0), (0, 1))])


def _semi_axis(v_inf: ArrayLike, gm: ArrayLike) -> Floats:
    """Size of the semi-major axis, gm/v∞² in km (vis-viva at infinity)."""
    speed = np.asarray(v_inf, dtype=float)
    return _positive(gm) / np.square(np.where((speed > 0.0) & np.isfinite(speed), speed, np.nan))


def _periapsis_over_gm(v_in: ArrayLike, v_out: ArrayLike) -> Floats:
    """y = r/gm (...) s²/km², which depends on the velocities alone."""
    a, b = _vectors(v_in, v_out)
    sine, cosine = _norm(_cross(a, b)), np.sum(a * b, axis=0)
    return _root(_square(a), _square(b), np.arctan2(sine, cosine), np.arctan2(sine, -cosine))


@vectorize(nopython=True, cache=True)
def _difference_of_products(a, b, c, d):
    return difference_of_products(a, b, c, d)


@vectorize(nopython=True, cache=True)
def _root(a2, b2, turn, rest):
    """y of the turn, and of what it lacks to π, that speeds of these squares make.

    Newton's method on ln(1/sin(δ/2) − 1) over ln y, where the slope is 1 for equal speeds and at both ends
    for any; the bracket is the answer for both speeds at the faster and both at the slower.
    """
    if not (0.0 < a2 < math.inf and 0.0 < b2 < math.inf and turn >= 0.0):
        return math.nan
    if turn == 0.0:
        return math.inf
    if rest == 0.0:
        return 0.0
    wanted = _over_sine(math.sin(0.5 * turn), math.sin(0.5 * rest))
    low, high = wanted / max(a2, b2), wanted / min(a2, b2)
    y = math.sqrt(low) * math.sqrt(high)
    for _ in range(_MOST_STEPS):
        sine, cosine, fall = _half_turns(a2 * y, b2 * y)
        miss = math.log(_over_sine(sine, cosine) / wanted)
        if miss > 0.0:
            high = y
        else:
            low = y
        slope = fall * (1.0 + sine) / (2.0 * sine * cosine)
        new = y * math.exp(max(-_LONGEST_STEP, min(_LONGEST_STEP, -miss / slope)))
        if abs(miss) <= 4.0 * _EPS or abs(new - y) <= _EPS * y:
            return new
        y = new if low < new < high else math.sqrt(low) * math.sqrt(high)
    return y


@njit(**PLAIN)
def _over_sine(sine, cosine):
    """1/sin(δ/2) − 1, written so as to keep its digits where the sine is near 1."""
    return cosine * cosine / (sine * (1.0 + sine))


@njit(**PLAIN)
def _half_turns(p, q):
    """sin(δ/2), cos(δ/2) and −dδ/d ln y of the flyby with a²y = p and b²y = q.

    With t = sqrt(p/(2 + p)), arcsin 1/(1 + p) = π/2 − 2 arctan t = 2 arctan u, u = 2/((2 + p)(1 + t)²):
    sums of the tangents t and u of half-turns give the sine and cosine of the whole without cancellation.
    """
    t, r = math.sqrt(p / (2.0 + p)), math.sqrt(q / (2.0 + q))
    u, w = 2.0 / ((2.0 + p) * (1.0 + t) ** 2), 2.0 / ((2.0 + q) * (1.0 + r) ** 2)
    sine = (u + w) / math.sqrt((1.0 + u * u) * (1.0 + w * w))
    cosine = (t + r) / math.sqrt((1.0 + t * t) * (1.0 + r * r))
    return sine, cosine, t / (1.0 + p) + r / (1.0 + q)

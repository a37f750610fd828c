"""What it costs in speed to leave a parking orbit, to be captured, and to meet an atmosphere.

Patched conics with impulsive burns at periapsis (any astrodynamics text, for instance Curtis,
Orbital Mechanics for Engineering Students, sections 8.6 to 8.8). Speeds in km/s, radii in km from
the body's centre, GM in km³/s², angles in radians; arrays broadcast.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike


def hyperbola_speed(v_inf: ArrayLike, radius: float | np.ndarray, gm: float) -> np.ndarray:
    """Speed at `radius` on the hyperbola of excess speed `v_inf` (vis-viva)."""
    return np.sqrt(np.square(v_inf) + 2.0 * gm / radius)


def periapsis_speed(periapsis: float, apoapsis: float, gm: float) -> float:
    """Speed at periapsis of a closed orbit with these apsis radii (vis-viva)."""
    return float(np.sqrt(2.0 * gm * apoapsis / (periapsis * (periapsis + apoapsis))))


def apsis_burn(v_inf: ArrayLike, periapsis: float, apoapsis: float, gm: float) -> np.ndarray:
    """Δv between a closed orbit and the hyperbola that shares its periapsis, in plane.

    The same number leaves the orbit (departure) or enters it (capture).
    """
    return hyperbola_speed(v_inf, periapsis, gm) - periapsis_speed(periapsis, apoapsis, gm)


def shape_burn(v_inf: ArrayLike, periapsis: ArrayLike, eccentricity: ArrayLike, gm: float) -> np.ndarray:
    """Δv at `periapsis` between the hyperbola and a closed orbit of this eccentricity, in plane.

    `apsis_burn` with the orbit's shape given instead of its apoapsis. At an infinite periapsis it is v∞.
    """
    radius = np.asarray(periapsis, dtype=float)
    closed = np.sqrt(gm * (1.0 + np.asarray(eccentricity)) / radius)  # vis-viva with a = r/(1 − e)
    return hyperbola_speed(v_inf, radius, gm) - closed


def cheapest_periapsis(v_inf: ArrayLike, eccentricity: ArrayLike, gm: float) -> np.ndarray:
    """Periapsis from which an orbit of this eccentricity is entered, or left, for the least Δv.

    2 gm/v∞² · (1 − e)/(1 + e) (Curtis, section 8.8: the derivative of `shape_burn` is zero), 0 <= e < 1.
    It is infinite at v∞ = 0, and often inside the body: clip it to the altitudes that are allowed; on
    either side of the optimum the burn rises steadily, so that the clipped periapsis is the cheapest allowed.

    Only a given shape has such an optimum. For a given apoapsis the burn grows with periapsis, so that the
    lowest allowed is the cheapest; so it is for a given period, where the energy to lose is always the same
    and speed, deep in the well, loses it fastest.
    """
    shape = np.asarray(eccentricity, dtype=float)
    with np.errstate(divide="ignore", over="ignore"):
        return 2.0 * gm * (1.0 - shape) / (1.0 + shape) / np.square(np.asarray(v_inf, dtype=float))


def departure_burn(
    v_inf: ArrayLike, declination: ArrayLike, periapsis: float, apoapsis: float, inclination: float, gm: float
) -> np.ndarray:
    """Δv from a parking orbit of given inclination to an asymptote of given declination.

    An orbit of inclination i contains every asymptote of declination |δ| <= i. Beyond that the plane
    must turn by at least |δ| − i, combined here with the injection in one burn (law of cosines).
    """
    tilt = np.minimum(inclination, np.pi - inclination)  # a retrograde orbit reaches as far
    turn = np.maximum(np.abs(declination) - tilt, 0.0)
    fast = hyperbola_speed(v_inf, periapsis, gm)
    slow = periapsis_speed(periapsis, apoapsis, gm)
    # (fast − slow)² + 4·fast·slow·sin²(turn/2): no cancellation when the turn is small
    return np.sqrt(np.square(fast - slow) + 4.0 * fast * slow * np.square(np.sin(0.5 * turn)))

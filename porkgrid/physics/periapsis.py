"""States at the periapsis of a hyperbola from its excess velocities, relative to the body.

A flyby hangs on its v∞ in and out alone; a departure or an arrival on one v∞, a periapsis radius and the
plane. Vectors (3,), km, km/s, km³/s², rad.

Source: Curtis, Orbital Mechanics for Engineering Students, sections 2.9 and 8.6 to 8.9 (memory).
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from porkgrid.physics.burns import hyperbola_speed
from porkgrid.physics.flyby import periapsis_radius, turn

Floats = NDArray[np.float64]


def flyby_states(v_in: Floats, v_out: Floats, gm: float) -> tuple[Floats, Floats, Floats]:
    """Place at periapsis, and velocity before and after the burn there, of the flyby from v∞ in to v∞ out."""
    normal = np.cross(v_in, v_out)
    normal = normal / np.linalg.norm(normal)
    radius = float(periapsis_radius(v_in, v_out, gm))
    place, before = arrival_state(v_in, radius, normal, gm)
    after = before * (hyperbola_speed(np.linalg.norm(v_out), radius, gm) / np.linalg.norm(before))
    return place, before, after


def arrival_state(v_in: Floats, radius: float, normal: Floats, gm: float) -> tuple[Floats, Floats]:
    """Place and velocity at the periapsis that v∞ in leads to; `normal` is the unit vector along r × v."""
    speed = float(np.linalg.norm(v_in))
    return _at_periapsis(v_in / speed, speed, radius, normal, gm, 1.0)


def departure_state(v_out: Floats, radius: float, normal: Floats, gm: float) -> tuple[Floats, Floats]:
    """Place and velocity at the periapsis that v∞ out comes from; `normal` is the unit vector along r × v."""
    speed = float(np.linalg.norm(v_out))
    return _at_periapsis(v_out / speed, speed, radius, normal, gm, -1.0)


def plane_normal(asymptote: Floats, pole: Floats, tilt_rad: float) -> Floats:
    """Normal of the plane that holds an asymptote and is turned about it by `tilt_rad` from its least
    inclination to `pole`.

    Untilted, the plane cuts the equator of `pole` as flatly as it can, at the asymptote's declination, and
    is flown prograde: its B vector lies along +T. cos(inclination) = cos(tilt) · cos(declination).
    """
    s = asymptote / np.linalg.norm(asymptote)
    flattest = pole - s * (s @ pole)
    flattest = flattest / np.linalg.norm(flattest)
    return flattest * math.cos(tilt_rad) + np.cross(s, flattest) * math.sin(tilt_rad)


def tilt_for_inclination(asymptote: Floats, pole: Floats, inclination_rad: float) -> float:
    """Tilt at which the plane has this inclination to `pole`; 0 where no plane of it holds the asymptote.

    Of the two planes, mirror images in the asymptote's meridian, it is the one turned by a positive angle
    about the asymptote.
    """
    s, n = asymptote / np.linalg.norm(asymptote), pole / np.linalg.norm(pole)
    cosine = math.cos(inclination_rad) / float(np.linalg.norm(n - s * (s @ n)))
    return math.acos(min(1.0, max(-1.0, cosine)))


def _at_periapsis(
    asymptote: Floats, speed: float, radius: float, normal: Floats, gm: float, way: float
) -> tuple[Floats, Floats]:
    """Turn an asymptote by half the turn: onwards from an incoming one, backwards from an outgoing one."""
    half = 0.5 * float(turn(speed, radius, gm))
    along = asymptote * math.cos(half) + way * np.cross(normal, asymptote) * math.sin(half)
    return radius * np.cross(along, normal), float(hyperbola_speed(speed, radius, gm)) * along

"""The orbits at the two ends of a route, as radii from the body's centre."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from porkgrid.scenario import Capture, Parking
from porkgrid.sky.bodies import Body, radius_of


@dataclass(frozen=True)
class ApsisOrbit:
    """A parking or capture orbit: apsis radii in km, inclination in radians (None: as the asymptote asks)."""

    periapsis_km: float
    apoapsis_km: float
    inclination_rad: float | None = None


def parking_orbit(orbit: Parking, body: Body) -> ApsisOrbit:
    """A scenario's parking orbit about a body with a radius."""
    inclination = None if orbit.inclination_deg is None else float(np.radians(orbit.inclination_deg))
    apsides = (radius_of(body) + orbit.periapsis_altitude_km, radius_of(body) + orbit.apoapsis_altitude_km)
    return ApsisOrbit(*apsides, inclination)


@dataclass(frozen=True)
class ShapeOrbit:
    """A capture orbit of given eccentricity whose periapsis is the cheapest one from `lowest_km` up."""

    eccentricity: float
    lowest_km: float


def capture_orbit(orbit: Capture, body: Body) -> ApsisOrbit | ShapeOrbit:
    """A scenario's capture orbit about a body with a radius.

    With its apoapsis given the cheapest periapsis is the lowest (physics.burns).
    """
    altitude = orbit.periapsis_altitude_km
    lowest = radius_of(body) + ((body.min_flyby_altitude_km or 0.0) if altitude is None else altitude)
    if orbit.apoapsis_altitude_km is not None:
        return ApsisOrbit(lowest, radius_of(body) + orbit.apoapsis_altitude_km)
    e = orbit.eccentricity
    assert e is not None  # the scenario has one or the other
    return ShapeOrbit(e, lowest) if altitude is None else ApsisOrbit(lowest, lowest * (1.0 + e) / (1.0 - e))

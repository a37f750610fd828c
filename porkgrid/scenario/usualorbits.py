"""Usual parking and capture orbits, for a first scenario; the mission's own replace them."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class UsualOrbit:
    """Apsis altitudes in km above the equatorial radius, and why they are so."""

    periapsis_altitude_km: int
    apoapsis_altitude_km: int
    why: str


# Altitudes: practice, after what orbiters have flown; periods by Kepler's third law.
_LOW = "a low circular orbit, clear of the atmosphere for the days that it is held"
_AIRLESS = "a low circular orbit; there is no atmosphere to keep clear of"
_LONG = "captures are cheapest deep down and into a long ellipse"

PARKING = {
    "mercury": UsualOrbit(200, 200, _AIRLESS),
    "venus": UsualOrbit(300, 300, _LOW),
    "earth": UsualOrbit(200, 200, _LOW),
    "mars": UsualOrbit(350, 350, _LOW),
    "jupiter": UsualOrbit(200_000, 8_000_000, "a long ellipse above the thick of the radiation"),
    "saturn": UsualOrbit(80_000, 9_000_000, "a long ellipse outside the main rings"),
    "uranus": UsualOrbit(30_000, 3_000_000, "a long ellipse outside the main rings"),
    "neptune": UsualOrbit(4_000, 3_000_000, "a long ellipse clear of the atmosphere"),
    "pluto": UsualOrbit(1_000, 1_000, _AIRLESS),
}
CAPTURE = {
    "mercury": UsualOrbit(200, 15_000, f"{_LONG}; this one has a period of about half a day"),
    "venus": UsualOrbit(300, 66_000, f"{_LONG}; this one has a period of about a day"),
    "earth": UsualOrbit(300, 72_000, f"{_LONG}; this one has a period of about a day"),
    "mars": UsualOrbit(400, 33_000, f"{_LONG}; this one has a period of about a day"),
    "jupiter": UsualOrbit(200_000, 8_000_000, f"{_LONG}, here above the thick of the radiation"),
    "saturn": UsualOrbit(80_000, 9_000_000, f"{_LONG}, here outside the main rings"),
    "uranus": UsualOrbit(30_000, 3_000_000, f"{_LONG}, here outside the main rings"),
    "neptune": UsualOrbit(4_000, 3_000_000, f"{_LONG}, here clear of the atmosphere"),
    "pluto": UsualOrbit(1_000, 50_000, f"{_LONG}"),
}

"""The size of bodies' orbits: periods, Hohmann flights and synodic periods, to lay windows out by."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from porkgrid.physics.constants import DAY_S, GM_SUN_KM3_S2
from porkgrid.sky.bodies import Body
from porkgrid.sky.kernel import Ephemeris


@dataclass(frozen=True)
class OrbitSize:
    """A body with the semi-major axis and the period of its orbit about the Sun."""

    body: Body
    axis_km: float
    period_days: float


def orbit_size(ephemeris: Ephemeris, body: Body, jd: float) -> OrbitSize:
    """The osculating orbit at a TDB Julian date; RequestError where the ephemeris has no state."""
    position, velocity = ephemeris.states(body, np.array([jd]))
    distance, speed = float(np.linalg.norm(position)), float(np.linalg.norm(velocity))
    axis = 1.0 / (2.0 / distance - speed * speed / GM_SUN_KM3_S2)  # vis-viva
    return OrbitSize(body, axis, _half_turn_days(axis) * 2.0)


def hohmann_days(one: OrbitSize, other: OrbitSize) -> float:
    """Flight time of Hohmann's transfer between circles of these axes, days."""
    return _half_turn_days(0.5 * (one.axis_km + other.axis_km))


def synodic_days(one: OrbitSize, other: OrbitSize) -> float:
    """How often two bodies stand alike as seen from the Sun, days; they have different periods."""
    return 1.0 / abs(1.0 / one.period_days - 1.0 / other.period_days)


def _half_turn_days(axis_km: float) -> float:
    return math.pi * math.sqrt(axis_km**3 / GM_SUN_KM3_S2) / DAY_S

"""The encounters of a route as the full-force check aims at them, and the numbers that are free at each.

Departure and arrival have their v∞ (3,) free; epoch, periapsis radius and plane are held. A flyby has v∞ in
and out free, (6,), which make its periapsis and its burn, and a seventh number, the shift of its epoch in
days; one condition (`Hold`) closes the seventh.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum

import numpy as np
from numpy.typing import NDArray

from porkgrid.physics.constants import DAY_S
from porkgrid.physics.flyby import periapsis_radius, periapsis_speeds
from porkgrid.physics.periapsis import arrival_state, departure_state, flyby_states, plane_normal
from porkgrid.sky.bodies import Body

Floats = NDArray[np.float64]


class Hold(Enum):
    """What a flyby keeps of the patched route."""

    BURN = "burn"
    RADIUS = "radius"
    EPOCH = "epoch"


@dataclass(frozen=True, eq=False)
class End:
    """Departure or arrival: the periapsis, on the hyperbola's plane that is tilted so to `pole`.

    A body without GM has no periapsis (radius 0): the route starts or ends at its centre.
    """

    body: Body
    t_s: float
    radius_km: float
    pole: Floats
    tilt_rad: float


@dataclass(frozen=True, eq=False)
class Pass:
    """A flyby: epoch and signed burn of the patched route, the least radius allowed, and what is held."""

    body: Body
    t_s: float
    burn_km_s: float
    least_radius_km: float
    hold: Hold


Stop = End | Pass


def free_numbers(stop: Stop) -> int:
    """How many unknowns a stop has."""
    return 7 if isinstance(stop, Pass) else 3


def epoch_s(stop: Stop, free: Floats) -> float:
    """Time of the periapsis."""
    return stop.t_s + float(free[6]) * DAY_S if isinstance(stop, Pass) else stop.t_s


def leaving(stop: Stop, free: Floats) -> Floats:
    """State (6,) from the body just after periapsis."""
    if isinstance(stop, Pass):
        place, _, after = flyby_states(free[:3], free[3:6], _gm(stop))
        return np.concatenate([place, after])
    if stop.radius_km == 0.0:
        return np.concatenate([np.zeros(3), free])
    normal = plane_normal(free, stop.pole, stop.tilt_rad)
    return np.concatenate(departure_state(free, stop.radius_km, normal, _gm(stop)))


def arriving(stop: Stop, free: Floats) -> Floats:
    """State (6,) from the body just before periapsis."""
    if isinstance(stop, Pass):
        place, before, _ = flyby_states(free[:3], free[3:6], _gm(stop))
        return np.concatenate([place, before])
    if stop.radius_km == 0.0:
        return np.concatenate([np.zeros(3), free])
    normal = plane_normal(free, stop.pole, stop.tilt_rad)
    return np.concatenate(arrival_state(free, stop.radius_km, normal, _gm(stop)))


def off_condition(stop: Pass, free: Floats) -> float:
    """By how much a flyby misses what it holds: km/s of burn, radii of the least radius, or days."""
    if stop.hold is Hold.BURN:
        return signed_burn(stop, free) - stop.burn_km_s
    if stop.hold is Hold.RADIUS:
        radius = float(periapsis_radius(free[:3], free[3:6], _gm(stop)))
        return radius / stop.least_radius_km - 1.0
    return float(free[6])


def signed_burn(stop: Pass, free: Floats) -> float:
    """Burn at periapsis along the velocity, km/s: positive where it speeds up."""
    before, after = periapsis_speeds(free[:3], free[3:6], _gm(stop))
    squares = free[3:6] @ free[3:6] - free[:3] @ free[:3]  # as at periapsis, and keeps the digits there
    return float(squares / (before + after))


def _gm(stop: Stop) -> float:
    assert stop.body.gm_km3_s2 is not None
    return stop.body.gm_km3_s2

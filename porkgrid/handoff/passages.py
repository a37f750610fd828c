"""An encounter of a patched-conic route in three dimensions: hyperbola, orbit, burn and aim point."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from porkgrid.handoff.burnmasses import CAPTURE, INJECTION
from porkgrid.handoff.hyperbola import seconds_from_periapsis, sphere_of_influence_km
from porkgrid.handoff.trajectory import Burn, EncounterState
from porkgrid.physics import flyby
from porkgrid.physics.burns import periapsis_speed
from porkgrid.physics.constants import DAY_S
from porkgrid.physics.lambert import ECLIPTIC_POLE_ICRF
from porkgrid.physics.periapsis import (
    arrival_state,
    departure_state,
    flyby_states,
    plane_normal,
    tilt_for_inclination,
)
from porkgrid.sky.bodies import Body, gm_of, pole_axes, radius_of
from porkgrid.survey.orbits import ApsisOrbit

State = tuple[np.ndarray, np.ndarray]

_ECLIPTIC_POLE = np.array(ECLIPTIC_POLE_ICRF)


@dataclass(frozen=True, eq=False)
class Passage:
    """An encounter with its hyperbola; without one (no periapsis known) the states are None.

    coming, leaving: states at periapsis just before and just after the burn, on the hyperbolas. orbit: the
    state there in the parking or capture orbit. seconds_in, seconds_out: between periapsis and the edge of
    the sphere of influence, 0 without a hyperbola.
    """

    body: Body
    encounter: EncounterState
    burns: tuple[Burn, ...] = ()
    coming: State | None = None
    leaving: State | None = None
    orbit: State | None = None
    seconds_in: float = 0.0
    seconds_out: float = 0.0

    @property
    def enters_jd(self) -> float:
        """When the sphere of influence is entered."""
        return self.encounter.jd_tdb - self.seconds_in / DAY_S

    @property
    def leaves_jd(self) -> float:
        """When it is left."""
        return self.encounter.jd_tdb + self.seconds_out / DAY_S


def departure_passage(
    body: Body, jd: float, position: np.ndarray, v_inf: np.ndarray, parking: ApsisOrbit | None
) -> Passage:
    """Injection at the periapsis of the parking orbit. position (3,) of the body from the Sun."""
    rla_deg, dla_deg = _asymptote(body, jd, v_inf)
    met = EncounterState(
        "Departure", body.title, "departure", jd, v_inf_out_km_s=v_inf, c3_km2_s2=float(v_inf @ v_inf),
        rla_deg=rla_deg, dla_deg=dla_deg,
    )  # fmt: skip
    if parking is None:
        return Passage(body, met)
    gm, pole = gm_of(body), _pole(body, jd)
    wanted = parking.inclination_rad
    tilt = 0.0 if wanted is None else tilt_for_inclination(v_inf, pole, wanted)
    normal = plane_normal(v_inf, pole, tilt)
    place, fast = departure_state(v_inf, parking.periapsis_km, normal, gm)
    slow = parking_velocity(body, jd, place, fast, parking)
    radius_km = parking.periapsis_km
    return Passage(
        body=body,
        encounter=replace(met, periapsis_km=radius_km, altitude_km=radius_km - radius_of(body)),
        burns=(Burn(INJECTION, jd, fast - slow),),
        leaving=(place, fast),
        orbit=(place, slow),
        seconds_out=_seconds_inside(body, position, v_inf, radius_km),
    )


def parking_velocity(
    body: Body, jd: float, place: np.ndarray, fast: np.ndarray, parking: ApsisOrbit
) -> np.ndarray:
    """Velocity (3,) in the parking orbit at its periapsis, from where it is left with the velocity `fast`.

    Along that, unless the hyperbola's plane is steeper than the parking orbit's: then the burn turns the
    course about the radius by the difference, which is what `physics.burns.departure_burn` counts.
    """
    along, up = fast / np.linalg.norm(fast), place / np.linalg.norm(place)
    speed = periapsis_speed(parking.periapsis_km, parking.apoapsis_km, gm_of(body))
    if parking.inclination_rad is None:
        return speed * along
    pole = _pole(body, jd)
    steep = float(np.arccos(np.clip(np.cross(up, along) @ pole, -1.0, 1.0)))
    courses = [_turned(along, up, way * (steep - parking.inclination_rad)) for way in (1.0, -1.0)]
    off = [abs(float(np.cross(up, course) @ pole) - np.cos(parking.inclination_rad)) for course in courses]
    return speed * courses[int(np.argmin(off))]


def flyby_passage(
    n: int, body: Body, jd: float, position: np.ndarray, v_in: np.ndarray, v_out: np.ndarray, radius_km: float
) -> Passage:
    """Flyby `n` that turns v_in into v_out, with a burn along the velocity at periapsis."""
    gm = gm_of(body)
    place, before, after = flyby_states(v_in, v_out, gm)
    b_t, b_r = flyby.aim_plane(v_in, v_out, gm, _ECLIPTIC_POLE)
    label = f"Flyby {n}"
    return Passage(
        body=body,
        encounter=EncounterState(
            label, body.title, "flyby", jd, v_in, v_out,
            periapsis_km=radius_km, altitude_km=radius_km - radius_of(body), b_t_km=float(b_t),
            b_r_km=float(b_r),
        ),
        burns=(Burn(f"{label}, at periapsis", jd, after - before),),
        coming=(place, before),
        leaving=(place, after),
        seconds_in=_seconds_inside(body, position, v_in, radius_km),
        seconds_out=_seconds_inside(body, position, v_out, radius_km),
    )  # fmt: skip


def arrival_passage(
    body: Body, jd: float, position: np.ndarray, v_inf: np.ndarray, capture: tuple[float, float] | None
) -> Passage:
    """Capture at the periapsis of the capture orbit, in the plane of least inclination to the ecliptic.

    That is the plane in which B·R is zero; which plane the orbit needs is for its science to say.
    capture: radius of that periapsis in km, and the burn there in km/s.
    """
    met = EncounterState("Arrival", body.title, "arrival", jd, v_inf_in_km_s=v_inf)
    if capture is None:
        return Passage(body, met)
    gm, (radius_km, burn_km_s) = gm_of(body), capture
    normal = plane_normal(v_inf, _ECLIPTIC_POLE, 0.0)
    place, fast = arrival_state(v_inf, radius_km, normal, gm)
    slow = fast * (1.0 - burn_km_s / np.linalg.norm(fast))
    met = replace(
        met, periapsis_km=radius_km, altitude_km=radius_km - radius_of(body),
        b_t_km=float(flyby.aim_distance(np.linalg.norm(v_inf), radius_km, gm)), b_r_km=0.0,
    )  # fmt: skip
    return Passage(
        body=body,
        encounter=met,
        burns=(Burn(CAPTURE, jd, slow - fast),),
        coming=(place, fast),
        orbit=(place, slow),
        seconds_in=_seconds_inside(body, position, v_inf, radius_km),
    )


def _seconds_inside(body: Body, position: np.ndarray, v_inf: np.ndarray, periapsis_km: float) -> float:
    edge = sphere_of_influence_km(gm_of(body), float(np.linalg.norm(position)))
    return seconds_from_periapsis(float(np.linalg.norm(v_inf)), periapsis_km, gm_of(body), edge)


def _pole(body: Body, jd: float) -> np.ndarray:
    """The body's pole, or that of the ecliptic where it is not known."""
    return _ECLIPTIC_POLE if body.pole is None else pole_axes(body, jd)[2]


def _asymptote(body: Body, jd: float, v_inf: np.ndarray) -> tuple[float | None, float | None]:
    """Right ascension and declination of the launch asymptote, deg, in the axes that the measures use."""
    if body.pole is None:
        return None, None
    x, y, z = pole_axes(body, jd) @ v_inf
    right_ascension = float(np.degrees(np.arctan2(y, x)) % 360.0)
    return right_ascension, float(np.degrees(np.arctan2(z, np.hypot(x, y))))


def _turned(vector: np.ndarray, axis: np.ndarray, angle_rad: float) -> np.ndarray:
    """A vector square to a unit axis, turned about it by the right hand."""
    return vector * np.cos(angle_rad) + np.cross(axis, vector) * np.sin(angle_rad)

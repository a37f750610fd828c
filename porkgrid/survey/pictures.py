"""What the pictures of one candidate are drawn from: its path about the Sun, and each of its flybys.

Everything is computed anew from the epochs and leg options, with the functions that the measures use.
Positions and velocities are heliocentric in the ecliptic and equinox of J2000, components first.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from importlib.metadata import version

import numpy as np

from porkgrid.errors import RequestError
from porkgrid.physics import flyby
from porkgrid.physics.conics import icrf_to_ecliptic
from porkgrid.physics.constants import GM_SUN_KM3_S2
from porkgrid.physics.lambert import FLOWN
from porkgrid.sky.bodies import gm_of, radius_of
from porkgrid.sky.epochs import iso_from_jd
from porkgrid.sky.states import StateTable, state_table
from porkgrid.survey.cells import Cells
from porkgrid.survey.legs import LegCells, LegOption
from porkgrid.survey.plan import Plan
from porkgrid.survey.routes import cells_at
from porkgrid.survey.store import CAUTION

_STEP_RAD = np.radians(0.5)  # of a polyline; its chords then miss a planet's orbit by 1e-5 of the radius
_OPEN_ORBIT_REACH = 4.0  # how far an orbit that is not drawn whole goes, in largest distances of the flight
_ECLIPTIC_POLE = np.array([0.0, 0.0, 1.0])

_DEPARTURE = ("c3_km2_s2", "dla_deg", "dv_departure_km_s")
_FLYBY = ("v_inf_km_s", "turn_deg", "altitude_km", "burn_km_s", "gain_km_s")
_ARRIVAL = ("v_inf_arrival_km_s", "dv_capture_km_s", "entry_speed_km_s")
_LEG = ("tof_days", "transfer_angle_deg", "revs")
_ROUTE = ("tof_days", "dv_total_km_s", "sun_min_au", "sun_max_au")


@dataclass(frozen=True)
class Number:
    """A row of a small table. The label may hold mathtext; the unit is "1" where there is none."""

    label: str
    value: float
    unit: str


@dataclass(frozen=True, eq=False)
class EncounterPicture:
    """A body met: its title, "departure", "flyby" or "arrival", the ISO date and the place (3,) km."""

    title: str
    kind: str
    date: str
    position: np.ndarray
    numbers: tuple[Number, ...]


@dataclass(frozen=True, eq=False)
class ArcPicture:
    """A leg as flown: a (3, k) km polyline from body to body, evenly spaced in true anomaly."""

    path: np.ndarray
    numbers: tuple[Number, ...]


@dataclass(frozen=True, eq=False)
class OrbitPicture:
    """The orbit about the Sun that osculates a body's at its first encounter, as a (3, k) km polyline."""

    title: str
    path: np.ndarray


@dataclass(frozen=True, eq=False)
class RoutePicture:
    """A candidate's path about the Sun: n encounters, the n − 1 arcs between them, an orbit per body."""

    title: str
    route: str
    kernel: str
    version: str
    caution: str
    encounters: tuple[EncounterPicture, ...]
    arcs: tuple[ArcPicture, ...]
    orbits: tuple[OrbitPicture, ...]
    numbers: tuple[Number, ...]


@dataclass(frozen=True, eq=False)
class FlybyPicture:
    """One flyby of a candidate. Velocities (3,) km/s; `sunward` (3,) is the direction from body to Sun."""

    title: str
    route: str
    kernel: str
    version: str
    caution: str
    number: int
    body: str
    date: str
    body_velocity: np.ndarray
    v_inf_in: np.ndarray
    v_inf_out: np.ndarray
    sunward: np.ndarray
    speed_in_km_s: float
    speed_out_km_s: float
    turn_rad: float
    body_radius_km: float
    periapsis_km: float
    altitude_km: float
    eccentricity_in: float
    eccentricity_out: float
    burn_km_s: float
    gain_km_s: float
    b_t_km: float
    b_r_km: float

    @property
    def v_in(self) -> np.ndarray:
        """Heliocentric velocity before the flyby, (3,) km/s."""
        return self.body_velocity + self.v_inf_in

    @property
    def v_out(self) -> np.ndarray:
        """Heliocentric velocity after the flyby, (3,) km/s."""
        return self.body_velocity + self.v_inf_out


def route_picture(
    plan: Plan, epochs_jd: Sequence[float], revs: Sequence[int], branches: Sequence[int]
) -> RoutePicture:
    """Fly a candidate once more and take down its path.

    epochs_jd: one TDB Julian date per encounter; revs and branches: whole revolutions and branch (−1 left,
    +1 right, 0 without revolutions) per leg. RequestError where a leg cannot be flown so.
    """
    tables = _tables(plan, epochs_jd)
    cells = _flown(plan, tables, revs, branches)
    arcs = tuple(
        ArcPicture(_arc_path(leg), tuple(_numbers(plan, cells, f"leg{n}_", _LEG)))
        for n, leg in enumerate(cells.legs, start=1)
    )
    reach = _OPEN_ORBIT_REACH * max(float(np.linalg.norm(arc.path, axis=0).max()) for arc in arcs)
    orbits = {table.body.name: table for table in reversed(tables)}
    return RoutePicture(
        **_heading(plan),
        encounters=tuple(_encounters(plan, tables, cells)),
        arcs=arcs,
        orbits=tuple(OrbitPicture(table.body.title, _orbit_path(table, reach)) for table in orbits.values()),
        numbers=tuple(_numbers(plan, cells, "", dict.fromkeys((*_ROUTE, plan.rank_by)))),
    )


def flyby_picture(
    plan: Plan, epochs_jd: Sequence[float], revs: Sequence[int], branches: Sequence[int], n: int
) -> FlybyPicture:
    """Fly a candidate once more and take down flyby `n`, counted from 1; the rest is as for `route_picture`.

    RequestError where the route has no such flyby.
    """
    if not 1 <= n <= plan.flybys:
        has = f"has flybys 1 to {plan.flybys}" if plan.flybys else "has none: it flies direct"
        raise RequestError(f"flyby {n}: there is no such flyby; the route {plan.route} {has}")
    tables = _tables(plan, epochs_jd)
    passed = _flown(plan, tables, revs, branches).flybys[n - 1]
    body, gm, table = passed.body, gm_of(passed.body), tables[n]
    v_in, v_out, carried = (_ecliptic(vector) for vector in (passed.v_in, passed.v_out, passed.body_velocity))
    periapsis = float(np.ravel(passed.periapsis_km)[0])
    b_t, b_r = flyby.aim_plane(v_in, v_out, gm, _ECLIPTIC_POLE)
    position = _ecliptic(table.position)
    return FlybyPicture(
        **_heading(plan),
        number=n,
        body=body.title,
        date=iso_from_jd(table.jd[0]),
        body_velocity=carried,
        v_inf_in=v_in,
        v_inf_out=v_out,
        sunward=-position / np.linalg.norm(position),
        speed_in_km_s=float(np.linalg.norm(carried + v_in)),
        speed_out_km_s=float(np.linalg.norm(carried + v_out)),
        turn_rad=float(flyby.turn_angle(v_in, v_out)),
        body_radius_km=radius_of(body),
        periapsis_km=periapsis,
        altitude_km=periapsis - radius_of(body),
        eccentricity_in=float(flyby.eccentricity(np.linalg.norm(v_in), periapsis, gm)),
        eccentricity_out=float(flyby.eccentricity(np.linalg.norm(v_out), periapsis, gm)),
        burn_km_s=float(flyby.burn(v_in, v_out, gm)),
        gain_km_s=float(flyby.gain(v_in, v_out, carried)),
        b_t_km=float(b_t),
        b_r_km=float(b_r),
    )


def _heading(plan: Plan) -> dict[str, str]:
    return {
        "title": plan.scenario.name,
        "route": plan.route,
        "kernel": plan.ephemeris.label,
        "version": version("porkgrid"),
        "caution": CAUTION,
    }


def _tables(plan: Plan, epochs_jd: Sequence[float]) -> list[StateTable]:
    """One table of one date per encounter."""
    return [
        state_table(plan.ephemeris, table.body, np.array([float(jd)]))
        for table, jd in zip(plan.tables, epochs_jd, strict=True)
    ]


def _flown(plan: Plan, tables: list[StateTable], revs: Sequence[int], branches: Sequence[int]) -> Cells:
    """The candidate as a grid of one cell. RequestError where a leg cannot be flown."""
    options = [
        LegOption(int(turns), branch > 0, ways[0].retrograde)
        for ways, turns, branch in zip(plan.options, revs, branches, strict=True)
    ]
    cells = cells_at(plan, tables, options)
    for n, (leg, option) in enumerate(zip(cells.legs, options, strict=True), start=1):
        if leg.status.item() != FLOWN:
            dates = f"{iso_from_jd(tables[n - 1].jd[0])} to {iso_from_jd(tables[n].jd[0])}"
            raise RequestError(
                f"leg {n}, {dates}: no flight with {option.revs} revolutions; "
                "take dates and options of a candidate"
            )
    return cells


def _encounters(plan: Plan, tables: list[StateTable], cells: Cells) -> Iterator[EncounterPicture]:
    last = len(tables) - 1
    for k, table in enumerate(tables):
        if k == 0:
            kind, numbers = "departure", _numbers(plan, cells, "", _DEPARTURE)
        elif k == last:
            kind, numbers = "arrival", _numbers(plan, cells, "", _ARRIVAL)
        else:
            kind, numbers = "flyby", _numbers(plan, cells, f"flyby{k}_", _FLYBY)
        place = _ecliptic(table.position)
        yield EncounterPicture(table.body.title, kind, iso_from_jd(table.jd[0]), place, tuple(numbers))


def _numbers(plan: Plan, cells: Cells, prefix: str, names: Iterable[str]) -> Iterator[Number]:
    """Those of the measures that the route has."""
    for name in names:
        measure = plan.measures.get(prefix + name)
        if measure is not None:
            yield Number(measure.symbol, float(np.ravel(measure.compute(cells))[0]), measure.unit)


def _arc_path(leg: LegCells) -> np.ndarray:
    """The leg's polyline (3, k), its whole revolutions included."""
    start, speed = _ecliptic(leg.r1), _ecliptic(leg.v_inf_out + leg.body_velocity1)
    swept = leg.transfer_angle_rad.item() + 2.0 * np.pi * leg.revs.item()
    return conic_path(start, speed, np.linspace(0.0, swept, 2 + int(swept / _STEP_RAD)))


def _orbit_path(table: StateTable, reach_km: float) -> np.ndarray:
    """The osculating orbit (3, k): all of it where it stays within reach, else the part that does."""
    r, v = _ecliptic(table.position), _ecliptic(table.velocity)
    h = np.cross(r, v)
    p = h @ h / GM_SUN_KM3_S2
    to_periapsis = np.cross(v, h) / GM_SUN_KM3_S2 - r / np.linalg.norm(r)
    e = float(np.linalg.norm(to_periapsis))
    if e < 1.0 and p / (1.0 - e) <= reach_km:
        return conic_path(r, v, np.linspace(0.0, 2.0 * np.pi, 1 + int(2.0 * np.pi / _STEP_RAD)))
    now = np.arctan2(np.cross(to_periapsis, r) @ h / np.linalg.norm(h), to_periapsis @ r)
    farthest = np.arccos((p / reach_km - 1.0) / e)
    anomaly = np.linspace(-farthest, farthest, 2 + int(2.0 * farthest / _STEP_RAD))
    return conic_path(r, v, anomaly - now)


def conic_path(r: np.ndarray, v: np.ndarray, angles: np.ndarray) -> np.ndarray:
    """Places (3, k) km on the conic of a heliocentric state, at angles (k,) rad from it along the motion.

    The equation of the orbit, p/r = 1 + e·r̂, taken from where the state is, so that circles need no apsis.
    r (3,) km, v (3,) km/s; any conic that is not a straight line.
    """
    h = np.cross(r, v)
    distance, momentum = np.linalg.norm(r), np.linalg.norm(h)
    outward = r / distance
    onward = np.cross(h / momentum, outward)
    p = momentum**2 / GM_SUN_KM3_S2
    e_outward, e_onward = p / distance - 1.0, -(outward @ v) * momentum / GM_SUN_KM3_S2
    cosine, sine = np.cos(angles), np.sin(angles)
    return (outward[:, None] * cosine + onward[:, None] * sine) * (
        p / (1.0 + e_outward * cosine + e_onward * sine)
    )


def _ecliptic(vector: np.ndarray) -> np.ndarray:
    """A vector of one cell, (3, 1, …) in ICRF axes, as (3,) in those of the ecliptic."""
    return icrf_to_ecliptic(np.reshape(vector, 3))

"""What a route is to be judged by, without a survey: the Hohmann floor and the phased bi-elliptic transfer.

Both know the planets as circles in one plane; what a real flight pays beyond them is for tilt, eccentricity
and for not standing right. Their burns at the two ends are the scenario's: same parking and capture orbits,
through the same measures, with a launch asymptote that needs no turn of the parking orbit's plane.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from porkgrid.physics.conics import icrf_to_ecliptic
from porkgrid.physics.constants import AU_KM, DAY_S, GM_SUN_KM3_S2
from porkgrid.physics.transfers import bielliptic, bielliptic_mid_radius, hohmann
from porkgrid.sky.bodies import Body, pole_axes
from porkgrid.sky.epochs import iso_from_jd
from porkgrid.sky.states import StateTable, state_table
from porkgrid.survey.legs import LegCells
from porkgrid.survey.plan import Plan

Floats = NDArray[np.float64]

FARTHEST_MID_AU = (
    50.0  # of the bi-elliptic's deep-space burn: 130 years of flight for what little more is to gain
)
DEEP_SPACE = "deep_space_burn_km_s"
MID_RADIUS = "mid_radius_au"
ROUNDEST = 0.8  # eccentricity above which a circle says nothing of an orbit

# What the floor has of the measures, beside the masses: nothing that depends on dates or directions.
_OF_THE_FLOOR = ("c3_km2_s2", "v_inf_departure_km_s", "v_inf_arrival_km_s", "entry_speed_km_s",
                 "dv_departure_km_s", "dv_capture_km_s", "dv_total_km_s")  # fmt: skip
_OF_ITS_ENDS = ("c3_km2_s2", "v_inf_departure_km_s", "v_inf_arrival_km_s", "dv_departure_km_s",
                "dv_capture_km_s")  # fmt: skip
_PHASE_STEP_RAD = 0.1  # of the target, between the dates that its longitude is taken at


@dataclass(frozen=True)
class Baseline:
    """A transfer to compare with: its name, what it is, its measures by their names, ISO dates or None."""

    title: str
    meaning: str
    measures: dict[str, float]
    departure: str | None = None
    arrival: str | None = None


def end_bodies(plan: Plan) -> tuple[str, str]:
    """Names of the first and the last body, which the baselines join."""
    return plan.tables[0].body.name, plan.tables[-1].body.name


def floor_measures(plan: Plan) -> list[str]:
    """Those of the plan's measures that a transfer without dates has: speeds, burns and masses."""
    masses = [name for name, each in plan.measures.items() if each.unit == "kg"]
    return [name for name in (*_OF_THE_FLOOR, *masses) if name in plan.measures]


def hohmann_floor(plan: Plan) -> Baseline | None:
    """The Hohmann transfer between circles of the two semi-major axes, osculating at mid-window.

    None where an orbit is open or the route ends at the body it left.
    """
    first, last = (_middle_state(table) for table in (plan.tables[0], plan.tables[-1]))
    r1, r2 = (_semi_major_axis(table) for table in (first, last))
    if plan.tables[0].body == plan.tables[-1].body or min(r1, r2) <= 0.0:
        return None
    flight = hohmann(r1, r2, GM_SUN_KM3_S2)
    measures = _measured(plan, first, flight.departure_km_s, flight.arrival_km_s, floor_measures(plan))
    measures |= {"tof_days": flight.tof_s / DAY_S}
    return Baseline(
        "Hohmann floor",
        f"circles of {r1 / AU_KM:.3f} and {r2 / AU_KM:.3f} au in one plane",
        {name: float(np.ravel(value)[0]) for name, value in measures.items()},
    )


def phased_bielliptic(plan: Plan) -> pd.DataFrame:
    """The cheapest phased bi-elliptic transfer of each departure day of the plan.

    Two half-ellipses make one turn, so the target must stand at arrival at the longitude at which the
    departure body stood at departure, any number of its own turns later. That gives the arrival dates, the
    flight time gives the radius between (up to `FARTHEST_MID_AU`), and of those the cheapest is kept, by the
    sum of burns; without a parking orbit the excess speed stands in for the departure burn. Circles have the
    Sun distances of the departure body on that day and of the target at arrival.

    Columns: departure and arrival (ISO), tof_days, mid_radius_au, c3_km2_s2, v_inf_departure_km_s,
    deep_space_burn_km_s, v_inf_arrival_km_s, and with orbits dv_departure_km_s, dv_capture_km_s,
    dv_total_km_s; NaN on days that have none.
    """
    leave = plan.tables[0]
    r1 = np.linalg.norm(leave.position, axis=0)[:, None]
    arrival, r2 = _passages(plan, r1)
    tof_s = (arrival - leave.jd[:, None]) * DAY_S
    r_mid = bielliptic_mid_radius(tof_s, r1, r2, GM_SUN_KM3_S2)
    r_mid[r_mid > FARTHEST_MID_AU * AU_KM] = np.nan
    flight = bielliptic(r1, r2, r_mid, GM_SUN_KM3_S2)
    names = [name for name in _OF_ITS_ENDS if name in plan.measures]
    every = _measured(plan, leave, flight.departure_km_s, flight.arrival_km_s, names)
    every |= {"tof_days": tof_s / DAY_S, MID_RADIUS: r_mid / AU_KM, DEEP_SPACE: flight.middle_km_s}
    paid = every[DEEP_SPACE] + every.get("dv_capture_km_s", 0.0)
    if "dv_departure_km_s" in every:
        paid = every["dv_total_km_s"] = paid + every["dv_departure_km_s"]
    else:
        paid = paid + every["v_inf_departure_km_s"]
    cheapest = np.argmin(np.where(np.isnan(paid), np.inf, paid), axis=1)[:, None]
    none = np.isnan(np.take_along_axis(paid, cheapest, axis=1)[:, 0])
    days = {
        name: np.where(none, np.nan, np.take_along_axis(values, cheapest, axis=1)[:, 0])
        for name, values in every.items()
    }
    arrives = np.take_along_axis(arrival, cheapest, axis=1)[:, 0]
    table = pd.DataFrame(days)
    table.insert(0, "departure", [iso_from_jd(jd) for jd in leave.jd])
    table.insert(
        1, "arrival", [None if no else iso_from_jd(jd) for no, jd in zip(none, arrives, strict=True)]
    )
    return table


def cheapest_bielliptic(plan: Plan, days: pd.DataFrame) -> Baseline | None:
    """The best day of `phased_bielliptic`; None where no day has one, or the route ends where it began."""
    by = "dv_total_km_s" if "dv_total_km_s" in days else "v_inf_departure_km_s"
    if plan.tables[0].body == plan.tables[-1].body or days[by].isna().all():
        return None
    day = days.iloc[int(np.nanargmin(days[by].to_numpy()))]
    return Baseline(
        "phased bi-elliptic",
        f"by way of {day[MID_RADIUS]:.2f} au, the best of {len(days):,} departure dates",
        {str(name): float(value) for name, value in day.drop(["departure", "arrival"]).items()},
        departure=str(day["departure"]),
        arrival=str(day["arrival"]),
    )


def _middle_state(table: StateTable) -> StateTable:
    middle = slice(len(table.jd) // 2, len(table.jd) // 2 + 1)
    return StateTable(table.body, table.jd[middle], table.position[:, middle], table.velocity[:, middle])


def _semi_major_axis(table: StateTable) -> float:
    """Osculating semi-major axis about the Sun, km, of a table's first state (vis-viva); negative if open."""
    r, v2 = np.linalg.norm(table.position[:, 0]), np.sum(np.square(table.velocity[:, 0]))
    return float(1.0 / (2.0 / r - v2 / GM_SUN_KM3_S2))


def _measured(
    plan: Plan, leave: StateTable, v_out: Floats, v_in: Floats, names: list[str]
) -> dict[str, Floats]:
    """Those of the named measures that the plan has, of flights with these excess speeds.

    leave: table of n departures; v_out, v_in: (n, m) or () km/s.
    """
    rows = len(leave.jd)
    out = np.broadcast_to(v_out, (rows, np.size(v_out) // rows))
    into = np.broadcast_to(v_in, out.shape)
    reach = _middle_state(plan.tables[-1])
    along = _node_axis(leave.body, leave.jd)
    arrive_along = _node_axis(reach.body, reach.jd)
    nothing = np.zeros(out.shape)
    leg = LegCells(
        r1=leave.position[:, :, None],
        r2=reach.position[:, :, None],
        body_velocity1=leave.velocity[:, :, None],
        body_velocity2=reach.velocity[:, :, None],
        jd2=reach.jd,
        tof_days=nothing,
        v_inf_out=along.T[:, :, None] * out,
        v_inf_in=arrive_along.T[:, :, None] * into,
        status=nothing.astype(np.int8),
        revs=nothing,
        branch=nothing,
    )
    cells = plan.cells(leave, reach, reach.position, [leg])
    return {name: np.broadcast_to(plan.measures[name].compute(cells), out.shape) for name in names}


def _node_axis(body: Body, jd: Floats) -> Floats:
    """(n, 3) unit vectors in the body's equator: any parking orbit reaches such an asymptote."""
    if body.pole is None:
        return np.broadcast_to(np.array([1.0, 0.0, 0.0]), (len(jd), 3))
    return pole_axes(body, jd)[:, 0, :]


def _passages(plan: Plan, r1: Floats) -> tuple[Floats, Floats]:
    """When the target passes the longitude that the departure body had, and its distance then: (n, turns).

    Between dates a tenth of a radian apart the target's date as a function of its longitude, and its
    distance, are cubic Hermite polynomials. NaN where the target does not come there in time.
    """
    from scipy.interpolate import CubicHermiteSpline

    leave, target = plan.tables[0], plan.tables[-1].body
    nothing = np.full((len(leave.jd), 1), np.nan)
    track = _track(plan, target, float(r1.max()))
    if track is None:
        return nothing, nothing
    longitude, rate = _longitude(track), _longitude_rate(track)
    longitude = np.unwrap(longitude)
    if not np.all(np.diff(longitude) > 0.0):  # it moves the other way: no coplanar transfer meets it
        return nothing, nothing
    at = _longitude(leave)
    turn = 2.0 * np.pi
    first = at + turn * np.ceil((longitude[0] - at) / turn)
    turns = np.arange(int((longitude[-1] - longitude[0]) / turn) + 1)
    wanted = first[:, None] + turn * turns
    jd = CubicHermiteSpline(longitude, track.jd, 1.0 / (rate * DAY_S))(wanted)
    jd[wanted > longitude[-1]] = np.nan
    distance = np.linalg.norm(track.position, axis=0)
    radial = np.sum(track.position * track.velocity, axis=0) / distance
    return jd, CubicHermiteSpline(track.jd, distance, radial * DAY_S)(jd)


def _track(plan: Plan, target: Body, r1_km: float) -> StateTable | None:
    """States of the target, first departure to last arrival that counts; None if its orbit is of no use."""
    state = _middle_state(plan.tables[-1])
    r, v = state.position[:, 0], state.velocity[:, 0]
    axis = _semi_major_axis(state)
    momentum = float(np.linalg.norm(np.cross(r, v)))
    eccentricity = np.sqrt(max(0.0, 1.0 - momentum**2 / (GM_SUN_KM3_S2 * axis))) if axis > 0.0 else np.inf
    if eccentricity > ROUNDEST:
        return None
    perihelion, aphelion = axis * (1.0 - eccentricity), axis * (1.0 + eccentricity)
    leave = plan.tables[0].jd
    longest_s = float(bielliptic(r1_km, aphelion, FARTHEST_MID_AU * AU_KM, GM_SUN_KM3_S2).tof_s)
    first, last = plan.ephemeris.coverage(target)
    start, end = max(leave[0], first), min(leave[-1] + longest_s / DAY_S, last)
    step_days = _PHASE_STEP_RAD / (momentum / perihelion**2) / DAY_S
    return state_table(plan.ephemeris, target, np.linspace(start, end, 2 + int((end - start) / step_days)))


def _longitude(table: StateTable) -> Floats:
    """(n,) ecliptic longitude, radians."""
    x, y, _ = icrf_to_ecliptic(table.position.T).T
    return np.arctan2(y, x)


def _longitude_rate(table: StateTable) -> Floats:
    """(n,) rate of the ecliptic longitude, radians per second."""
    x, y, _ = icrf_to_ecliptic(table.position.T).T
    vx, vy, _ = icrf_to_ecliptic(table.velocity.T).T
    return (x * vy - y * vx) / (x * x + y * y)

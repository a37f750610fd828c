"""The patched-conic trajectory of a candidate, sampled in time: what a survey knows, as plain data.

Legs are two-body arcs about the Sun from body to body. Around an encounter whose periapsis is known there
is a hyperbola about the body as far as its sphere of influence; the encounter's date is that of periapsis.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from importlib.metadata import version
from itertools import pairwise

import numpy as np

from porkgrid.errors import RequestError
from porkgrid.handoff.burnmasses import with_masses
from porkgrid.handoff.ccsds import centre_name
from porkgrid.handoff.passages import Passage, arrival_passage, departure_passage, flyby_passage
from porkgrid.handoff.sampling import sample_conic
from porkgrid.handoff.trajectory import Burn, Quantity, Segment, Trajectory, Waypoint
from porkgrid.physics.conics import propagate
from porkgrid.physics.constants import DAY_S, GM_SUN_KM3_S2
from porkgrid.physics.lambert import FLOWN
from porkgrid.sky.bodies import gm_of
from porkgrid.sky.epochs import iso_from_jd
from porkgrid.sky.states import state_table
from porkgrid.survey.candidates import Picked
from porkgrid.survey.cells import Cells
from porkgrid.survey.plan import Plan
from porkgrid.survey.routes import cells_at
from porkgrid.survey.store import CAUTION

MODEL = "patched conics: two-body arcs about the Sun, joined at encounters by hyperbolas about the body"
_SUN_MODEL = "two-body conic about the Sun, from the centre of one body to that of the next"
_BODY_MODEL = "two-body hyperbola about the body, within its sphere of influence"
_MOST_OF_LEG = 0.4  # of a leg may lie within a sphere of influence, so that two spheres never meet
_NOTES = (
    "Encounter dates are those of periapsis; a leg about the Sun nevertheless runs between the bodies' "
    "centres, so that at a sphere of influence it and the hyperbola do not meet. A full-force trajectory has "
    "no such seam.",
    "Where the parking orbit's inclination allows two planes of departure, that is taken in which the "
    "spacecraft is northbound where it points along the asymptote; beyond its inclination the plane of least "
    "inclination to the body's equator. The plane of arrival is that of least inclination to the ecliptic, "
    "B·R = 0; which one the mission needs is open.",
    "Burns are impulsive and at periapsis.",
)


@dataclass(frozen=True, eq=False)
class _Leg:
    """One leg about the Sun: the state that it starts with."""

    first_jd: float
    last_jd: float
    position: np.ndarray
    velocity: np.ndarray


def patched_trajectory(
    plan: Plan, picked: Picked, quantities: tuple[Quantity, ...], checksums: tuple[tuple[str, str], ...]
) -> Trajectory:
    """Fly a candidate in patched conics and write it down in time.

    quantities: the candidate's measures (`quantities_of`); checksums: (file name, SHA-256) of the kernels.
    RequestError where a leg cannot be flown so.
    """
    cells = _flown(plan, picked)
    legs = [_leg(cells, picked.epochs, k) for k in range(len(cells.legs))]
    passages = _passages(cells, picked.epochs)
    passages = [_shortened(passage, legs, k) for k, passage in enumerate(passages)]
    delivered_kg = next((each.value for each in quantities if each.name == "delivered_mass_kg"), None)
    burns = with_masses([burn for passage in passages for burn in passage.burns], plan.masses, delivered_kg)
    return Trajectory(
        name=plan.scenario.name,
        route=plan.route,
        model=MODEL,
        segments=_segments(legs, passages),
        waypoints=_waypoints(legs, passages, burns),
        encounters=tuple(passage.encounter for passage in passages),
        burns=burns,
        quantities=quantities,
        notes=_NOTES,
        caution=CAUTION,
        kernel=plan.ephemeris.label,
        checksums=checksums,
        version=version("porkgrid"),
    )


def quantities_of(plan: Plan, values: dict[str, float]) -> tuple[Quantity, ...]:
    """A candidate's measures (survey.candidates.measures_at) with their units and meanings."""
    return tuple(
        Quantity(name, float(values[name]), measure.unit, measure.meaning)
        for name, measure in plan.measures.items()
    )


def _flown(plan: Plan, picked: Picked) -> Cells:
    tables = [
        state_table(plan.ephemeris, table.body, np.array([jd]))
        for table, jd in zip(plan.tables, picked.epochs, strict=True)
    ]
    cells = cells_at(plan, tables, list(picked.options))
    for n, (leg, dates) in enumerate(zip(cells.legs, pairwise(picked.epochs), strict=True), start=1):
        if leg.status.item() != FLOWN:
            first, last = map(iso_from_jd, dates)
            raise RequestError(
                f"leg {n}, {first} to {last}: cannot be flown with {picked.options[n - 1].revs} revolutions; "
                "take dates and options of a candidate"
            )
    return cells


def _leg(cells: Cells, epochs: tuple[float, ...], k: int) -> _Leg:
    leg = cells.legs[k]
    velocity = np.reshape(leg.v_inf_out + leg.body_velocity1, 3)
    return _Leg(epochs[k], epochs[k + 1], np.reshape(leg.r1, 3), velocity)


def _passages(cells: Cells, epochs: tuple[float, ...]) -> list[Passage]:
    """One per encounter, in flying order."""
    v_out = np.reshape(cells.legs[0].v_inf_out, 3)
    v_in = np.reshape(cells.legs[-1].v_inf_in, 3)
    here, there = cells.departure, cells.arrival
    flybys = [
        flyby_passage(
            n, each.body, epochs[n], np.reshape(cells.legs[n].r1, 3),
            np.reshape(each.v_in, 3), np.reshape(each.v_out, 3), float(np.ravel(each.periapsis_km)[0]),
        )
        for n, each in enumerate(cells.flybys, start=1)
    ]  # fmt: skip
    return [
        departure_passage(here.body, epochs[0], here.position[:, 0], v_out, cells.parking),
        *flybys,
        arrival_passage(there.body, epochs[-1], there.position[:, 0], v_in, _capture(cells)),
    ]


def _capture(cells: Cells) -> tuple[float, float] | None:
    """Radius of the capture orbit's periapsis and the burn there."""
    if cells.capture is None:
        return None
    return float(np.ravel(cells.capture_periapsis_km)[0]), float(np.ravel(cells.dv_capture)[0])


def _shortened(passage: Passage, legs: list[_Leg], k: int) -> Passage:
    """The passage with its times inside the sphere of influence kept within the legs beside it."""
    days_in = _MOST_OF_LEG * (legs[k - 1].last_jd - legs[k - 1].first_jd) if k > 0 else 0.0
    days_out = _MOST_OF_LEG * (legs[k].last_jd - legs[k].first_jd) if k < len(legs) else 0.0
    return replace(
        passage,
        seconds_in=min(passage.seconds_in, days_in * DAY_S),
        seconds_out=min(passage.seconds_out, days_out * DAY_S),
    )


def _segments(legs: list[_Leg], passages: list[Passage]) -> tuple[Segment, ...]:
    """Hyperbolas and arcs about the Sun in turn, as they are flown."""
    found: list[Segment] = []
    for k, passage in enumerate(passages):
        found += _hyperbolas(passage)
        if k < len(legs):
            found.append(_sun_segment(legs[k], k + 1, passage, passages[k + 1]))
    return tuple(found)


def _sun_segment(leg: _Leg, n: int, before: Passage, after: Passage) -> Segment:
    jd, position, velocity = sample_conic(
        leg.position, leg.velocity, GM_SUN_KM3_S2, leg.first_jd, leg.first_jd, leg.last_jd
    )
    return Segment(
        label=f"Leg {n}, {before.body.title} to {after.body.title}",
        centre_name="SUN",
        centre_naif_id=10,
        model=_SUN_MODEL,
        jd_tdb=jd,
        position=position,
        velocity=velocity,
        usable_jd=(before.leaves_jd, after.enters_jd),
    )


def _hyperbolas(passage: Passage) -> list[Segment]:
    """The pieces before and after periapsis, where the burn is."""
    jd, found = passage.encounter.jd_tdb, []
    for state, first, last, what in (
        (passage.coming, passage.enters_jd, jd, "to"),
        (passage.leaving, jd, passage.leaves_jd, "from"),
    ):
        if state is None or not first < last:
            continue
        epochs, position, velocity = sample_conic(*state, gm_of(passage.body), jd, first, last)
        found.append(
            Segment(
                label=f"{passage.encounter.label}: {what} periapsis at {passage.body.title}",
                centre_name=centre_name(passage.body),
                centre_naif_id=passage.body.naif_id,
                model=_BODY_MODEL,
                jd_tdb=epochs,
                position=position,
                velocity=velocity,
                usable_jd=(first, last),
            )
        )
    return found


def _waypoints(legs: list[_Leg], passages: list[Passage], burns: tuple[Burn, ...]) -> tuple[Waypoint, ...]:
    """Departure, each leg where it leaves a flyby's sphere of influence, and the orbit after arrival.

    Each has the burns that come before the next; the orbit after arrival is that after the last burn.
    """
    first, *flybys, last = passages
    found = [_start(first, legs[0])]
    for k, passage in enumerate(flybys, start=1):
        leg, jd = legs[k], passage.leaves_jd
        position, velocity = propagate(leg.position, leg.velocity, (jd - leg.first_jd) * DAY_S, GM_SUN_KM3_S2)
        found.append(Waypoint(f"After flyby {k}", "SUN", jd, position, velocity))
    ends = [*(waypoint.jd_tdb for waypoint in found[1:]), np.inf]
    with_burns = [
        replace(waypoint, burns=tuple(burn for burn in burns if waypoint.jd_tdb <= burn.jd_tdb < end))
        for waypoint, end in zip(found, ends, strict=True)
    ]
    return (*with_burns, _end(last, legs[-1]))


def _start(passage: Passage, leg: _Leg) -> Waypoint:
    """In the parking orbit just before the burn; without one, on the first leg at the body's centre."""
    jd = passage.encounter.jd_tdb
    if passage.orbit is None:
        return Waypoint("Departure", "SUN", jd, leg.position, leg.velocity)
    return Waypoint("Departure", centre_name(passage.body), jd, *passage.orbit)


def _end(passage: Passage, leg: _Leg) -> Waypoint:
    """In the capture orbit just after the burn; without one, on the last leg at the body's centre."""
    jd = passage.encounter.jd_tdb
    if passage.orbit is None:
        state = propagate(leg.position, leg.velocity, (jd - leg.first_jd) * DAY_S, GM_SUN_KM3_S2)
        return Waypoint("Arrival", "SUN", jd, *state)
    return Waypoint("After arrival", centre_name(passage.body), jd, *passage.orbit)

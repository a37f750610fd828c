"""The trajectory that the full-force check flew, as the plain data that the writers read.

The integrator's states are told from the Sun. Within a body's sphere of influence they are told from the body
here, as in patched conics, and everywhere they are taken anew at the epochs that interpolation needs.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from importlib.metadata import version

import numpy as np

from porkgrid.handoff.burnmasses import CAPTURE, INJECTION, with_masses
from porkgrid.handoff.ccsds import centre_name
from porkgrid.handoff.flights import body_state
from porkgrid.handoff.forces import Forces, forces_over
from porkgrid.handoff.hyperbola import sphere_of_influence_km
from porkgrid.handoff.passages import parking_velocity
from porkgrid.handoff.report import FlownEncounter, FlownLeg, FullForceReport
from porkgrid.handoff.sampling import course_rate, sample_seconds
from porkgrid.handoff.trajectory import Burn, EncounterState, Quantity, Segment, Trajectory, Waypoint
from porkgrid.physics.constants import DAY_S, GM_SUN_KM3_S2
from porkgrid.physics.nbody import CENTRE, Field, fly
from porkgrid.sky.bodies import Body, gm_of, radius_of
from porkgrid.survey.plan import Plan
from porkgrid.survey.store import CAUTION

_SUN_ID = 10
# A body just left or soon reached still bends the path about the Sun, little but within a short time.
_PASSING = 0.5
_NOTES = (
    "Epochs of encounters are those of periapsis. v∞, C3 and the launch asymptote are those of the hyperbola "
    "that osculates about the body at periapsis.",
    "Segments about a body end at its sphere of influence; they and those about the Sun are one trajectory.",
    "Burns are impulsive and at periapsis.",
)


@dataclass(frozen=True, eq=False)
class _Told:
    """A leg as integrated, states (k, 6) at times (k,) s of the field, from one centre of the field."""

    field: Field
    origin: int
    seconds: np.ndarray
    states: np.ndarray

    def at(self, t_s: float) -> np.ndarray:
        """State (6,) at any time, flown from the nearest of the states."""
        k = int(np.argmin(np.abs(self.seconds - t_s)))
        if self.seconds[k] == t_s:
            return self.states[k]
        return fly(self.field, float(self.seconds[k]), t_s, self.states[k], self.origin).states[:, -1]


def flown_trajectory(
    plan: Plan, report: FullForceReport, checksums: tuple[tuple[str, str], ...]
) -> Trajectory:
    """The check's trajectory with its burns, encounters and numbers.

    The report has to hold every leg (one that could not be flown is missing from it): ValueError otherwise.
    """
    bodies = [table.body for table in plan.tables]
    if len(report.legs) != len(bodies) - 1:
        raise ValueError("the full-force check did not fly every leg")
    model = f"full force: {', '.join(report.forces)} as point masses; {report.integrator}"
    quantities = _quantities(plan, report)
    delivered_kg = next((each.value for each in quantities if each.name == "delivered_mass_kg"), None)
    met = [_encounter(report, bodies[k], k) for k in range(len(bodies))]
    burns = with_masses(_burns(plan, report), plan.masses, delivered_kg)
    forces = forces_over(plan.ephemeris, bodies, met[0].jd_tdb, met[-1].jd_tdb)
    segments = [piece for leg in report.legs for piece in _pieces(forces, bodies, leg, model)]
    return Trajectory(
        name=plan.scenario.name,
        route=plan.route,
        model=model,
        segments=tuple(segments),
        waypoints=_waypoints(plan, report, segments, burns),
        encounters=tuple(met),
        burns=burns,
        quantities=quantities,
        notes=(*_NOTES, *(f"{each[:1].upper()}{each[1:]}." for each in report.assumptions)),
        caution=CAUTION.replace("from patched conics", "with point masses"),
        kernel=report.ephemeris,
        checksums=checksums,
        version=version("porkgrid"),
    )


def _quantities(plan: Plan, report: FullForceReport) -> tuple[Quantity, ...]:
    return tuple(
        Quantity(line.name, line.full_force, line.unit, plan.measures[line.name].meaning)
        for line in report.lines
        if line.name in plan.measures
    )


def _encounter(report: FullForceReport, body: Body, k: int) -> EncounterState:
    flown, lines = report.encounters[k], {line.name: line.full_force for line in report.lines}
    last = len(report.encounters) - 1
    prefix = "arrival" if k == last else f"flyby{k}"
    label = "Departure" if k == 0 else "Arrival" if k == last else f"Flyby {k}"
    return EncounterState(
        label=label,
        body=body.title,
        kind=flown.kind,
        jd_tdb=flown.jd,
        v_inf_in_km_s=flown.v_inf_in,
        v_inf_out_km_s=flown.v_inf_out,
        periapsis_km=flown.periapsis_km or None,
        altitude_km=_altitude_km(body, flown),
        b_t_km=lines.get(f"{prefix}_b_t_km"),
        b_r_km=lines.get(f"{prefix}_b_r_km"),
        c3_km2_s2=lines["c3_km2_s2"] if k == 0 else None,
        rla_deg=lines.get("rla_deg") if k == 0 else None,
        dla_deg=lines.get("dla_deg") if k == 0 else None,
    )


def _altitude_km(body: Body, flown: FlownEncounter) -> float | None:
    known = body.radius_km is not None and flown.periapsis_km > 0.0
    return flown.periapsis_km - radius_of(body) if known else None


def _burns(plan: Plan, report: FullForceReport) -> list[Burn]:
    """Injection and capture where the scenario has the orbits, and what is burnt at flybys."""
    first, *flybys, last = report.encounters
    burns = []
    if plan.parking is not None:
        assert first.velocity_after is not None
        slow = parking_velocity(
            plan.tables[0].body, first.jd, first.position, first.velocity_after, plan.parking
        )
        burns.append(Burn(INJECTION, first.jd, first.velocity_after - slow))
    for n, flown in enumerate(flybys, start=1):
        assert flown.velocity_after is not None
        assert flown.velocity_before is not None
        burns.append(Burn(f"Flyby {n}, at periapsis", flown.jd, flown.velocity_after - flown.velocity_before))
    if plan.capture is not None:
        burns.append(Burn(CAPTURE, last.jd, _captured(report) - _fast(last)))
    return burns


def _fast(last: FlownEncounter) -> np.ndarray:
    assert last.velocity_before is not None
    return last.velocity_before


def _captured(report: FullForceReport) -> np.ndarray:
    """Velocity (3,) in the capture orbit at its periapsis."""
    fast = _fast(report.encounters[-1])
    return fast * (1.0 - report.line("dv_capture_km_s").full_force / np.linalg.norm(fast))


def _pieces(forces: Forces, bodies: list[Body], leg: FlownLeg, model: str) -> list[Segment]:
    """A leg about the body it leaves, about the Sun, and about the body it reaches."""
    here, there = bodies[leg.number - 1], bodies[leg.number]
    states = np.concatenate([leg.position, leg.velocity]).T
    from_sun = _Told(forces.field, CENTRE, leg.seconds, states)
    from_here, from_there = (_from_body(forces, body, from_sun) for body in (here, there))
    first, last = leg.seconds[[0, -1]]
    out, into = first, last
    if here.gm_km3_s2 is not None:
        out = leg.seconds[np.argmax(_outside(here, from_here, from_sun))]
    if there.gm_km3_s2 is not None:
        outside = _outside(there, from_there, from_sun)
        into = leg.seconds[len(outside) - 1 - np.argmax(outside[::-1])]
    label = f"Leg {leg.number}, {here.title} to {there.title}"
    found = []
    if out > first:
        found.append(
            _piece(forces, (here, there), leg, from_here, here, (first, out), f"{label}: leaving", model)
        )
    found.append(_piece(forces, (here, there), leg, from_sun, None, (out, into), label, model))
    if into < last:
        found.append(
            _piece(forces, (here, there), leg, from_there, there, (into, last), f"{label}: arriving", model)
        )
    return found


def _from_body(forces: Forces, body: Body, from_sun: _Told) -> _Told:
    """The states of a leg told from a body."""
    carried = np.array([body_state(forces, body, t_s) for t_s in from_sun.seconds])
    return replace(from_sun, origin=forces.index(body), states=from_sun.states - carried)


def _outside(body: Body, told: _Told, from_sun: _Told) -> np.ndarray:
    """Which states (k,) lie outside the body's sphere of influence."""
    sun_km = np.linalg.norm(from_sun.states[:, :3] - told.states[:, :3], axis=1)
    edge = sphere_of_influence_km(gm_of(body), float(sun_km.mean()))
    return np.linalg.norm(told.states[:, :3], axis=1) > edge


def _piece(
    forces: Forces,
    passed: tuple[Body, Body],
    leg: FlownLeg,
    told: _Told,
    body: Body | None,
    span: tuple[float, float],
    label: str,
    model: str,
) -> Segment:
    first, last = span
    gm = GM_SUN_KM3_S2 if body is None else gm_of(body)

    def rate_at(at_s: float) -> float:
        state = told.at(first + at_s)
        rates = [course_rate(state[:3], state[3:], gm)]
        for other in passed if body is None else ():
            away = state - body_state(forces, other, first + at_s)
            rates.append(_PASSING * float(np.linalg.norm(away[3:]) / np.linalg.norm(away[:3])))
        return max(rates)

    jd = leg.reference_jd + (first + sample_seconds(rate_at, last - first)) / DAY_S
    # The states are those of the dates as they are held, which round to 40 microseconds
    states = np.array([told.at(t_s) for t_s in (jd - leg.reference_jd) * DAY_S])
    return Segment(
        label=label,
        centre_name="SUN" if body is None else centre_name(body),
        centre_naif_id=_SUN_ID if body is None else body.naif_id,
        model=model,
        jd_tdb=jd,
        position=states[:, :3],
        velocity=states[:, 3:],
        usable_jd=(float(jd[0]), float(jd[-1])),
    )


def _waypoints(
    plan: Plan, report: FullForceReport, segments: list[Segment], burns: tuple[Burn, ...]
) -> tuple[Waypoint, ...]:
    """Departure, the path about the Sun after each flyby, and the orbit after arrival, with their burns."""
    first, last = report.encounters[0], report.encounters[-1]
    about_sun = [each for each in segments if each.centre_name == "SUN"]
    found = [_start(plan, first, about_sun[0])]
    for n, leg in enumerate(about_sun[1:], start=1):
        found.append(Waypoint(f"After flyby {n}", "SUN", leg.usable_jd[0], leg.position[0], leg.velocity[0]))
    ends = [*(each.jd_tdb for each in found[1:]), np.inf]
    with_burns = [
        replace(each, burns=tuple(burn for burn in burns if each.jd_tdb <= burn.jd_tdb < end))
        for each, end in zip(found, ends, strict=True)
    ]
    if plan.capture is None:
        leg = about_sun[-1]
        return (*with_burns, Waypoint("Arrival", "SUN", leg.usable_jd[1], leg.position[-1], leg.velocity[-1]))
    centre = centre_name(plan.tables[-1].body)
    return (*with_burns, Waypoint("After arrival", centre, last.jd, last.position, _captured(report)))


def _start(plan: Plan, first: FlownEncounter, leg: Segment) -> Waypoint:
    if plan.parking is None:
        return Waypoint("Departure", "SUN", leg.usable_jd[0], leg.position[0], leg.velocity[0])
    assert first.velocity_after is not None
    body = plan.tables[0].body
    slow = parking_velocity(body, first.jd, first.position, first.velocity_after, plan.parking)
    return Waypoint("Departure", centre_name(body), first.jd, first.position, slow)

"""The patched candidate as the full-force check takes it: its cell, its encounters and a first guess."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from porkgrid.errors import RequestError
from porkgrid.handoff.forces import Forces, forces_over
from porkgrid.handoff.shooting import Problem
from porkgrid.handoff.stops import End, Hold, Pass, signed_burn
from porkgrid.physics.lambert import ECLIPTIC_POLE_ICRF, FLOWN
from porkgrid.physics.periapsis import tilt_for_inclination
from porkgrid.sky.bodies import Body
from porkgrid.sky.epochs import iso_from_jd
from porkgrid.sky.states import state_table
from porkgrid.survey.candidates import Picked
from porkgrid.survey.cells import Cells
from porkgrid.survey.plan import Plan
from porkgrid.survey.routes import cells_at

Floats = NDArray[np.float64]

POLE = np.array(ECLIPTIC_POLE_ICRF)  # of the aim planes, as in the figure of a flyby
# Where a scenario has no parking orbit: the height of a low orbit (practice).
LOW_ALTITUDE_KM = 200.0
# A burn of less is what the dates' grid or their refinement leaves over, and is not meant.
LEAST_BURN_KM_S = 1e-3
_EXCESS = (
    "C3, asymptotes, v∞ and aim points in full force are those of the hyperbola that osculates at periapsis"
)


@dataclass(frozen=True, eq=False)
class Patched:
    """A candidate's one cell, the problem that makes it a trajectory, and where to start on it."""

    cells: Cells
    problem: Problem
    guess: Floats
    assumptions: tuple[str, ...]


def patched(plan: Plan, picked: Picked) -> Patched:
    """Fly a candidate's legs as conics once more and set up its check.

    RequestError where a leg cannot be flown so, or the ephemeris has no such dates.
    """
    tables = [
        state_table(plan.ephemeris, table.body, np.array([jd]))
        for table, jd in zip(plan.tables, picked.epochs, strict=True)
    ]
    cells = cells_at(plan, tables, list(picked.options))
    for n, leg in enumerate(cells.legs, start=1):
        if leg.status.item() != FLOWN:
            dates = f"{iso_from_jd(picked.epochs[n - 1])} to {iso_from_jd(picked.epochs[n])}"
            raise RequestError(f"leg {n}, {dates}: no such flight; take dates and options of a candidate")
    bodies = [table.body for table in tables]
    forces = forces_over(plan.ephemeris, bodies, picked.epochs[0], picked.epochs[-1])
    departure, leave = _departure(cells, forces)
    arrival, arrive = _arrival(cells, forces, picked.epochs[-1])
    passes, guesses = [], [_vector(cells.legs[0].v_inf_out)]
    for n, (flyby, jd) in enumerate(zip(cells.flybys, picked.epochs[1:-1], strict=True), start=1):
        guess = np.concatenate([_vector(flyby.v_in), _vector(flyby.v_out), [0.0]])
        unpowered = Pass(flyby.body, forces.seconds(jd), 0.0, _least_radius(plan, n, flyby.body), Hold.BURN)
        burn = signed_burn(unpowered, guess)
        passes.append(replace(unpowered, burn_km_s=burn if abs(burn) > LEAST_BURN_KM_S else 0.0))
        guesses.append(guess)
    guesses.append(_vector(cells.legs[-1].v_inf_in))
    problem = Problem(forces, (departure, *passes, arrival))
    return Patched(cells, problem, np.concatenate(guesses), (leave, arrive, _EXCESS))


def _departure(cells: Cells, forces: Forces) -> tuple[End, str]:
    body, orbit = cells.departure.body, cells.parking
    pole = cells.departure_axes[0, 2] if body.pole is not None else POLE
    start = forces.seconds(float(cells.departure.jd[0]))
    if orbit is None:
        radius, what = _low_periapsis(body, LOW_ALTITUDE_KM)
        return End(body, start, radius, pole, 0.0), f"no parking orbit in the scenario: {what}"
    tilt, plane = 0.0, "the plane of least inclination that holds the asymptote"
    if orbit.inclination_rad is not None:
        tilt = tilt_for_inclination(_vector(cells.legs[0].v_inf_out), pole, orbit.inclination_rad)
        plane = (
            f"the parking orbit's plane at {np.degrees(orbit.inclination_rad):g} degrees, or nearest to it"
        )
    return End(body, start, orbit.periapsis_km, pole, tilt), f"departure at parking periapsis, in {plane}"


def _arrival(cells: Cells, forces: Forces, jd: float) -> tuple[End, str]:
    body = cells.arrival.body
    if cells.capture is not None:
        radius = float(np.ravel(cells.capture_periapsis_km)[0])
        what = "arrival at the capture orbit's periapsis"
    else:
        altitude = body.entry_altitude_km or body.min_flyby_altitude_km or LOW_ALTITUDE_KM
        radius, what = _low_periapsis(body, altitude)
        what = f"no capture orbit in the scenario: {what}"
    if radius > 0.0:
        what += ", on the side of +T: prograde, B·R = 0"
    return End(body, forces.seconds(jd), radius, POLE, 0.0), what


def _low_periapsis(body: Body, altitude_km: float) -> tuple[float, str]:
    if body.gm_km3_s2 is None or body.radius_km is None:
        return 0.0, f"{body.title}'s centre"
    return body.radius_km + altitude_km, f"periapsis at {altitude_km:g} km altitude"


def _least_radius(plan: Plan, number: int, body: Body) -> float:
    """Least periapsis radius that the plan's limits allow at a flyby, km."""
    name = f"flyby{number}_altitude_km"
    least = [bound.least for bound in plan.bounds if bound.measure.name == name]
    assert body.radius_km is not None  # admit.load_scenario refuses a flyby of a body without a radius
    return body.radius_km + max([0.0, *(value for value in least if value is not None)])


def _vector(cell: Floats) -> Floats:
    return np.asarray(cell, dtype=float).reshape(3)

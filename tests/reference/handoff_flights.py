"""Candidates that the hand-off's writers are tried on; all missions are invented.

Dates are near good ones of their windows; they need not be optima.
"""

from __future__ import annotations

import datetime as dt
from functools import cache
from pathlib import Path
from tempfile import TemporaryDirectory

from survey_scenarios import written

from porkgrid.handoff.conicpath import patched_trajectory, quantities_of
from porkgrid.handoff.trajectory import Trajectory
from porkgrid.sky.epochs import jd_from_date
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.candidates import Picked, measures_at
from porkgrid.survey.legs import LegOption
from porkgrid.survey.plan import Plan, make_plan

CREATED = dt.datetime(2026, 1, 1, 12, tzinfo=dt.UTC)
CHECKSUMS = (("de440.bsp", "0" * 64),)

_PARKING = "parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200, inclination_deg = 28.5 }"
_SHALLOW = "parking = { periapsis_altitude_km = 250, apoapsis_altitude_km = 900, inclination_deg = 5 }"
_CAPTURE = "capture = { periapsis_altitude_km = 400, apoapsis_altitude_km = 33000 }"
_FAR_CAPTURE = "capture = { periapsis_altitude_km = 300000, apoapsis_altitude_km = 8000000 }"
_SPACECRAFT = "\n[spacecraft]\nisp_s = 320\ndry_mass_kg = 900\n"

# name: title, what the first and the last encounter have, what follows them, (body, date) of each
_FLIGHTS = {
    "direct": ("Ouzel to Mars", _PARKING, _CAPTURE, "", [("earth", "2028-11-30"), ("mars", "2029-09-20")]),
    "bare": ("Ouzel past Mars", "", "", "", [("earth", "2028-11-30"), ("mars", "2029-09-20")]),
    "steep": ("Ouzel, shallow", _SHALLOW, "", "", [("earth", "2028-11-30"), ("mars", "2029-09-20")]),
    "fast": ("Swift, fast", _PARKING, _CAPTURE, "", [("earth", "2028-12-15"), ("mars", "2029-02-20")]),
    "one flyby": (
        "Godwit by Venus to Mars – Ärger",
        _PARKING,
        _CAPTURE,
        _SPACECRAFT,
        [("earth", "2034-07-28"), ("venus", "2034-12-10"), ("mars", "2035-07-12")],
    ),
    "two flybys": (
        "Gannet by Venus and Earth to Jupiter",
        _PARKING,
        _FAR_CAPTURE,
        "",
        [
            ("earth", "2037-09-08"),
            ("venus", "2038-01-26"),
            ("earth", "2040-11-27"),
            ("jupiter", "2044-07-10"),
        ],
    ),
}  # fmt: skip
FLIGHTS = tuple(_FLIGHTS)


@cache
def candidate_of(name: str) -> tuple[Plan, Picked]:
    """Plan a flight with windows of three days round its dates."""
    title, parking, capture, more, stops = _FLIGHTS[name]
    days = [dt.date.fromisoformat(day) for _, day in stops]
    text = f'name = "{title}"\n{more}'
    for k, ((body, _), day) in enumerate(zip(stops, days, strict=True)):
        first, last = day - dt.timedelta(1), day + dt.timedelta(1)
        text += f'\n[[encounter]]\nbody = "{body}"\nfirst = {first}\nlast = {last}\n'
        text += parking + "\n" if k == 0 else ""
        text += capture + "\n" if k == len(stops) - 1 else ""
    ways = [LegOption()] * (len(stops) - 1)
    if name == "two flybys":
        text += "[[leg]]\n[[leg]]\nmax_revs = 1\n[[leg]]\n"
        ways[1] = LegOption(revs=1)
    with TemporaryDirectory() as folder:
        plan = make_plan(load_scenario(written(Path(folder), text)))
    return plan, Picked(tuple(map(jd_from_date, days)), tuple(ways))


@cache
def trajectory_of(name: str) -> Trajectory:
    """The patched-conic trajectory of a flight."""
    plan, picked = candidate_of(name)
    return patched_trajectory(plan, picked, quantities_of(plan, measures_at(plan, picked)), CHECKSUMS)


@cache
def measures_of_flight(name: str) -> dict[str, float]:
    """The measures of a flight by name."""
    return measures_at(*candidate_of(name))

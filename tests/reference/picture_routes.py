"""Routes of every kind that the pictures must hold up to, each with the dates and leg options of one flight.

Missions are invented. The flybys of "mercury" and "neptune" have dates of missions that flew (Mariner 10 and
Voyager 2, to the day, from the agencies' mission pages), so that their periapsides are above the ground.
"""

from __future__ import annotations

import datetime as dt
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from tempfile import TemporaryDirectory

from survey_scenarios import written

from porkgrid.sky.epochs import jd_from_date
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.plan import Plan, make_plan

HERON = """
[bodies.heron]
epoch = 2033-01-01
a_au = 1.165
e = 0.184
i_deg = 2.7
node_deg = 213.4
argument_deg = 71.9
mean_anomaly_deg = 260.5
radius_km = 0.21
"""
DUNLIN = """
[bodies.dunlin]
epoch = 2033-01-01
q_au = 1.3
e = 1.15
i_deg = 38.0
node_deg = 40.0
argument_deg = 100.0
perihelion = 2033-06-01
"""

# name: title, bodies with dates, (revolutions, branch) per leg
_ROUTES: dict[str, tuple[str, list[tuple[str, str]], list[tuple[int, int]]]] = {
    "direct": ("Rook to Mars", [("earth", "2028-11-30"), ("mars", "2029-09-20")], [(0, 0)]),
    "one revolution": ("Loon", [("earth", "2028-11-30"), ("mars", "2031-03-15")], [(1, -1)]),
    "right branch": ("Loon", [("earth", "2028-11-30"), ("mars", "2031-03-15")], [(1, 1)]),
    "hyperbolic leg": ("Swift, fast", [("earth", "2028-12-15"), ("mars", "2029-02-20")], [(0, 0)]),
    "elements": ("Sandpiper to Heron", [("earth", "2032-10-01"), ("heron", "2034-02-01")], [(0, 0)]),
    "comet": ("Knot to Dunlin", [("earth", "2032-12-01"), ("dunlin", "2033-08-10")], [(0, 0)]),
    "mars": (
        "Godwit by Venus to Mars",
        [("earth", "2034-07-28"), ("venus", "2034-12-10"), ("mars", "2035-07-12")],
        [(0, 0)] * 2,
    ),
    "mercury": (
        "Stilt by Venus to Mercury",
        [("earth", "1973-11-03"), ("venus", "1974-02-05"), ("mercury", "1974-03-29")],
        [(0, 0)] * 2,
    ),
    "jupiter": (
        "Curlew to Jupiter",
        [
            ("earth", "1989-10-18"),
            ("venus", "1990-02-10"),
            ("earth", "1990-12-08"),
            ("jupiter", "1994-03-01"),
        ],
        [(0, 0)] * 3,
    ),
    "saturn": (
        "Fulmar to Saturn",
        [("earth", "1977-09-05"), ("jupiter", "1979-03-05"), ("saturn", "1980-11-12")],
        [(0, 0)] * 2,
    ),
    "neptune": (
        "Skua to Neptune",
        [
            ("earth", "1977-08-20"),
            ("jupiter", "1979-07-09"),
            ("saturn", "1981-08-26"),
            ("uranus", "1986-01-24"),
            ("neptune", "1989-08-25"),
        ],
        [(0, 0)] * 4,
    ),
    "crowded": (
        "Whimbrel by four to Saturn",
        [
            ("earth", "1997-10-15"),
            ("venus", "1998-04-26"),
            ("venus", "1999-06-24"),
            ("earth", "1999-08-18"),
            ("jupiter", "2000-12-30"),
            ("saturn", "2004-07-01"),
        ],
        [(0, 0), (1, 1), (0, 0), (0, 0), (0, 0)],
    ),
}
ROUTES = tuple(_ROUTES)
WITH_FLYBYS = [
    (name, n) for name, (_, stops, _) in _ROUTES.items() for n in range(1, len(stops) - 1) if len(stops) > 2
]


@dataclass(frozen=True, eq=False)
class Flight:
    """A plan with the arguments that its pictures take."""

    plan: Plan
    epochs: tuple[float, ...]
    revs: tuple[int, ...]
    branches: tuple[int, ...]

    @property
    def candidate(self) -> tuple[Plan, tuple[float, ...], tuple[int, ...], tuple[int, ...]]:
        return self.plan, self.epochs, self.revs, self.branches


@cache
def flight_of(name: str) -> Flight:
    """Plan a route with windows of three days round its dates."""
    title, stops, options = _ROUTES[name]
    days = [dt.date.fromisoformat(day) for _, day in stops]
    text = f'name = "{title}"\n'
    text += "".join(
        elements for elements in (HERON, DUNLIN) if elements.split(".")[1].split("]")[0] in str(stops)
    )
    for (body, _), day in zip(stops, days, strict=True):
        first, last = day - dt.timedelta(1), day + dt.timedelta(1)
        text += f'\n[[encounter]]\nbody = "{body}"\nfirst = {first}\nlast = {last}\n'
        if day == days[0]:
            text += "parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200 }\n"
    text += "".join(f"\n[[leg]]\nmax_revs = {revs}\n" for revs, _ in options)
    with TemporaryDirectory() as folder:
        plan = make_plan(load_scenario(written(Path(folder), text)))
    return Flight(
        plan,
        tuple(map(jd_from_date, days)),
        tuple(revs for revs, _ in options),
        tuple(branch for _, branch in options),
    )

"""Whether the engine can do what a scenario asks: the last gate before a sweep, with all faults at once."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from datetime import date
from itertools import pairwise
from pathlib import Path

import tomli_w

from porkgrid.errors import RequestError
from porkgrid.scenario import Draft, Outline, Scenario, body_of, draft_of, read_scenario
from porkgrid.scenario.campaign import is_campaign, routes_of
from porkgrid.scenario.faults import Fault, printable
from porkgrid.scenario.text import parse_toml, read_text
from porkgrid.sky.bodies import BODIES, Body, find_body
from porkgrid.sky.epochs import iso_from_jd, jd_from_date
from porkgrid.sky.kernel import Ephemeris, open_ephemeris
from porkgrid.survey.masses import mass_features, stage_shortfalls
from porkgrid.survey.measures import ROUTE_FEATURES, features_of, measures_for, why_absent
from porkgrid.survey.orbits import parking_orbit

# A body per encounter, None where the file's is unknown or at fault
Route = list[Body | None]


def load_scenario(path: str | Path, beside: Path | None = None) -> Scenario:
    """Read a scenario file the engine can sweep; relative kernel paths resolve from `beside` or the file.

    Raises RequestError with every fault of the file, each `FILE: KEY: what is wrong; what would be right`.

    >>> porkgrid.load_scenario("scenarios/tern-to-mars.toml")
    <Scenario 'Tern to Mars': earth → mars, 71 × 30 dates, 2 limits>
    """
    draft = read_scenario(path, beside)
    faults = [*draft.faults, *_engine_faults(draft)]
    if draft.scenario is None or faults:
        raise RequestError(*(fault.line(draft.path) for fault in faults))
    return draft.scenario


def load_routes(path: str | Path) -> list[Scenario]:
    """The scenarios of a file: one, or one for each [[route]] of a campaign.

    Limits and stored measures that a route cannot have are left out of it where another route has them.
    Raises RequestError with every fault of the file, those of a route with its name.
    """
    path = Path(path)
    text, unread = read_text(path)
    table, faults = parse_toml(text) if not unread else ({}, unread)
    if faults or not is_campaign(table):
        return [load_scenario(path)]
    routes, faults = routes_of(table)
    drafts = [_without_the_absent(route.text, path) for route in routes]
    absent = set.intersection(*(gone for _, gone in drafts)) if drafts else set()
    faults += [Fault(key, "no route of the campaign has this measure") for key in sorted(absent)]
    lines = [fault.line(path) for fault in faults]
    scenarios = []
    for route, (draft, _) in zip(routes, drafts, strict=True):
        wrong = [*draft.faults, *_engine_faults(draft)]
        lines += [Fault(f"route {route.name}, {key}", what).line(path) for key, what in wrong]
        if draft.scenario is not None and not wrong:
            scenarios.append(draft.scenario)
    if lines:
        raise RequestError(*dict.fromkeys(lines))
    return scenarios


def _without_the_absent(text: str, path: Path) -> tuple[Draft, set[str]]:
    """A route's draft without the limits and stored measures that it cannot have, and what those were."""
    draft = draft_of(text, path, path.parent)
    gone = {
        fault.key if fault.key != "measures" else f"measures, {fault.text.split(chr(39))[1]}"
        for fault in _engine_faults(draft)
        if fault.key.startswith("limits.") or fault.key == "measures"
    }
    if not gone:
        return draft, gone
    table, _ = parse_toml(text)
    names = {key.rpartition(".")[2].rpartition(", ")[2] for key in gone}
    if isinstance(limits := table.get("limits"), dict):
        table["limits"] = {name: each for name, each in limits.items() if name not in names}
    if isinstance(measures := table.get("measures"), list):
        table["measures"] = [name for name in measures if name not in names]
    return draft_of(tomli_w.dumps(table), path, path.parent), gone


def _engine_faults(draft: Draft) -> Iterator[Fault]:
    own = {name: body_of(name, spec) for name, spec in draft.bodies.items() if spec is not None}
    route: Route = []
    for number, outline in enumerate(draft.outlines, start=1):
        try:
            route.append(_body(outline, own, draft))
        except LookupError as error:
            route.append(None)
            yield Fault(f"encounter {number}, body", str(error.args[0]))
    yield from _body_faults(draft, route)
    yield from _window_faults(draft.outlines)
    yield from _kernel_faults(draft, route)
    yield from _measure_faults(draft, route)
    yield from _stack_faults(draft, route)


def _body(outline: Outline, own: Mapping[str, Body], draft: Draft) -> Body | None:
    """The body of an encounter; None for one whose own table is at fault. Raises LookupError if unknown."""
    if outline.body is None:
        return None
    at_fault = {name.casefold() for name, spec in draft.bodies.items() if spec is None}
    if str(outline.body).strip().casefold() in at_fault - BODIES.keys():
        return None
    return find_body(outline.body, own)


def _body_faults(draft: Draft, route: Route) -> Iterator[Fault]:
    """Faults of bodies in the route: what formulas need to know of them, legs from one to itself."""
    for number, (outline, body) in enumerate(zip(draft.outlines, route, strict=True), start=1):
        if body is None:
            continue
        if body.name == "sun":
            what = 'the Sun is what legs go round, not where they end; give a body such as "venus"'
            yield Fault(f"encounter {number}, body", what)
        elif outline.whole is not None:
            yield from _lacking(outline, body, f"encounter {number}, ")
    for number, (start, end) in enumerate(pairwise(route), start=1):
        leg = draft.legs[number - 1] if number <= len(draft.legs) else None
        if leg is not None and leg.max_revs == 0 and _same(start, end):
            what = "from a body back to itself, a leg without whole revolutions is the body's own orbit"
            yield Fault(f"leg {number}, max_revs", f"{what}; give max_revs = 1 or more, or mend an encounter")


def _lacking(outline: Outline, body: Body, prefix: str) -> Iterator[Fault]:
    """Faults for what a parking orbit, a capture or a flyby needs to know of the body and does not."""
    encounter = outline.whole
    assert encounter is not None
    wanted = {"parking": encounter.parking, "flyby": encounter.flyby, "capture": encounter.capture}
    needs = {"gm_km3_s2": body.gm_km3_s2, "radius_km": body.radius_km}
    missing = " and ".join(name for name, value in needs.items() if value is None)
    for key, orbit in wanted.items():
        if orbit is not None and missing:
            yield Fault(f"{prefix}{key}", f"needs {missing} of {body.name}; give it in [bodies.{body.name}]")
    capture = encounter.capture
    if capture and capture.periapsis_altitude_km is None and body.min_flyby_altitude_km is None:
        what = f"missing, and {body.name} has no usual least altitude; give it"
        yield Fault(f"{prefix}capture.periapsis_altitude_km", what)
    if encounter.parking and encounter.parking.inclination_deg is not None and body.pole is None:
        what = f"needs the pole of {body.name}, which is not known; leave the inclination out"
        yield Fault(f"{prefix}parking.inclination_deg", what)
    flyby = encounter.flyby
    if flyby and flyby.min_altitude_km is None and body.min_flyby_altitude_km is None:
        what = f"missing, and {body.name} has no usual one; give flyby = {{ min_altitude_km = … }}"
        yield Fault(f"{prefix}flyby.min_altitude_km", what)


def _same(start: Body | None, end: Body | None) -> bool:
    if start is None or end is None:
        return False
    return start.name == end.name or (start.naif_id is not None and start.naif_id == end.naif_id)


def _window_faults(outlines: tuple[Outline, ...]) -> Iterator[Fault]:
    """Faults for a window that ends before an earlier encounter's can start: no date could follow."""
    earliest: date | None = None
    for number, outline in enumerate(outlines, start=1):
        if earliest is not None and outline.last is not None and not _before(earliest, outline.last):
            what = f"{outline.last.isoformat()} can follow no date of the encounters before it"
            yield Fault(f"encounter {number}, last", f"{what}; give a date after {earliest.isoformat()}")
        if outline.first is not None and (earliest is None or _before(earliest, outline.first)):
            earliest = outline.first


def _before(one: date, other: date) -> bool:
    return jd_from_date(one) < jd_from_date(other)


def _kernel_faults(draft: Draft, route: Route) -> Iterator[Fault]:
    """Faults of the kernel files, of bodies that none of them has, and of windows outside what they cover."""
    files_at_fault = False
    try:
        ephemeris = open_ephemeris(draft.kernels)
    except RequestError as error:
        yield from (Fault("kernels", fault) for fault in error.faults)
        files_at_fault, ephemeris = True, open_ephemeris()
    for number, (outline, body) in enumerate(zip(draft.outlines, route, strict=True), start=1):
        if body is None or (files_at_fault and body.name not in BODIES):
            continue
        faults = _coverage_faults(ephemeris, body, outline, f"encounter {number}, ")
        if (
            number == len(route) and not faults
        ):  # arrivals are seen from the Earth: distance, angle from the Sun
            faults = _coverage_faults(ephemeris, BODIES["earth"], outline, f"encounter {number}, ")
        yield from faults


def _coverage_faults(ephemeris: Ephemeris, body: Body, outline: Outline, prefix: str) -> list[Fault]:
    try:
        start, end = ephemeris.coverage(body)
    except RequestError as error:
        return [Fault(f"{prefix}body", fault) for fault in error.faults]
    faults = []
    for key, value in (("first", outline.first), ("last", outline.last)):
        if value is not None and not start <= jd_from_date(value) <= end:
            span = f"{iso_from_jd(start)} to {iso_from_jd(end)}"
            what = f"{value.isoformat()} is outside what {ephemeris.label} has of {body.name}"
            faults.append(Fault(f"{prefix}{key}", f"{what}; give a date within {span}"))
    return faults


def _measure_faults(draft: Draft, route: Route) -> Iterator[Fault]:
    """Faults for limits, ranking and stored measures that name what the route does not have."""
    legs, features = max(len(route) - 1, 1), _features(draft, route)
    known = measures_for(legs, features)
    named = [(f"limits.{printable(name)}", name) for name in draft.limits]
    named += [("rank.by", draft.rank_by)] if draft.rank_by is not None else []
    named += [("measures", name) for name in draft.measures]
    for key, name in named:
        if name not in known:
            yield Fault(key, why_absent(printable(name), legs, features))


def _features(draft: Draft, route: Route) -> frozenset[str]:
    """Features of the route; where a body is unknown, all that it could have."""
    parking = bool(draft.outlines) and draft.outlines[0].parking
    capture = bool(draft.outlines) and draft.outlines[-1].capture
    masses = _masses_given(draft)
    ends = [body for body in (route[0], route[-1]) if body is not None] if route else []
    if len(ends) == 2:
        return features_of(ends, parking, capture, masses)
    given = {"parking": parking, "capture": capture}
    return frozenset(name for name in ROUTE_FEATURES if given.get(name, True)) | masses


def _masses_given(draft: Draft) -> frozenset[str]:
    """Mass features of what the file gives, right or wrong."""
    spacecraft, stack = draft.vehicles.get("spacecraft"), draft.vehicles.get("stack")
    stages = stack.get("stage") if isinstance(stack, dict) else None
    listed = stages if isinstance(stages, list) else []
    ascent = [isinstance(stage, dict) and bool(stage.get("ascent_dv_km_s")) for stage in listed]
    dry = isinstance(spacecraft, dict) and "dry_mass_kg" in spacecraft
    return mass_features(
        "launcher" in draft.vehicles,
        dry if "spacecraft" in draft.vehicles else None,
        ascent if "stack" in draft.vehicles else None,
    )


def _stack_faults(draft: Draft, route: Route) -> Iterator[Fault]:
    """Faults for stages that cannot reach what every date asks of them."""
    scenario, body = draft.scenario, route[0] if route else None
    if scenario is None or scenario.stack is None or body is None:
        return
    orbit = scenario.encounters[0].parking
    if orbit is None or body.radius_km is None or body.gm_km3_s2 is None:
        return
    for number, asked, reach in stage_shortfalls(scenario.stack, parking_orbit(orbit, body), body):
        what = f"must give {asked:.3f} km/s at least, and {reach:.3f} is more than any size of it gives"
        remedy = "a higher isp_s, a lower structural_fraction or another stage"
        short = f"short by {asked - reach:.3f} km/s"
        yield Fault(f"stack.stage {number}", f"{what} ({short}); give {remedy}")

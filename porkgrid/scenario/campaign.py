"""A campaign: one scenario file that lists several routes over the same windows, taken apart into scenarios.

    [[encounter]]                   # every window that some route uses; `label` where a body has two
    …
    [[route]]
    name = "by Venus"
    stops = ["earth", "venus", "mars"]     # labels, or bodies, in flying order
    leg = [{ max_revs = 0 }, { max_revs = 1 }]     # optional

Everything else of the file holds for every route that can have it.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

import tomli_w
from pydantic import Field, ValidationError

from porkgrid.scenario.faults import Fault, faults_of, nearest, printable, shown
from porkgrid.scenario.parts import Part

MAX_ROUTES = 20


class Route(Part):
    """One route of a campaign."""

    name: str = Field(min_length=1, max_length=40, examples=['"by Venus"'])
    stops: list[str] = Field(min_length=2, examples=['["earth", "venus", "mars"]'])
    leg: list[dict] = Field(default=[])


@dataclass(frozen=True)
class RouteText:
    """A route as a scenario's text of its own."""

    name: str
    text: str


def is_campaign(table: Mapping[str, Any]) -> bool:
    """Whether a scenario's table lists routes."""
    return "route" in table


def routes_of(table: Mapping[str, Any]) -> tuple[list[RouteText], list[Fault]]:
    """The routes of a campaign as scenarios, and the faults of what is the campaign's own."""
    given = table["route"]
    if not isinstance(given, list) or not given or not all(isinstance(each, dict) for each in given):
        return [], [Fault("route", f"must be tables, each under [[route]], not {shown(given)}")]
    if len(given) > MAX_ROUTES:
        return [], [Fault("route", f"{len(given)} are given; give {MAX_ROUTES} or fewer")]
    windows, faults = _windows(table)
    routes: list[Route] = []
    for number, each in enumerate(given, start=1):
        try:
            route = Route.model_validate(each)
        except ValidationError as error:
            faults += faults_of(error, Route, f"route {number}, ")
            continue
        faults += _stop_faults(route, number, windows)
        if any(route.name.casefold() == other.name.casefold() for other in routes):
            what = f'"{printable(route.name)}" is there twice; rename one'
            faults.append(Fault(f"route {number}, name", what))
        routes.append(route)
    if faults:
        return [], faults
    return [RouteText(route.name, tomli_w.dumps(_scenario(table, route, windows))) for route in routes], []


def _windows(table: Mapping[str, Any]) -> tuple[dict[str, dict[str, Any]], list[Fault]]:
    """Encounters by label, else by body."""
    given = table.get("encounter", [])
    if not isinstance(given, list):
        return {}, [Fault("encounter", f"must be tables, each under [[encounter]], not {shown(given)}")]
    windows: dict[str, dict[str, Any]] = {}
    faults = []
    for number, each in enumerate(given, start=1):
        name = str(each.get("label", each.get("body", ""))).casefold() if isinstance(each, dict) else ""
        if not name:
            faults.append(Fault(f"encounter {number}", "has neither a label nor a body; give its body"))
        elif name in windows:
            what = f'"{printable(name)}" is there twice; give each a label, and name it in the stops'
            faults.append(Fault(f"encounter {number}, label", what))
        else:
            windows[name] = each
    return windows, faults


def _stop_faults(route: Route, number: int, windows: Mapping[str, Any]) -> Iterator[Fault]:
    for stop in route.stops:
        if stop.casefold() not in windows:
            what = (
                f'"{printable(stop)}" is no encounter of the file; {nearest(stop, map(printable, windows))}'
            )
            yield Fault(f"route {number}, stops", what)


def _scenario(
    table: Mapping[str, Any], route: Route, windows: Mapping[str, dict[str, Any]]
) -> dict[str, Any]:
    """The table of one route: the file's with its own encounters and legs."""
    shared = {key: value for key, value in table.items() if key not in ("route", "encounter", "leg")}
    stops = [windows[stop.casefold()] for stop in route.stops]
    last = len(stops) - 1
    encounters = [_at_place(stop, index, last) for index, stop in enumerate(stops)]
    scenario = shared | {"name": f"{table.get('name', '')}: {route.name}", "encounter": encounters}
    if route.leg:
        scenario["leg"] = route.leg
    return scenario


def _at_place(stop: Mapping[str, Any], index: int, last: int) -> dict[str, Any]:
    """An encounter with what its place in the route calls for of parking, flyby and capture."""
    wanted = "parking" if index == 0 else "capture" if index == last else "flyby"
    left_out = {"label", "parking", "flyby", "capture"} - {wanted}
    return {key: value for key, value in stop.items() if key not in left_out}

"""A scenario as a notebook shows it."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

from porkgrid.scenario.parts import Encounter
from porkgrid.showing import html_line, html_page, html_table

if TYPE_CHECKING:
    from porkgrid.scenario import Scenario


def scenario_line(scenario: Scenario) -> str:
    """One line: name, bodies, and how many dates and limits there are."""
    bodies = " → ".join(str(each.body) for each in scenario.encounters)
    dates = " × ".join(f"{len(each.epochs_jd()):,}" for each in scenario.encounters)
    limits = len(scenario.limits)
    return (
        f"<Scenario {scenario.name!r}: {bodies}, {dates} dates, {limits} limit{'' if limits == 1 else 's'}>"
    )


def scenario_html(scenario: Scenario) -> str:
    """Its encounters, limits, vehicles and ranking as small tables."""
    rank = scenario.rank
    by = rank.by or "the usual measure of the route"
    lines = [f"ranked by {by}, {rank.keep} candidates at least {rank.apart_days:g} days apart"]
    lines += list(_vehicles(scenario))
    limits = [[name, _bound(limit.min), _bound(limit.max)] for name, limit in scenario.limits.items()]
    return html_page(
        scenario.name,
        html_line(scenario.description) if scenario.description else "",
        html_table(
            ["encounter", "", "first", "last", "step, days", "dates"],
            [_encounter(each) for each in scenario.encounters],
            left=4,
        ),
        html_table(["limit", "min", "max"], limits) if limits else html_line("no limits"),
        *map(html_line, lines),
    )


def _encounter(each: Encounter) -> list[str]:
    window = [each.first.isoformat(), each.last.isoformat()]
    return [str(each.body), _orbit(each), *window, f"{each.step_days:g}", f"{len(each.epochs_jd()):,}"]


def _orbit(each: Encounter) -> str:
    """What is flown there, in words; altitudes in km."""
    if each.parking:
        plane = each.parking.inclination_deg
        inclined = "" if plane is None else f" at {plane:g}°"
        ends = f"{each.parking.periapsis_altitude_km:g} × {each.parking.apoapsis_altitude_km:g} km"
        return f"from {ends}{inclined}"
    if each.flyby:
        least = each.flyby.min_altitude_km
        above = "flyby" if least is None else f"flyby above {least:g} km"
        return f"{above}, burn up to {each.flyby.max_burn_km_s:g} km/s"
    if each.capture:
        orbit = each.capture
        low = "cheapest" if orbit.periapsis_altitude_km is None else f"{orbit.periapsis_altitude_km:g} km"
        shape = orbit.apoapsis_altitude_km
        high = f"eccentricity {orbit.eccentricity:g}" if shape is None else f"apoapsis {shape:g} km"
        return f"capture: periapsis {low}, {high}"
    return ""


def _vehicles(scenario: Scenario) -> Iterator[str]:
    if scenario.launcher:
        c3 = scenario.launcher.c3_km2_s2
        yield f"launcher {scenario.launcher.name}, table of C3 {c3[0]:g} to {c3[-1]:g} km²/s²"
    if scenario.spacecraft:
        craft = scenario.spacecraft
        dry = "" if craft.dry_mass_kg is None else f", {craft.dry_mass_kg:g} kg dry"
        tank = "" if craft.tank_kg is None else f", tank of {craft.tank_kg:g} kg"
        yield f"spacecraft of specific impulse {craft.isp_s:g} s{dry}{tank}"
    if scenario.stack:
        yield f"stack of {len(scenario.stack.stages)} stages with {scenario.stack.payload_kg:g} kg on top"


def _bound(value: float | None) -> str:
    return "–" if value is None else f"{value:g}"

"""Write a proposal as a scenario file that says why each number is as it is."""

from __future__ import annotations

import json
import textwrap

from porkgrid.scenario.proposal import Proposal, Window
from porkgrid.scenario.usualorbits import CAPTURE, PARKING, UsualOrbit
from porkgrid.sky.bodies import BODIES

_MONTH = "%B %Y"


def scenario_text(proposal: Proposal, name: str, request: str, file: str) -> str:
    """The text of a scenario file; `request`: the command that asked for it, `file`: where it will be."""
    parts = [
        *_head(proposal, request, file),
        f"name = {json.dumps(name, ensure_ascii=False)}",
        "",
        *_departure(proposal),
        *_flybys(proposal),
        *_arrival(proposal),
        *_limits(proposal),
        *_rank(proposal),
    ]
    return "\n".join(parts) + "\n"


def season_words(proposal: Proposal) -> str:
    """Say which season was taken for the year asked for, and which others are near."""
    taken = proposal.optimum.dates[0]
    others = ", ".join(f"{each:{_MONTH}}" for each in proposal.seasons if abs((each - taken).days) > 20)
    beside = f"; beside it: {others}" if others else ""
    if taken.year == proposal.year:
        return f"the season of {taken:{_MONTH}}{beside}"
    first, last = proposal.closing
    if proposal.belongs_to_year:
        return (
            f"the season that reaches into {proposal.year}, from {first} to {last}, least in "
            f"{taken:{_MONTH}}{beside}"
        )
    return f"no season in {proposal.year}; taken is the next, of {taken:{_MONTH}}{beside}"


def season_year(proposal: Proposal) -> int:
    """The year that was asked for where the season is one of it, else the year of its least."""
    return proposal.year if proposal.belongs_to_year else proposal.optimum.dates[0].year


def first_name(proposal: Proposal) -> str:
    """A name for the scenario: "Earth by Venus to Mars, 2034"."""
    titles = [_title(window) for window in proposal.windows]
    by = f" by {' and '.join(titles[1:-1])}" if len(titles) > 2 else ""
    return f"{titles[0]}{by} to {titles[-1]}, {season_year(proposal)}"


def _head(proposal: Proposal, request: str, file: str) -> list[str]:
    least = proposal.optimum
    route = " → ".join(_title(window) for window in proposal.windows)
    dates = ", ".join(map(str, least.dates))
    synodic = proposal.synodic_days
    period = "" if synodic is None else f" Seasons come about every {synodic:.0f} days (the synodic period)."
    return [
        *_comment(f"{route}: {season_words(proposal)}.{period}"),
        "#",
        f"#   porkgrid check {file}      says what is wrong with a scenario, if anything",
        f"#   porkgrid sweep {file}      solves every pair of dates, ranks them and draws the charts",
        "#",
        *_comment(
            f"Written by `{request}`. Every number is a proposal to start from, found by a coarse survey; "
            "change what your mission knows better."
        ),
        "#",
        *_comment(
            f"The least total Δv that the coarse survey found: {least.dv_total_km_s:.2f} km/s on {dates}, "
            f"with C3 {least.c3_km2_s2:.1f} km²/s², arrival v∞ {least.v_inf_arrival_km_s:.2f} km/s and a "
            f"flight of {least.tof_days:.0f} days."
        ),
        "",
    ]


def _departure(proposal: Proposal) -> list[str]:
    window = proposal.windows[0]
    first, last = proposal.closing
    tilt = "Give inclination_deg = 28.5 as well, and the burn pays for asymptotes that such a plane misses."
    why = (
        "here seasons run into each other, and the window holds about one."
        if proposal.cut
        else "the window reaches past both, so that the chart shows how the season closes on either side."
    )
    return [
        *_comment(f"Departure. The limits below allow departures from {first} to {last}; {why}"),
        *_encounter(window),
        *_comment(f"{_sentence(PARKING[window.body])} {tilt if window.body == 'earth' else ''}"),
        _orbit("parking", PARKING[window.body]),
        "",
    ]


def _flybys(proposal: Proposal) -> list[str]:
    lines: list[str] = []
    middle = zip(proposal.windows[1:-1], proposal.optimum.burns_km_s, proposal.limits.burns_km_s, strict=True)
    for number, (window, burn, most) in enumerate(middle, start=1):
        altitude = BODIES[window.body].min_flyby_altitude_km
        lines += [
            *_comment(
                f"Flyby {number}. On a grid of dates no flyby matches exactly: max_burn_km_s is what the "
                f"grid may miss it by, and counts in dv_total_km_s. At the optimum it was {burn:.2f} km/s. "
                f"Its altitude is the least that is usual at {_title(window)}."
            ),
            *_encounter(window),
            f"flyby = {{ min_altitude_km = {altitude:.0f}, max_burn_km_s = {most:g} }}",
            "",
        ]
    return lines


def _arrival(proposal: Proposal) -> list[str]:
    window = proposal.windows[-1]
    return [
        "# Arrival, on all dates that the departures and the limits can reach, with room on both sides.",
        *_encounter(window),
        *_comment(f"{_sentence(CAPTURE[window.body])} Leave capture out for a flyby, a lander or a probe."),
        _orbit("capture", CAPTURE[window.body]),
        "",
    ]


def _limits(proposal: Proposal) -> list[str]:
    limits, least = proposal.limits, proposal.optimum
    range_safety = (
        [
            *_comment(
                "Range safety, for launches due east from a latitude of 28.5 degrees. It can close the best "
                "dates; uncomment it to see."
            ),
            "# dla_deg = { min = -28.5, max = 28.5 }",
        ]
        if proposal.windows[0].body == "earth"
        else []
    )
    return [
        *_comment(
            f"What is allowed: as much as dates take whose total Δv is within {proposal.slack_km_s:.2f} km/s "
            "of the least. What the launcher, the tanks and the mission's duration really allow goes here."
        ),
        "[limits]",
        f"c3_km2_s2 = {{ max = {limits.c3_km2_s2:g} }}  # {least.c3_km2_s2:.1f} at the least total Δv",
        f"v_inf_arrival_km_s = {{ max = {limits.v_inf_arrival_km_s:g} }}"
        f"  # {least.v_inf_arrival_km_s:.2f} there; sizes the capture burn",
        f"tof_days = {{ max = {limits.tof_days:.0f} }}  # {least.tof_days:.0f} there",
        *range_safety,
        "",
    ]


def _rank(proposal: Proposal) -> list[str]:
    apart = max(10.0, 2.0 * max(window.step_days for window in proposal.windows))
    return [
        *_comment(
            "The best dates by the sum of all burns. Two that are closer than apart_days in every date are "
            "one opportunity, and only the better one is listed."
        ),
        "[rank]",
        'by = "dv_total_km_s"',
        "keep = 20",
        f"apart_days = {apart:g}",
    ]


def _encounter(window: Window) -> list[str]:
    return [
        "[[encounter]]",
        f'body = "{window.body}"',
        f"first = {window.first}",
        f"last = {window.last}",
        f"step_days = {window.step_days}  # of a revolution of {window.period_days:,.0f} days; "
        f"makes {_dates(window):,} dates",
    ]


def _dates(window: Window) -> int:
    return int((window.last - window.first).days / window.step_days) + 1


def _orbit(key: str, orbit: UsualOrbit) -> str:
    low, high = orbit.periapsis_altitude_km, orbit.apoapsis_altitude_km
    return f"{key} = {{ periapsis_altitude_km = {low}, apoapsis_altitude_km = {high} }}"


def _sentence(orbit: UsualOrbit) -> str:
    return f"{orbit.why[0].upper()}{orbit.why[1:]}."


def _title(window: Window) -> str:
    return BODIES[window.body].title


def _comment(text: str) -> list[str]:
    return textwrap.wrap(text, 105, initial_indent="# ", subsequent_indent="# ", break_on_hyphens=False)

"""porkgrid bodies, porkgrid measures: what scenarios can name."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from porkgrid.commands.arguments import AsJson


def bodies(as_json: AsJson = False) -> None:
    """List the bodies that scenarios can name.

    Example: porkgrid bodies
    """
    from porkgrid import terminal
    from porkgrid.sky.bodies import BODIES

    names = ("naif_id", "gm_km3_s2", "radius_km", "min_flyby_altitude_km", "entry_altitude_km")
    if as_json:
        terminal.print_json(
            {body.name: {name: getattr(body, name) for name in names} for body in BODIES.values()}
        )
        return
    rows = [
        [
            body.name,
            *("–" if getattr(body, name) is None else f"{getattr(body, name):.13g}" for name in names),
        ]
        for body in BODIES.values()
    ]
    terminal.print_table(("body", "NAIF id", "GM (km³/s²)", "radius (km)", "least flyby altitude (km)",
                          "entry altitude (km)"), rows)  # fmt: skip
    terminal.say("From Mars outward these are the barycentres of planet and moons, as DE440 has them.")


def measures(
    scenario: Annotated[
        Path | None, typer.Argument(metavar="SCENARIO", help="Only those that this scenario's route has.")
    ] = None,
    as_json: AsJson = False,
) -> None:
    """List the measures: the numbers of a cell that can be limited, ranked by, drawn and stored.

    Example: porkgrid measures scenarios/earth-venus-mars-2034.toml
    """
    from porkgrid import terminal
    from porkgrid.survey.measures import all_entries

    entries = all_entries()
    if scenario is not None:
        from porkgrid.survey.admit import load_scenario
        from porkgrid.survey.plan import make_plan

        entries = list(make_plan(load_scenario(scenario)).measures.values())
    if as_json:
        terminal.print_json(
            [{"name": e.name, "unit": e.unit, "meaning": e.meaning, "needs": list(e.needs)} for e in entries]
        )
        return
    terminal.print_table(
        ("measure", "unit", "meaning", "needs"),
        [(e.name, e.unit, e.meaning, ", ".join(e.needs)) for e in entries],
    )

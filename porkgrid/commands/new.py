"""porkgrid new: a scenario to start from."""

from __future__ import annotations

import shlex
from itertools import pairwise
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from porkgrid.commands.compiling import said_if_compiling
from porkgrid.commands.completing import body_names
from porkgrid.errors import RequestError

if TYPE_CHECKING:
    from porkgrid.sky.bodies import Body


def new(
    origin: Annotated[
        str, typer.Argument(metavar="FROM", help="Body to leave, such as earth.", autocompletion=body_names)
    ],
    target: Annotated[
        str, typer.Argument(metavar="TO", help="Body to reach, such as mars.", autocompletion=body_names)
    ],
    year: Annotated[int, typer.Option(help="Year to leave in.")],
    by: Annotated[
        list[str] | None,
        typer.Option(
            metavar="BODY", help="Body to fly by on the way; again for more.", autocompletion=body_names
        ),
    ] = None,
    out: Annotated[
        Path | None, typer.Option(metavar="FILE", help="File to write; by default FROM-TO-YEAR.toml here.")
    ] = None,
    name: Annotated[str | None, typer.Option(help="Name of the scenario.")] = None,
    fresh: Annotated[bool, typer.Option("--fresh", help="Replace a file that is there already.")] = False,
) -> None:
    """Write a scenario to start from: windows, steps and limits around the season of a year.

    A quick coarse survey finds the season. Every number in the file says why it is as it is. Where a year has
    no season, the next one is taken.

    Example: porkgrid new earth mars --year 2031

    Example: porkgrid new earth mars --by venus --year 2034 --out godwit.toml --name "Godwit to Mars"
    """
    names = [origin, *(by or []), target]
    route = _route(names)
    title = None if name is None else _checked(name)
    if out is not None:
        _refuse_taken(out, fresh)  # before the work
    from porkgrid import terminal
    from porkgrid.scenario.firstfile import first_name, scenario_text, season_words, season_year
    from porkgrid.survey.suggest import suggest

    looking = "looking for the season; the first run on a machine compiles the kernels, under a minute …"
    proposal = said_if_compiling(lambda: suggest(route, year), looking)
    bodies = [body.name for body in route]
    file = out if out is not None else Path("-".join([*bodies, f"{season_year(proposal)}.toml"]))
    _refuse_taken(file, fresh)
    text = scenario_text(
        proposal, title or first_name(proposal), _command(bodies, year), shlex.quote(str(file))
    )
    file.write_text(text, encoding="utf-8")
    terminal.say(season_words(proposal))
    terminal.say(f"next: porkgrid sweep {shlex.quote(str(file))}")
    print(file)


def _route(names: list[str]) -> list[Body]:
    """The bodies of these names; RequestError with every one that a first scenario cannot be written for."""
    from porkgrid.scenario.faults import nearest
    from porkgrid.scenario.usualorbits import PARKING
    from porkgrid.sky.bodies import BODIES, find_body

    faults = []
    route = []
    for name in names:
        try:
            body = find_body(name, {})
        except LookupError:
            faults.append(f"{name}: no body of this name; {nearest(name, PARKING)}")
            continue
        if body.name == "sun":
            faults.append("sun: is what routes go round, not where they end; give a planet such as venus")
        elif body.name == "moon":
            faults.append(
                "moon: goes round the Earth, and routes here go round the Sun; give earth or another planet"
            )
        route.append(BODIES[body.name])
    for one, other in pairwise(route if len(route) == len(names) else []):
        if one is other:
            faults.append(
                f"{one.name}: a leg from a body to itself needs whole revolutions about the Sun; give "
                "another body, or write that leg by hand as scenarios/earth-mars-earth-jupiter-2044.toml does"
            )
    if faults:
        raise RequestError(*dict.fromkeys(faults))
    return route


def _checked(name: str) -> str:
    from pydantic import ValidationError

    from porkgrid.scenario.faults import faults_of
    from porkgrid.scenario.sections import Heading

    try:
        return Heading(name=name).name
    except ValidationError as error:
        raise RequestError(*(fault.line("--name") for fault in faults_of(error, Heading, ""))) from None


def _refuse_taken(file: Path, fresh: bool) -> None:
    if file.is_dir():
        raise RequestError(f"{file}: is a folder; give a file with --out")
    if file.exists() and not fresh:
        raise RequestError(
            f"{file}: is there already; give --fresh to replace it, or another file with --out"
        )
    if not file.parent.is_dir():
        raise RequestError(
            f"{file}: there is no folder {file.parent}; make it, or give another file with --out"
        )


def _command(bodies: list[str], year: int) -> str:
    by = "".join(f" --by {each}" for each in bodies[1:-1])
    return f"porkgrid new {bodies[0]} {bodies[-1]}{by} --year {year}"

"""porkgrid sweep, porkgrid check: what a scenario would cost, and the sweep itself."""

from __future__ import annotations

import signal
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from importlib import import_module
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from porkgrid.commands.arguments import AsJson, Format, Formats, ScenarioFile, bytes_of
from porkgrid.commands.compare import compare_surveys
from porkgrid.commands.compiling import said_if_compiling
from porkgrid.commands.rank import print_candidates
from porkgrid.commands.schema import print_schema
from porkgrid.errors import RequestError

if TYPE_CHECKING:
    from porkgrid.scenario import Scenario
    from porkgrid.survey.cost import Cost
    from porkgrid.survey.plan import Plan
    from porkgrid.survey.surveys import Survey

_CAMPAIGN_DAYS = 21  # of the launch periods that a campaign is compared by


def sweep(
    scenario: ScenarioFile,
    out: Annotated[Path | None, typer.Option(help="Survey folder; by default surveys/NAME.")] = None,
    workers: Annotated[int | None, typer.Option(min=1, help="Threads; by default one per core.")] = None,
    fresh: Annotated[bool, typer.Option("--fresh", help="Replace a survey that is there already.")] = False,
    memory: Annotated[
        str | None, typer.Option(metavar="SIZE", help="Most memory to take, such as 900MB or 2GB.")
    ] = None,
    cluster: Annotated[
        str | None,
        typer.Option(metavar="ADDRESS", help="Dask scheduler to give the tiles to, or local to start one."),
    ] = None,
    formats: Formats = [Format.PNG],  # noqa: B006 - typer wants a list
    as_json: AsJson = False,
) -> None:
    """Sweep a scenario: solve every pair of dates, rank them and draw the charts.

    An interrupted or killed sweep goes on where it stopped when the same command is given again. The survey
    folder keeps a log, sweep.log. With --json progress goes to standard error, a JSON document a line.

    Example: porkgrid sweep scenarios/earth-mars-2028.toml
    """
    from porkgrid.survey.admit import load_routes

    budget = None if memory is None else bytes_of(memory)
    requests = load_routes(scenario)
    from porkgrid import terminal
    from porkgrid.survey import sweep as engine
    from porkgrid.survey.folder import folder_of, refuse_foreign
    from porkgrid.survey.plan import make_plan

    # the figures' libraries load while kernels run, which leave Python alone
    threading.Thread(target=import_module, args=("porkgrid.figures.draw",)).start()
    folders = [folder_of(requests[0], out)] if len(requests) == 1 else _folders(scenario, requests, out)
    for folder in folders:
        refuse_foreign(folder)  # before the kernels are compiled for nothing
    said_if_compiling(lambda: engine.warm_up(make_plan(requests[0])))
    flown: dict[Any, Any] = {}  # legs that the routes of a campaign share
    surveys = []
    for request, folder in zip(requests, folders, strict=True):
        if len(requests) > 1:
            terminal.say(request.name)
        with terminal.sweep_progress(as_json) as report, _terminated_as_interrupted():
            survey = engine.sweep(
                request, folder, workers, fresh=fresh, memory_bytes=budget, cluster=cluster, flown=flown,
                report=report,
            )  # fmt: skip
        _tell(survey, _draw(survey, None, None, formats), as_json)
        surveys.append(survey)
    if len(surveys) > 1:
        compare_surveys(surveys, folders[0].parent, _CAMPAIGN_DAYS, None, formats, as_json)


@contextmanager
def _terminated_as_interrupted() -> Iterator[None]:
    """Take SIGTERM as Ctrl-C while a sweep runs: the tiles in hand are saved."""
    before = signal.signal(signal.SIGTERM, signal.default_int_handler)
    try:
        yield
    finally:
        signal.signal(signal.SIGTERM, before)


def _folders(scenario: Path, requests: list[Scenario], out: Path | None) -> list[Path]:
    """A survey folder for each route of a campaign, side by side in the campaign's."""
    from porkgrid.scenario import slug_of

    campaign, _, _ = requests[0].name.rpartition(": ")
    place = out or Path("surveys") / slug_of(campaign or scenario.stem)
    return [place / slug_of(request.name.rpartition(": ")[2]) for request in requests]


def check(
    scenario: Annotated[Path | None, typer.Argument(metavar="SCENARIO", help="Scenario file (TOML).")] = None,
    schema: Annotated[
        bool, typer.Option("--schema", help="Print the JSON Schema of scenario files, for editors.")
    ] = False,
    as_json: AsJson = False,
) -> None:
    """Validate a scenario and say what a sweep would cost on this machine.

    Example: porkgrid check scenarios/earth-mars-2028.toml

    Example: porkgrid check --schema > scenario.schema.json
    """
    if schema:
        print_schema()
        return
    if scenario is None:
        raise RequestError("check: give a scenario file, or --schema for what one may hold")
    from porkgrid.survey.admit import load_routes

    requests = load_routes(scenario)
    from dataclasses import asdict

    from porkgrid import terminal
    from porkgrid.survey.cost import predict
    from porkgrid.survey.plan import make_plan
    from porkgrid.survey.sweep import warm_up

    plans = [make_plan(request) for request in requests]
    said_if_compiling(lambda: warm_up(plans[0]))
    costs = [predict(plan) for plan in plans]
    if as_json:
        told = [
            {"scenario": str(scenario), "name": plan.scenario.name, "route": plan.route} | asdict(cost)
            for plan, cost in zip(plans, costs, strict=True)
        ]
        terminal.print_json(told[0] if len(told) == 1 else told)
        return
    for plan, cost in zip(plans, costs, strict=True):
        _print_cost(plan, cost)


def _print_cost(plan: Plan, cost: Cost) -> None:
    from porkgrid import terminal

    n, m = plan.shape
    rows = [
        ("scenario", f"{plan.scenario.name}: {plan.route}"),
        ("grid", f"{n:,} departure × {m:,} arrival dates = {cost.cells:,} cells in {cost.tiles:,} tiles"),
        ("Lambert solves", f"{cost.lambert_solves:,}"),
        ("measures kept", str(len(plan.stored))),
        (
            "time",
            f"about {_duration(cost.seconds)} with {cost.workers} workers, after a few seconds to start",
        ),
        ("memory", f"about {cost.memory_bytes / 1e6:,.0f} MB at the peak"),
        ("disk", f"about {cost.disk_bytes / 1e6:,.1f} MB"),
    ]
    terminal.print_table(("", "the scenario is valid; a sweep would cost"), rows)


def _draw(survey: Survey, of: str | None, lines: str | None, formats: list[Format]) -> list[Path]:
    from porkgrid.figures.draw import draw_figures

    return draw_figures(survey, of, lines, [each.value for each in formats])


def _tell(survey: Survey, drawn: list[Path], as_json: bool) -> None:
    """Print what a sweep has come to."""
    from porkgrid import terminal
    from porkgrid.survey.closed import explain_closed, stages_out_of_reach

    if short := stages_out_of_reach(survey):
        raise RequestError(*(f"{survey.scenario.path}: stack: {line}" for line in short))
    closed = explain_closed(survey)
    for line in closed:
        terminal.say(line)
    if as_json:
        facts: dict[str, Any] = {
            key: survey.provenance[key] for key in ("name", "route", "cells", "cells_allowed", "seconds")
        }
        terminal.print_json(
            facts
            | {
                "survey": str(survey.path),
                "figures": [str(path) for path in drawn],
                "closed": closed,
                "candidates": survey.candidates.to_dict("records"),
            }
        )
        return
    print_candidates(survey, survey.candidates, survey.grid.attrs["rank_by"], as_json=False)
    for path in drawn:
        terminal.say(str(path))
    if survey.plan.flybys:
        terminal.say(f"flyby maps: porkgrid chart {survey.path}; a candidate's: with --path 1 --flyby 1")
    terminal.say(f"survey in {survey.path}")


def _duration(seconds: float) -> str:
    if seconds < 90:
        return f"{seconds:.1f} s"
    minutes = seconds / 60
    return f"{minutes:.0f} min" if minutes < 90 else f"{minutes / 60:.1f} h"

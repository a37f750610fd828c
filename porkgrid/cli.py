"""The command line: parse, call, print."""

from __future__ import annotations

import sys
import threading
from enum import StrEnum
from importlib import import_module
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from porkgrid.errors import RequestError, RunError

if TYPE_CHECKING:
    from porkgrid.survey.surveys import Survey

app = typer.Typer(
    name="porkgrid",
    help="Survey launch windows: sweep dates, see which limits forbid what, rank what is left.\n\n"
    "Early-phase estimates from patched conics; not for flight operations.",
    no_args_is_help=True,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
)

ScenarioFile = Annotated[Path, typer.Argument(metavar="SCENARIO", help="Scenario file (TOML).")]
SurveyFolder = Annotated[
    Path, typer.Argument(metavar="SURVEY", help="Survey folder that `porkgrid sweep` made.")
]
AsJson = Annotated[bool, typer.Option("--json", help="Print JSON on standard output instead of a table.")]


class Format(StrEnum):
    """File formats of figures."""

    PNG = "png"
    SVG = "svg"
    PDF = "pdf"


class Order(StrEnum):
    """Which end of a measure is better."""

    LEAST = "least"
    MOST = "most"


Formats = Annotated[list[Format], typer.Option("--format", help="Figure format; give it again for more.")]

_INTERRUPTED = 130  # exit code

# Columns of the candidates' table on the terminal, where the route has them; the file has all measures.
_SHOWN = ("tof_days", "c3_km2_s2", "dla_deg", "v_inf_arrival_km_s", "dv_departure_km_s", "dv_capture_km_s",
          "dv_total_km_s")  # fmt: skip
_SHOWN_PER_FLYBY = ("_altitude_km", "_burn_km_s")


@app.command()
def sweep(
    scenario: ScenarioFile,
    out: Annotated[Path | None, typer.Option(help="Survey folder; by default surveys/NAME.")] = None,
    workers: Annotated[int | None, typer.Option(min=1, help="Threads; by default one per core.")] = None,
    fresh: Annotated[bool, typer.Option("--fresh", help="Replace a survey that is there already.")] = False,
    formats: Formats = [Format.PNG],  # noqa: B006 - typer wants a list
    as_json: AsJson = False,
) -> None:
    """Sweep a scenario: solve every pair of dates, rank them and draw the charts.

    An interrupted sweep goes on where it stopped when the same command is given again.

    Example: porkgrid sweep scenarios/earth-mars-2028.toml
    """
    from porkgrid.survey.admit import load_scenario

    request = load_scenario(scenario)
    from porkgrid import terminal
    from porkgrid.survey import sweep as engine
    from porkgrid.survey.plan import make_plan

    # the figures' libraries load while kernels run, which leave Python alone
    threading.Thread(target=import_module, args=("porkgrid.figures.draw",)).start()
    _compile(lambda: engine.warm_up(make_plan(request)))
    with terminal.sweep_progress(quiet=as_json) as report:
        survey = engine.sweep(request, out, workers, fresh=fresh, report=report)
    drawn = _draw(survey, None, None, formats)
    _tell(survey, drawn, as_json)


@app.command()
def chart(
    survey: SurveyFolder,
    of: Annotated[
        str | None, typer.Option(help="Measure shown as colour; by default the rank measure.")
    ] = None,
    lines: Annotated[str | None, typer.Option(help="Measure shown as lines.")] = None,
    path: Annotated[
        int | None, typer.Option(metavar="N", help="Draw the path of candidate N instead.")
    ] = None,
    flyby: Annotated[
        int | None, typer.Option(metavar="N", help="Draw the flybys of candidate N instead.")
    ] = None,
    formats: Formats = [Format.PNG],  # noqa: B006 - typer wants a list
) -> None:
    """Draw figures of a survey into its figures folder.

    The chart and the limit map, with maps of flyby dates and altitudes; or the figures of one candidate.

    Example: porkgrid chart surveys/ouzel-to-mars-2028 --of c3_km2_s2 --lines v_inf_arrival_km_s --format pdf

    Example: porkgrid chart surveys/godwit-by-venus-to-mars-2034 --path 1 --flyby 1
    """
    from porkgrid.figures import draw
    from porkgrid.survey.surveys import open_survey

    opened, names = open_survey(survey), [each.value for each in formats]
    drawn = draw.draw_path_of(opened, path, names) if path is not None else []
    drawn += draw.draw_flybys_of(opened, flyby, names) if flyby is not None else []
    if path is None and flyby is None:
        drawn = draw.draw_figures(opened, of, lines, names)
        drawn += draw.draw_flyby_maps(opened, names) if of is None and lines is None else []
    for each in drawn:
        print(each)


@app.command()
def rank(
    survey: SurveyFolder,
    by: Annotated[str | None, typer.Option(help="Measure to rank by; by default the scenario's.")] = None,
    order: Annotated[
        Order | None, typer.Option(help="Which end is better; by default the scenario's.")
    ] = None,
    keep: Annotated[int | None, typer.Option(min=1, help="How many candidates.")] = None,
    apart_days: Annotated[
        float | None, typer.Option(min=0.0, help="Closer than this in every date is one window.")
    ] = None,
    as_json: AsJson = False,
) -> None:
    """Rank a survey's dates anew, by any measure it stores.

    Example: porkgrid rank surveys/ouzel-to-mars-2028 --by c3_km2_s2 --keep 5
    """
    from porkgrid.survey.candidates import rank_anew
    from porkgrid.survey.surveys import open_survey

    opened = open_survey(survey)
    table, by = rank_anew(opened, by, order.value if order else None, keep, apart_days)
    _print_candidates(opened, table, by, as_json)


@app.command()
def check(scenario: ScenarioFile, as_json: AsJson = False) -> None:
    """Validate a scenario and say what a sweep would cost on this machine.

    Example: porkgrid check scenarios/earth-mars-2028.toml
    """
    from porkgrid.survey.admit import load_scenario

    request = load_scenario(scenario)
    from dataclasses import asdict

    from porkgrid import terminal
    from porkgrid.survey.cost import predict
    from porkgrid.survey.plan import make_plan
    from porkgrid.survey.sweep import warm_up

    plan = make_plan(request)
    _compile(lambda: warm_up(plan))
    cost = predict(plan)
    if as_json:
        terminal.print_json(
            {"scenario": str(scenario), "name": request.name, "route": plan.route} | asdict(cost)
        )
        return
    n, m = plan.shape
    rows = [
        ("scenario", f"{request.name}: {plan.route}"),
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


@app.command()
def bodies(as_json: AsJson = False) -> None:
    """List the bodies that scenarios can name."""
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


@app.command()
def measures(
    scenario: Annotated[
        Path | None, typer.Argument(metavar="[SCENARIO]", help="Only those that this scenario's route has.")
    ] = None,
    as_json: AsJson = False,
) -> None:
    """List the measures: the numbers of a cell that can be limited, ranked by, drawn and stored."""
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


def _draw(survey: Survey, of: str | None, lines: str | None, formats: list[Format]) -> list[Path]:
    from porkgrid.figures.draw import draw_figures

    return draw_figures(survey, of, lines, [each.value for each in formats])


def _tell(survey: Survey, drawn: list[Path], as_json: bool) -> None:
    """Print what a sweep has come to."""
    from porkgrid import terminal
    from porkgrid.survey.closed import explain_closed

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
    _print_candidates(survey, survey.candidates, survey.grid.attrs["rank_by"], as_json=False)
    for path in drawn:
        terminal.say(str(path))
    if survey.plan.flybys:
        terminal.say(f"flyby maps: porkgrid chart {survey.path}; a candidate's: with --path 1 --flyby 1")
    terminal.say(f"survey in {survey.path}")


def _print_candidates(survey: Survey, table: Any, by: str, as_json: bool) -> None:
    from porkgrid import terminal

    if as_json:
        terminal.print_json(table.to_dict("records"))
        return
    measures = survey.plan.measures
    names = [name for name in _SHOWN if name in measures and name != by]
    names += [name for name in measures if name.endswith("_revs") and table[name].any()]
    names += [name for name in measures if name.endswith(_SHOWN_PER_FLYBY) and name != by]
    units = {name: measure.unit for name, measure in measures.items()}
    dates = [name for name in table.columns if name not in measures and name != "rank"]
    headings = ["#", *dates, *names, f"{by} *"]
    rows = terminal.candidate_rows(table, units, [*names, by])
    columns = terminal.fitting(headings, rows, terminal.output().width)
    facts = survey.provenance
    title = (
        f"{facts['name']}: {facts['route']}\n"
        f"{facts['cells_allowed']:,} of {facts['cells']:,} cells are allowed; candidates by {by} (*)"
    )
    terminal.print_table([headings[c] for c in columns], [[row[c] for c in columns] for row in rows], title)


def _compile(warm_up: Any) -> None:
    """Have the kernels ready; say so where that takes a while, as on the first run on a machine."""
    from porkgrid import terminal

    timer = threading.Timer(
        3.0, terminal.say, ["compiling the kernels for this machine (once, under a minute) …"]
    )
    timer.start()
    try:
        warm_up()
    finally:
        timer.cancel()


def _duration(seconds: float) -> str:
    if seconds < 90:
        return f"{seconds:.1f} s"
    minutes = seconds / 60
    return f"{minutes:.0f} min" if minutes < 90 else f"{minutes / 60:.1f} h"


def main() -> None:
    """Run the command line; errors become one clear message and an exit code."""
    try:
        code = app(standalone_mode=False)
    except (RequestError, RunError) as error:
        for line in str(error).splitlines():
            print(f"porkgrid: {line}", file=sys.stderr)
        code = 2 if isinstance(error, RequestError) else 1
    except (KeyboardInterrupt, typer.Abort):
        code = _INTERRUPTED
    except OSError as error:
        place = "" if error.filename is None else f"{error.filename}: "
        print(f"porkgrid: {place}{error.strerror or error}", file=sys.stderr)
        code = 1
    except Exception as error:
        code = _usage_error(error)
    if code == _INTERRUPTED:  # typer returns this of an interrupt rather than let it through
        print("porkgrid: interrupted; give the same command again to go on", file=sys.stderr)
    sys.exit(code)


def _usage_error(error: Exception) -> int:
    """Show what is wrong with the command line itself; anything else is a fault of ours and goes up."""
    show = getattr(error, "show", None)
    if show is None:
        raise error
    show()
    return 2

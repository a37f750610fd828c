"""porkgrid rank: the candidates of a survey by any measure."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any

import typer

from porkgrid.commands.arguments import AsJson, Format, Formats, Order, SurveyFolder
from porkgrid.commands.completing import measure_names
from porkgrid.errors import RequestError

if TYPE_CHECKING:
    from porkgrid.survey.surveys import Survey

# Columns of the candidates' table on the terminal, where the route has them; the file has all measures.
_SHOWN = ("tof_days", "c3_km2_s2", "dla_deg", "v_inf_arrival_km_s", "dv_departure_km_s", "dv_capture_km_s",
          "dv_total_km_s", "delivered_mass_kg", "mass_margin_kg", "propellant_kg",
          "low_orbit_mass_kg")  # fmt: skip
_SHOWN_PER_FLYBY = ("_altitude_km", "_burn_km_s")


def rank(
    survey: SurveyFolder,
    by: Annotated[
        str | None,
        typer.Option(
            metavar="MEASURE",
            help="Measure to rank by; by default the scenario's.",
            autocompletion=measure_names,
        ),
    ] = None,
    order: Annotated[
        Order | None, typer.Option(help="Which end is better; by default the scenario's.")
    ] = None,
    keep: Annotated[int | None, typer.Option(min=1, help="How many candidates.")] = None,
    apart_days: Annotated[
        float | None, typer.Option(min=0.0, help="Closer than this in every date is one window.")
    ] = None,
    trade: Annotated[
        list[str] | None,
        typer.Option(
            metavar="MEASURE",
            help="Show what no other dates beat in both the rank measure and this one; twice for two.",
            autocompletion=measure_names,
        ),
    ] = None,
    formats: Formats = [Format.PNG],  # noqa: B006 - typer wants a list
    as_json: AsJson = False,
) -> None:
    """Rank a survey's dates anew, by any measure it stores, or trade one measure against others.

    Example: porkgrid rank surveys/ouzel-to-mars-2028 --by c3_km2_s2 --keep 5

    Example: porkgrid rank surveys/ouzel-to-mars-2028 --trade tof_days --trade c3_km2_s2
    """
    from porkgrid.survey.candidates import rank_anew
    from porkgrid.survey.surveys import open_survey

    opened = open_survey(survey)
    wanted = order.value if order else None
    if trade:
        if apart_days is not None:
            raise RequestError("--apart-days: a trade front is thinned evenly; --keep says to how many")
        _trade(opened, by, wanted, trade, keep, [each.value for each in formats], as_json)
        return
    table, by = rank_anew(opened, by, wanted, keep, apart_days)
    print_candidates(opened, table, by, as_json)


def _trade(
    survey: Survey,
    by: str | None,
    order: str | None,
    traded: list[str],
    keep: int | None,
    formats: list[str],
    as_json: bool,
) -> None:
    """Find a trade front, write its table and its figure into the survey's folder, and print it."""
    from porkgrid.figures.trade import save_trade
    from porkgrid.survey.trade import front_table, trade_front, write_front

    front = trade_front(survey, by, traded, order)
    table = front_table(survey, front, keep or survey.scenario.rank.keep)
    written = [write_front(survey, table), *map(str, save_trade(survey, front, table, formats))]
    if as_json:
        from porkgrid import terminal

        terminal.print_json(
            {
                "measures": list(front.measures),
                "cells_on_front": len(front.rows),
                "cells_allowed": front.allowed,
                "files": written,
                "candidates": table.to_dict("records"),
            }
        )
        return
    _print_front(survey, table, front.measures, len(front.rows), front.allowed)
    for path in written:
        print(path)


def _print_front(survey: Survey, table: Any, measures: tuple[str, ...], on_front: int, allowed: int) -> None:
    """Print the dates of a trade front with the measures traded first."""
    from porkgrid import terminal
    from porkgrid.survey.candidates import stops_of

    units = {name: measure.unit for name, measure in survey.plan.measures.items()}
    dates = stops_of(survey.plan)
    others = [name for name in _SHOWN if name in units and name not in measures]
    headings = ["#", *dates, *(f"{name} *" for name in measures), *others, ""]
    rows = [[*row, ""] for row in terminal.candidate_rows(table, units, dates, [*measures, *others])]
    columns = terminal.fitting(headings, rows, terminal.output().width)[:-1]
    shown = f"; {len(table)} of them, evenly spread" if len(table) < on_front else ""
    title = (
        f"{survey.provenance['name']}: {survey.provenance['route']}\n"
        f"{on_front:,} of {allowed:,} allowed cells are on the front of {', '.join(measures)} (*){shown}"
    )
    terminal.print_table([headings[c] for c in columns], [[row[c] for c in columns] for row in rows], title)


def print_candidates(survey: Survey, table: Any, by: str, as_json: bool) -> None:
    """Print a table of candidates as wide as the terminal allows, or whole as JSON."""
    from porkgrid import terminal
    from porkgrid.survey.candidates import stops_of

    if as_json:
        terminal.print_json(table.to_dict("records"))
        return
    measures = survey.plan.measures
    names = [name for name in _SHOWN if name in measures and name != by]
    names += [name for name in measures if name.endswith("_revs") and table[name].any()]
    names += [
        name
        for name in measures
        if name.startswith("flyby") and name.endswith(_SHOWN_PER_FLYBY) and name != by
    ]
    names = [f"refined_{by}", *names] if f"refined_{by}" in table else names
    units = {name: measure.unit for name, measure in measures.items()} | {f"refined_{by}": measures[by].unit}
    dates = stops_of(survey.plan)
    headings = ["#", *dates, f"{by} *", *names, ""]
    rows = [[*row, ""] for row in terminal.candidate_rows(table, units, dates, [by, *names])]
    columns = terminal.fitting(headings, rows, terminal.output().width)[:-1]
    facts = survey.provenance
    title = (
        f"{facts['name']}: {facts['route']}\n"
        f"{facts['cells_allowed']:,} of {facts['cells']:,} cells are allowed; candidates by {by} (*)"
    )
    terminal.print_table([headings[c] for c in columns], [[row[c] for c in columns] for row in rows], title)

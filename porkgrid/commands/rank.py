"""porkgrid rank: the candidates of a survey by any measure."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any

import typer

from porkgrid.commands.arguments import AsJson, Order, SurveyFolder

if TYPE_CHECKING:
    from porkgrid.survey.surveys import Survey

# Columns of the candidates' table on the terminal, where the route has them; the file has all measures.
_SHOWN = ("tof_days", "c3_km2_s2", "dla_deg", "v_inf_arrival_km_s", "dv_departure_km_s", "dv_capture_km_s",
          "dv_total_km_s")  # fmt: skip
_SHOWN_PER_FLYBY = ("_altitude_km", "_burn_km_s")


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
    print_candidates(opened, table, by, as_json)


def print_candidates(survey: Survey, table: Any, by: str, as_json: bool) -> None:
    """Print a table of candidates as wide as the terminal allows, or whole as JSON."""
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

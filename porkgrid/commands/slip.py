"""porkgrid slip: what leaving late costs."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any

import typer

from porkgrid.commands.arguments import AsJson, SurveyFolder
from porkgrid.commands.completing import measure_names

if TYPE_CHECKING:
    from porkgrid.survey.surveys import Survey


def slip(
    survey: SurveyFolder,
    by: Annotated[
        str | None,
        typer.Option(
            metavar="MEASURE",
            help="Measure of the cost; by default the scenario's.",
            autocompletion=measure_names,
        ),
    ] = None,
    as_json: AsJson = False,
) -> None:
    """Say what leaving 1, 5, 10 and 20 days late costs each candidate, and the last day that can be flown.

    The rest of the route is chosen anew. Writes slip.csv into the survey's folder.

    Example: porkgrid slip surveys/ouzel-to-mars-2028
    """
    from porkgrid import terminal
    from porkgrid.survey.departuredays import stored_measure
    from porkgrid.survey.folder import write_whole
    from porkgrid.survey.slip import slip as slip_of
    from porkgrid.survey.surveys import open_survey

    opened = open_survey(survey)
    name = stored_measure(opened, by)
    table = slip_of(opened, name)
    path = opened.path / "slip.csv"
    write_whole(path, table.to_csv(index=False))
    if as_json:
        terminal.print_json(table.to_dict("records"))
    else:
        _print_slip(opened, table, name)
    terminal.say(str(path))


def _print_slip(survey: Survey, table: Any, by: str) -> None:
    from porkgrid import terminal
    from porkgrid.survey.slip import LATE_DAYS, OPEN

    unit = survey.plan.measures[by].unit

    def change(row: Any, days: int) -> str:
        state = row[f"late_{days}_state"]
        if state != OPEN:
            return str(state)
        sign = "+" if row[f"late_{days}_change"] > 0.0 else ""
        return sign + terminal.number(row[f"late_{days}_change"], unit)

    headings = ["#", "departure", "arrival", by, *(f"+{days} d" for days in LATE_DAYS), "last day", "then"]
    rows = [
        [
            str(row["rank"]),
            row["departure"],
            row["arrival"],
            terminal.number(row[by], unit),
            *(change(row, days) for days in LATE_DAYS),
            f"{row['last_departure']} (+{row['last_days_late']:.0f} d)",
            row["last_state"],
        ]
        for _, row in table.iterrows()
    ]
    title = f"{survey.provenance['name']}: {survey.plan.route}\nLeaving late: change of {by} in {unit}"
    terminal.print_table(headings, rows, title)

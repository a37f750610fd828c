"""porkgrid chart: figures of a survey."""

from __future__ import annotations

from typing import Annotated

import typer

from porkgrid.commands.arguments import Format, Formats, SurveyFolder
from porkgrid.commands.completing import measure_names


def chart(
    survey: SurveyFolder,
    of: Annotated[
        str | None,
        typer.Option(
            metavar="MEASURE",
            help="Measure shown as colour; by default the rank measure.",
            autocompletion=measure_names,
        ),
    ] = None,
    lines: Annotated[
        str | None,
        typer.Option(metavar="MEASURE", help="Measure shown as lines.", autocompletion=measure_names),
    ] = None,
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
    from porkgrid.survey.surveys import open_survey

    opened = open_survey(survey)
    from porkgrid.reports.charts import write_charts

    for each in write_charts(opened, of, lines, path, flyby, [each.value for each in formats]):
        print(each)

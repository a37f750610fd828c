"""porkgrid period: the launch periods of a survey."""

from __future__ import annotations

from enum import StrEnum
from typing import TYPE_CHECKING, Annotated, Any

import typer

from porkgrid.commands.arguments import AsJson, Format, Formats, SurveyFolder
from porkgrid.commands.completing import measure_names

if TYPE_CHECKING:
    from pathlib import Path

    from porkgrid.survey.period import LaunchPeriod
    from porkgrid.survey.periodreport import PeriodReport
    from porkgrid.survey.surveys import Survey

_LENGTHS_SHOWN = (1, 5, 10, 15, 20, 30, 40, 50, 60)
# Columns of the day table on the terminal, where the route has them; CSV and JSON have all measures.
_SHOWN = ("c3_km2_s2", "dla_deg", "rla_deg", "v_inf_arrival_km_s", "dv_departure_km_s")
_SHOWN_LAST = (
    "dv_capture_km_s",
    "dv_total_km_s",
    "injected_mass_kg",
    "delivered_mass_kg",
    "low_orbit_mass_kg",
)


class Hold(StrEnum):
    """What is kept over the days of a period."""

    NOTHING = "nothing"
    ARRIVAL = "arrival"
    ALL = "all"


def period(
    survey: SurveyFolder,
    days: Annotated[int, typer.Option(help="How many days the period has.")] = 21,
    by: Annotated[
        str | None,
        typer.Option(
            metavar="MEASURE",
            help="Measure whose worst day counts; by default the scenario's.",
            autocompletion=measure_names,
        ),
    ] = None,
    hold: Annotated[
        Hold, typer.Option(help="Kept over the days: nothing, one arrival date, or all dates but departure.")
    ] = Hold.NOTHING,
    gaps: Annotated[int, typer.Option(metavar="G", help="Days that may be left out inside.")] = 0,
    keep: Annotated[int, typer.Option(min=1, help="How many distinct periods.")] = 3,
    as_json: AsJson = False,
    formats: Formats = [Format.PNG],  # noqa: B006 - typer wants a list
) -> None:
    """Find the launch periods whose worst day is best, and what they ask of launcher and spacecraft.

    Prints the best day by day, how cost grows with length, and the best of each season of a survey of many
    years. Draws the figure and writes the days of all periods found as CSV into the survey's folder.

    Example: porkgrid period surveys/ouzel-to-mars-2028 --days 21

    Example: porkgrid period surveys/godwit-by-venus-to-mars-2034 --days 15 --hold arrival --gaps 3
    """
    from porkgrid import terminal
    from porkgrid.survey.periodreport import report_periods
    from porkgrid.survey.surveys import open_survey

    opened = open_survey(survey)
    report = report_periods(opened, days, by, hold.value, gaps, keep)
    from porkgrid.reports.periods import write_periods  # the figures' libraries: not to refuse a request

    files = write_periods(opened, report, [each.value for each in formats])
    if as_json:
        terminal.print_json(_document(opened, report, files))
    else:
        _print_report(opened, report)
    for path in files:
        terminal.say(str(path))


def _document(survey: Survey, report: PeriodReport, files: list[Path]) -> dict[str, Any]:
    """All of a report as JSON has it."""
    best = report.periods[0]
    return {
        "survey": str(survey.path),
        "name": survey.provenance["name"],
        "route": survey.plan.route,
        "by": best.by,
        "unit": survey.plan.measures[best.by].unit,
        "days": best.days,
        "hold": best.hold,
        "gap_days": best.gap_days,
        "step_days": best.step_days,
        "periods": [_period_document(each) for each in report.periods],
        "growth": {"days": report.lengths.tolist(), "worst": report.worst.tolist()},
        "opportunities": [
            {
                "year": each.year,
                "first": each.first,
                "last": each.last,
                "longest_days": each.longest_days,
                "worst": each.period.worst if each.period else None,
                "at_window_edge": each.cut,
            }
            for each in report.opportunities
        ],
        "files": [str(path) for path in files],
    }


def _period_document(period: LaunchPeriod) -> dict[str, Any]:
    return {
        "first": period.first,
        "last": period.last,
        "worst": period.worst,
        "worst_on": period.worst_on,
        "required": {
            need.name: {"worst": need.worst, "unit": need.unit, "on": need.on} for need in period.needs
        },
        "margin": period.margin,
        "days": period.table.to_dict("records"),
    }


def _print_report(survey: Survey, report: PeriodReport) -> None:
    from porkgrid import terminal

    best = report.periods[0]
    unit = survey.plan.measures[best.by].unit

    def value(number: float) -> str:
        return terminal.number(number, unit)

    length = f"{best.days} day{'s' if best.days > 1 else ''}"
    title = (
        f"{survey.provenance['name']}: {survey.plan.route}\n"
        f"Best launch period of {length} by {best.by}, {_held(best)}: {best.first} to {best.last}, "
        f"worst {value(best.worst)} {unit} on {best.worst_on}"
    )
    terminal.output().print(title, highlight=False, markup=False)
    terminal.print_table(
        ["required", "worst", "unit", "on"],
        [[need.name, terminal.number(need.worst, need.unit), need.unit, need.on] for need in best.needs],
    )
    _print_days(survey, best)
    if len(report.periods) > 1:
        rows = [
            [str(number), each.first, each.last, value(each.worst), each.worst_on]
            for number, each in enumerate(report.periods, start=1)
        ]
        terminal.print_table(["#", "first", "last", f"worst {best.by}", "on"], rows, "Distinct periods")
    shown = [n for n in report.lengths.tolist() if n in (*_LENGTHS_SHOWN, best.days)]
    costs = [value(float(report.worst[n - 1])) for n in shown]
    terminal.print_table(
        ["days", *map(str, shown)],
        [[best.by, *costs]],
        "Cost of the best period by length (–: there is none)",
    )
    if report.opportunities:
        rows = [
            [
                str(each.year),
                each.first,
                each.last,
                value(each.period.worst if each.period else float("nan")),
                _remark(each.longest_days if each.period is None else None, each.cut),
            ]
            for each in report.opportunities
        ]
        terminal.print_table(["year", "first", "last", f"worst {best.by}", ""], rows, "Opportunities")


def _held(period: LaunchPeriod) -> str:
    held = {
        "nothing": "all other dates chosen day by day",
        "arrival": "one arrival date",
        "all": "flyby dates and arrival held",
    }[period.hold]
    if period.step_days > 1.0:
        held += f", each date for {period.step_days:g} days"
    days = f"{period.gap_days} day{'s' if period.gap_days > 1 else ''}"
    return held + (f", up to {days} left out" if period.gap_days else "")


def _remark(longest_days: int | None, cut: bool) -> str:
    parts = [] if longest_days is None else [f"allowed days; the longest period has {longest_days}"]
    parts += ["at the window's edge"] if cut else []
    return ", ".join(parts)


def _print_days(survey: Survey, period: LaunchPeriod) -> None:
    from porkgrid import terminal

    measures = survey.plan.measures
    burns = [name for name in measures if name.startswith("flyby") and name.endswith("_burn_km_s")]
    names = [name for name in (*_SHOWN, *burns, *_SHOWN_LAST) if name in measures]
    names += [period.by] if period.by not in names else []
    units = {name: measure.unit for name, measure in measures.items()} | {period.margin: _margin_unit(period)}
    dates = [name for name in period.table.columns if name not in units]
    headings = [*dates, *names, period.margin]
    rows = [
        [
            *(str(row[name]) for name in dates),
            *(terminal.number(row[n], units[n]) for n in headings[len(dates) :]),
        ]
        for _, row in period.table.iterrows()
    ]
    columns = terminal.fitting(headings, rows, terminal.output().width)
    terminal.print_table([headings[c] for c in columns], [[row[c] for c in columns] for row in rows])


def _margin_unit(period: LaunchPeriod) -> str:
    return "kg" if period.margin.endswith("_kg") else "km²/s²"

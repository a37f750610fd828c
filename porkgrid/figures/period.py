"""The launch period on a slide: its days one by one, what it asks for, and what more or fewer days cost."""

from __future__ import annotations

from matplotlib.figure import Figure

from porkgrid.figures.frame import draw_made_with, draw_titles
from porkgrid.figures.measured import plain_symbol
from porkgrid.figures.periodaxis import measure_text
from porkgrid.figures.perioddays import draw_days
from porkgrid.figures.periodside import draw_growth, draw_lists, growth_caption
from porkgrid.figures.placement import Box
from porkgrid.figures.style import SMALL_PT, SOFT_INK, new_slide
from porkgrid.figures.text import put
from porkgrid.survey.period import LaunchPeriod
from porkgrid.survey.periodreport import PeriodReport
from porkgrid.survey.surveys import Survey

_DAYS_BOX = Box(1.00, 0.98, 8.35, 6.20)
_GROWTH_BOX = Box(9.75, 4.42, 13.02, 6.20)
_LISTS = (9.20, 13.02, 3.86, 0.55)


def draw_period(survey: Survey, report: PeriodReport) -> Figure:
    """Draw the best launch period of a report on a 16:9 slide.

    Left the days of the period and those around it, which are faint. Right how cost grows with length, the
    required capability, and the other periods found, or the seasons of a survey of many years.
    """
    figure, sheet = new_slide()
    best, attrs = report.periods[0], survey.grid.attrs
    measure = survey.plan.measures[best.by]
    worst = f"worst {plain_symbol(measure.symbol)} {measure_text(measure, best.worst)}"
    headline = [attrs["route"], f"launch period {best.first} to {best.last}, {_length(best)}", worst]
    draw_titles(sheet, attrs["title"], headline, [_rule(best, plain_symbol(measure.symbol))])
    draw_made_with(sheet, attrs["kernel"], attrs["porkgrid"], [attrs["caution"]])

    draw_days(figure, sheet, _DAYS_BOX, survey.plan.measures, best, report.neighbours)
    draw_growth(figure, _GROWTH_BOX, measure, report)
    caption = " · ".join(growth_caption(measure, report))
    put(sheet, _GROWTH_BOX.left, _GROWTH_BOX.top + 0.06, caption, SMALL_PT, color=SOFT_INK)
    draw_lists(sheet, _LISTS, survey.plan, report)
    return figure


def _length(period: LaunchPeriod) -> str:
    left_out = f", up to {period.gap_days} more left out" if period.gap_days else ""
    return f"{period.days} day{'s' if period.days > 1 else ''}{left_out}"


def _rule(period: LaunchPeriod, symbol: str) -> str:
    """Say what was made best, and what was held."""
    held = {
        "nothing": "all other dates are chosen anew each day",
        "arrival": "all days arrive on one date",
        "all": "all days have the same flyby dates and arrival",
    }[period.hold]
    dates = f" Each date stands for {period.step_days:g} days." if period.step_days > 1.0 else ""
    run = f"The run of departure days whose worst {symbol} is best; {held}."
    return f"{run}{dates} Faint: days outside the period"

"""Beside the days of a launch period: what more or fewer days cost, what it requires, what else there is."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from porkgrid.figures.key import Column
from porkgrid.figures.marks import add_line, add_rectangle
from porkgrid.figures.measured import plain_symbol
from porkgrid.figures.numbers import ROW_IN, Pair, draw_list, number_text
from porkgrid.figures.periodaxis import mark_measure, measure_text
from porkgrid.figures.placement import Box
from porkgrid.figures.style import ACCENT, BODY_PT, INK, SMALL_PT, SOFT_INK, axes_at
from porkgrid.figures.text import put
from porkgrid.survey.measures import Measure
from porkgrid.survey.opportunities import Opportunity
from porkgrid.survey.periodreport import PeriodReport
from porkgrid.survey.plan import Plan

_CLOSED_PAPER = "#ececee"
_LENGTH_TICKS = 10


def draw_growth(figure: Figure, box: Box, measure: Measure, report: PeriodReport) -> None:
    """Draw the worst value of the best period of every length, with the length chosen."""
    axes = axes_at(figure, box.left, box.bottom, box.right - box.left, box.top - box.bottom)
    days, worst, chosen = report.lengths, report.worst, report.periods[0].days
    axes.set_xlim(0.0, days[-1] + 1.0)
    shown = mark_measure(axes, worst, box, measure, "worst ")
    axes.set_xticks(np.arange(_LENGTH_TICKS, days[-1] + 1, _LENGTH_TICKS * max(1, int(days[-1]) // 80)))
    axes.set_xlabel("length of the period (days)", fontsize=BODY_PT, labelpad=2.0)
    low, high = axes.get_ylim()
    known = np.isfinite(worst)
    if not known.all():
        longest = int(days[known].max())
        add_rectangle(
            axes, longest + 0.5, low, days[-1] + 0.5 - longest, high - low, color=_CLOSED_PAPER, linewidth=0
        )
    add_line(axes, days[known], shown[known], color=INK, linewidth=1.3, marker=".", markersize=2.5)
    value = float(shown[chosen - 1])
    add_line(axes, [chosen, chosen], [low, value], color=ACCENT, linewidth=0.9, linestyle=(0, (3, 2)))
    ring = {"marker": "o", "markersize": 7.0, "markerfacecolor": "none", "markeredgecolor": ACCENT}
    add_line(axes, [chosen], [value], linestyle="none", markeredgewidth=1.4, **ring)


def growth_caption(measure: Measure, report: PeriodReport) -> list[str]:
    """What the curve of lengths says in words: the length chosen, and the longest there is."""
    known = np.isfinite(report.worst)
    chosen = report.periods[0].days
    value = measure_text(measure, float(report.worst[chosen - 1]))
    said = [f"{chosen} day{'s' if chosen > 1 else ''}: {value}"]
    if not known.all():
        said.append(f"grey: no period longer than {int(report.lengths[known].max())} days")
    return said


def draw_lists(
    sheet: Axes, place: tuple[float, float, float, float], plan: Plan, report: PeriodReport
) -> None:
    """List the required capability and the other periods, or the seasons where there are several."""
    best = report.periods[0]
    measure = plan.measures[best.by]
    column = Column(sheet, *place)
    column.heading("Required over the period")
    pairs = [
        Pair(f"{_words(plan, need.name)}", f"{number_text(need.worst, need.unit)} · {need.on[:10]}")
        for need in best.needs
    ]
    others = _seasons(report.opportunities, measure) if report.opportunities else _others(report, measure)
    room = int((column.y - column.bottom - 0.55) / ROW_IN)
    draw_list(column, pairs[: max(3, room - len(others))])
    column.y -= 0.10
    column.heading("Best of each season" if report.opportunities else "Other periods")
    if not others:
        column.y -= ROW_IN
        put(
            sheet,
            column.left,
            column.y,
            "none that is a local best apart from this one",
            SMALL_PT,
            color=SOFT_INK,
        )
    draw_list(column, others[: int((column.y - column.bottom) / ROW_IN)])


def _words(plan: Plan, name: str) -> str:
    if name == "abs_dla_deg":
        return "greatest |DLA|"
    measure = plan.measures[name]
    return f"{'least' if measure.better == 'most' else 'greatest'} {plain_symbol(measure.symbol)}"


def _others(report: PeriodReport, measure: Measure) -> list[Pair]:
    return [
        Pair(f"{number}  {each.first[:10]} to {each.last[:10]}", measure_text(measure, each.worst))
        for number, each in enumerate(report.periods[1:], start=2)
    ]


def _seasons(found: list[Opportunity], measure: Measure) -> list[Pair]:
    return [
        Pair(
            f"{each.first[:10]} to {each.last[:10]}{' (window edge)' if each.cut else ''}",
            _season(each, measure),
        )
        for each in found
    ]


def _season(each: Opportunity, measure: Measure) -> str:
    if each.period is None:
        return f"{each.longest_days} days at most"
    return measure_text(measure, each.period.worst)

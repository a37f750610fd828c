"""Surveys, launch periods and comparisons as a notebook shows them."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import pandas as pd

from porkgrid.showing import html_line, html_page, html_table, number
from porkgrid.survey.store import CAUTION

if TYPE_CHECKING:
    from porkgrid.survey.compare import Comparison
    from porkgrid.survey.period import LaunchPeriod
    from porkgrid.survey.plan import Plan
    from porkgrid.survey.surveys import Survey

_CANDIDATES, _DAYS = 5, 40  # rows shown; the tables themselves have all
# Of a candidate and of a period's days, where the route has them and they are no flyby's
_SHOWN = (
    "tof_days",
    "c3_km2_s2",
    "dla_deg",
    "v_inf_arrival_km_s",
    "dv_departure_km_s",
    "dv_capture_km_s",
    "dv_total_km_s",
    "delivered_mass_kg",
    "mass_margin_kg",
    "low_orbit_mass_kg",
)


def survey_line(survey: Survey) -> str:
    """One line: name, route and where it lies."""
    facts = survey.provenance
    return f"<Survey {facts.get('name')!r}: {facts.get('route', 'not begun')}, in {survey.path}>"


def survey_html(survey: Survey) -> str:
    """What was swept, how much of it is allowed, and the first candidates."""
    facts, plan = survey.provenance, survey.plan
    rows, columns = plan.shape
    share = facts["cells_allowed"] / facts["cells"]
    table = survey.candidates
    return html_page(
        f"{facts['name']}: {facts['route']}",
        html_line(
            f"{rows:,} departure × {columns:,} arrival dates; {facts['cells_allowed']:,} of "
            f"{facts['cells']:,} cells are allowed ({share:.1%})"
        ),
        _flights(plan, table.head(_CANDIDATES), plan.rank_by, f"best of {len(table)} candidates"),
        html_line(CAUTION),
    )


def period_line(period: LaunchPeriod) -> str:
    """One line: its days and the worst of them."""
    return (
        f"<LaunchPeriod of {period.days} days, {period.first} to {period.last}: worst {period.by} "
        f"{period.worst:.4g} on {period.worst_on}>"
    )


def period_html(period: LaunchPeriod) -> str:
    """What the period asks of launcher and spacecraft, and its days."""
    needs = [[each.name, number(each.worst, each.unit), each.unit, each.on] for each in period.needs]
    units = {each.name: each.unit for each in period.needs}
    days, dates = period.table, [name for name in period.table.columns if not _is_measure(name)]
    names = [name for name in dict.fromkeys((*_SHOWN, period.by, period.margin)) if name in days]
    rows = [
        [*(str(row[name]) for name in dates), *(number(row[name], units.get(name, "")) for name in names)]
        for _, row in days.head(_DAYS).iterrows()
    ]
    left_out = len(days) - len(rows)
    return html_page(
        f"Launch period of {period.days} days by {period.by}: {period.first} to {period.last}",
        html_table(["required", "worst", "unit", "on"], needs),
        html_table([*dates, *names], rows, left=len(dates)),
        html_line(f"and {left_out} days more") if left_out else "",
    )


def report_html(periods: Sequence[LaunchPeriod]) -> str:
    """The best of some periods, and the others as a table."""
    best = periods[0]
    unit = {each.name: each.unit for each in best.needs}.get(best.by, "")
    rows = [
        [str(place), each.first, each.last, number(each.worst, unit), each.worst_on]
        for place, each in enumerate(periods, start=1)
    ]
    headings = ["#", "first", "last", f"worst {best.by}", "on"]
    return period_html(best) + html_table(headings, rows, "Distinct periods", left=3)


def comparison_line(comparison: Comparison) -> str:
    """One line: what is compared."""
    names = ", ".join(repr(each.name) for each in comparison.entries)
    return f"<Comparison of {names}, with launch periods of {comparison.days} days>"


def comparison_html(comparison: Comparison) -> str:
    """Routes and their baselines as columns, and what one saves against another."""
    from porkgrid.survey.compare import comparison_table

    table, units = comparison_table(comparison), comparison.units
    texts = [name for name in ("route", "ranked_by", "departure", "arrival") if name in table]
    flybys = [name for name in units if name.startswith("flyby") and name.endswith("_burn_km_s")]
    names = [name for name in (*_SHOWN, *flybys) if name in table and table[name].notna().any()]
    rows = [[name, *table[name].fillna("–").astype(str)] for name in texts]
    rows += [[name, *(number(float(value), units[name]) for value in table[name])] for name in names]
    rows += [["period of", *_periods(comparison, len(table))]]
    return html_page(
        "Routes side by side",
        html_table(["", *map(str, table["name"])], rows),
        *map(html_line, comparison.sentences),
    )


def _periods(comparison: Comparison, columns: int) -> list[str]:
    said = [
        each.no_period
        if each.period is None
        else f"{comparison.days} days: {each.period.first} to {each.period.last}"
        for each in comparison.entries
    ]
    return said + ["–"] * (columns - len(said))


def _flights(plan: Plan, table: pd.DataFrame, by: str, title: str) -> str:
    """Rows of a candidates' table: rank, dates of all encounters, and what one looks at first."""
    from porkgrid.survey.candidates import stops_of

    units = {name: measure.unit for name, measure in plan.measures.items()}
    dates = stops_of(plan)
    names = [name for name in dict.fromkeys((by, *_SHOWN)) if name in table and name in units]
    rows = [
        [
            str(row["rank"]),
            *(str(row[name]) for name in dates),
            *(number(row[name], units[name]) for name in names),
        ]
        for _, row in table.iterrows()
    ]
    return html_table(["#", *dates, *names], rows, title, left=1 + len(dates))


def _is_measure(name: str) -> bool:
    """Whether a column of a day table is a number; encounters' dates have no unit in their names."""
    return "_" in name

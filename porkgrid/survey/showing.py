"""Surveys, launch periods and comparisons as a notebook shows them."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING

import pandas as pd

from porkgrid.showing import html_line, html_page, html_table, number, unit_of
from porkgrid.survey.folder import COMPLETE
from porkgrid.survey.store import CAUTION

if TYPE_CHECKING:
    from porkgrid.survey.compare import Comparison
    from porkgrid.survey.period import LaunchPeriod
    from porkgrid.survey.surveys import Survey

_CANDIDATES, _DAYS = 5, 40  # rows shown; the tables themselves have all
_STOP = re.compile(r"departure|flyby\d+|arrival")  # columns of ISO dates
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
    return f"<Survey {facts.get('name')!r}: {facts.get('route', 'not begun')}, in {str(survey.path)!r}>"


def survey_html(survey: Survey) -> str:
    """What was swept, how much of it is allowed, and the first candidates; from the folder alone."""
    facts = survey.provenance
    title = f"{facts['name']}: {facts.get('route', 'not begun')}"
    if facts["state"] != COMPLETE:
        return html_page(title, html_line("the sweep is not finished"))
    table, grid = survey.candidates, facts["grid"]
    by, allowed = str(survey.grid.attrs["rank_by"]), facts["cells_allowed"]
    return html_page(
        title,
        html_line(
            f"{grid['departure_dates']:,} departure × {grid['arrival_dates']:,} arrival dates; "
            f"{allowed:,} of {facts['cells']:,} cells are allowed ({allowed / facts['cells']:.1%}), "
            f"{len(table)} candidates by {by}"
        ),
        _flights(table.head(_CANDIDATES), ["rank"], (by, *_SHOWN)),
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
    needs = [[each.name, each.on, number(each.worst, each.unit), each.unit] for each in period.needs]
    left_out = len(period.table) - _DAYS
    return html_page(
        f"Launch period of {period.days} days by {period.by}: {period.first} to {period.last}",
        html_table(["required", "on", "worst", "unit"], needs, left=2),
        _flights(period.table.head(_DAYS), [], (*_SHOWN, period.by, period.margin)),
        html_line(f"and {left_out} days more") if left_out > 0 else "",
    )


def report_html(periods: Sequence[LaunchPeriod]) -> str:
    """The best of some periods, and where there are others all of them as a table."""
    best = periods[0]
    rows = [
        [str(place), each.first, each.last, each.worst_on, number(each.worst, unit_of(best.by))]
        for place, each in enumerate(periods, start=1)
    ]
    headings = ["#", "first", "last", "worst day", best.by]
    others = html_table(headings, rows, "Distinct periods", left=4) if len(periods) > 1 else ""
    return period_html(best) + others


def comparison_line(comparison: Comparison) -> str:
    """One line: what is compared."""
    names = ", ".join(repr(each.name) for each in comparison.entries)
    return f"<Comparison of {names}, with launch periods of {comparison.days} days>"


def comparison_html(comparison: Comparison) -> str:
    """Routes and their baselines as columns, and what one saves against another."""
    from porkgrid.survey.compare import comparison_table

    table = comparison_table(comparison)
    columns = map(str, table.columns)
    burns = [name for name in columns if name.startswith("flyby") and name.endswith("_burn_km_s")]
    names = [name for name in (*_SHOWN, *burns) if name in table and table[name].notna().any()]
    rows = [[name, *table[name].fillna("–").astype(str)] for name in ("route", "ranked_by")]
    rows += [[name, *table[name].fillna("–").astype(str).str[:10]] for name in ("departure", "arrival")]
    rows += [[name, *(number(float(value), unit_of(name)) for value in table[name])] for name in names]
    rows += [[f"{comparison.days} days", *_periods(comparison, len(table))]]
    return html_page(
        "Routes side by side",
        html_table(["", *map(str, table["name"])], rows),
        *map(html_line, comparison.sentences),
    )


def _periods(comparison: Comparison, columns: int) -> list[str]:
    said = [
        each.no_period if each.period is None else f"{each.period.first} to {each.period.last}"
        for each in comparison.entries
    ]
    return said + ["–"] * (columns - len(said))


def _flights(table: pd.DataFrame, numbering: list[str], measures: Iterable[str]) -> str:
    """Rows of a table of flights: numbering, dates of all encounters, and those of the measures it has."""
    stops = [name for name in map(str, table.columns) if _STOP.fullmatch(name)]
    names = [name for name in dict.fromkeys(measures) if name in table]
    rows = [
        [
            *(str(row[name]) for name in (*numbering, *stops)),
            *(number(float(row[name]), unit_of(name)) for name in names),
        ]
        for _, row in table.iterrows()
    ]
    return html_table([*numbering, *stops, *names], rows, left=len(numbering) + len(stops))

"""What the page knows of a survey besides its cells: what it is, its candidates, and how it ranks them."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import pandas as pd

from porkgrid.page.blocks import Blocks
from porkgrid.page.grids import described, grid_document
from porkgrid.page.opened import Opened
from porkgrid.page.thin import Thinning
from porkgrid.survey.candidates import epoch_names
from porkgrid.survey.store import CAUTION

# Columns of the table of candidates, where the route has them; the reading has all measures
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
    "propellant_kg",
    "low_orbit_mass_kg",
)
_SHOWN_PER_FLYBY = ("_altitude_km", "_burn_km_s")


def survey_document(opened: Opened, thinning: Thinning, blocks: Blocks) -> dict[str, Any]:
    """A survey as the page's JSON holds it; arrays go to `blocks`."""
    survey, plan = opened.survey, opened.survey.plan
    facts = survey.provenance
    return {
        "name": plan.scenario.name,
        "description": plan.scenario.description or "",
        "route": plan.route,
        "folder": str(survey.path),
        "kernel": plan.ephemeris.label,
        "version": facts.get("versions", {}).get("porkgrid", ""),
        "swept": facts.get("finished", facts.get("started", ""))[:10],
        "conventions": facts.get("conventions", ""),
        "caution": CAUTION,
        "missing": _missing(opened),
        "rank": {
            "by": plan.rank_by,
            "sign": plan.rank_sign,
            "keep": plan.scenario.rank.keep,
            "apartDays": plan.scenario.rank.apart_days,
        },
        "grid": grid_document(opened, thinning, blocks),
        "candidates": _candidates(opened),
        "columns": _columns(opened),
    }


def json_safe(value: Any) -> Any:
    """The value with None for what JSON has no number for."""
    if isinstance(value, dict):
        return {key: json_safe(each) for key, each in value.items()}
    if isinstance(value, list | tuple):
        return [json_safe(each) for each in value]
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value


def table_document(table: pd.DataFrame) -> dict[str, Any]:
    """A table as its headings and rows."""
    rows = table.astype(object).where(table.notna(), None).values.tolist()
    return {"headings": list(map(str, table.columns)), "rows": json_safe(rows)}


def _missing(opened: Opened) -> dict[str, Any] | None:
    if not opened.missing:
        return None
    return {
        "share": opened.missing_share,
        "tiles": len(opened.missing),
        "of": len(opened.survey.plan.tiles),
    }


def _candidates(opened: Opened) -> list[dict[str, Any]]:
    """Each candidate's rank, dates, epochs in flying order and every measure of the route, as computed."""
    plan = opened.survey.plan
    epochs = epoch_names(plan)
    stops = [name.removesuffix("_epoch_jd_tdb") for name in epochs]
    return [
        {
            "rank": int(row["rank"]),
            "dates": [str(row[stop]) for stop in stops],
            "epochs": [float(row[name]) for name in epochs],
            "values": {name: float(row[name]) for name in plan.measures},
            "refined": _refined(row, plan.rank_by, stops),
        }
        for _, row in opened.candidates.iterrows()
    ]


def _refined(row: pd.Series, by: str, stops: Sequence[str]) -> dict[str, Any] | None:
    """What a candidate becomes off the grid, where the table has that (survey.refinedtable)."""
    if f"refined_{by}" not in row:
        return None
    note = row["refined_note"]
    return {
        "value": float(row[f"refined_{by}"]),
        "dates": [str(row[f"refined_{stop}"]) for stop in stops],
        "note": note if isinstance(note, str) else "",
    }


def _columns(opened: Opened) -> dict[str, Sequence[Any]]:
    """The measures that a candidate has, described, and those that a table begins with."""
    measures = opened.survey.plan.measures
    shown = [name for name in _SHOWN if name in measures]
    shown += [name for name in measures if name.startswith("flyby") and name.endswith(_SHOWN_PER_FLYBY)]
    return {"measures": [described(measure) for measure in measures.values()], "shown": shown}

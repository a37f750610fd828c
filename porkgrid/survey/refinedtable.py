"""Refined candidates beside those of the grid: two tables of a survey folder."""

from __future__ import annotations

import pandas as pd

from porkgrid.sky.epochs import iso_from_jd
from porkgrid.survey.candidates import stops_of
from porkgrid.survey.plan import Plan
from porkgrid.survey.refine import Refined

BEYOND = "better dates lie beyond"


def with_refined(plan: Plan, table: pd.DataFrame, refined: list[Refined]) -> pd.DataFrame:
    """The candidates' table with columns of what each becomes when its dates are let off the grid.

    `refined_<measure>` is the ranked measure then, `refined_<encounter>` the ISO dates, `refined_note` what
    there is to know: a candidate that it has merged with, better dates out of its reach, a fault.
    """
    stops = stops_of(plan)
    by_number = {number: one for one in refined for number in (one.number, *one.merged)}
    rows = []
    for number in table["rank"]:
        one = by_number[number]
        rows.append([one.value, *map(iso_from_jd, one.picked.epochs), _note(one, number)])
    names = [f"refined_{name}" for name in (plan.rank_by, *stops, "note")]
    return pd.concat([table, pd.DataFrame(rows, columns=names)], axis=1)


def _note(one: Refined, number: int) -> str:
    parts = [] if one.number == number else [f"one with {one.number}"]
    parts += [one.fault] if one.fault else []
    parts += [f"{BEYOND} ({', '.join(one.stopped)})"] if one.stopped else []
    parts += [f"against {', '.join(one.active)}"] if one.active else []
    burning = [f"flyby {n} burns {burn:.0f} m/s" for n, burn in enumerate(one.burns_m_s, 1) if burn >= 1.0]
    return "; ".join(parts + burning)

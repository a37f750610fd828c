"""The launch periods of a survey as files in its folder."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import pandas as pd

from porkgrid.figures.period import draw_period
from porkgrid.figures.style import save_figure
from porkgrid.survey.folder import FIGURES, write_whole
from porkgrid.survey.periodreport import PeriodReport
from porkgrid.survey.surveys import Survey


def write_periods(survey: Survey, report: PeriodReport, formats: Sequence[str]) -> list[Path]:
    """Write the days of all periods as CSV, and the figure; files. Names say what is not as usual."""
    best = report.periods[0]
    parts = ["period", str(best.days)]
    parts += [best.by] if best.by != survey.plan.rank_by else []
    parts += [f"hold-{best.hold}"] if best.hold != "nothing" else []
    parts += [f"gaps-{best.gap_days}"] if best.gap_days else []
    table = survey.path / f"{'-'.join(parts)}.csv"
    numbered = [each.table.assign(period=number) for number, each in enumerate(report.periods, start=1)]
    rows = pd.concat(numbered)
    write_whole(table, rows[["period", *numbered[0].columns[:-1]]].to_csv(index=False))
    return [table, *save_figure(draw_period(survey, report), survey.path / FIGURES / table.stem, formats)]

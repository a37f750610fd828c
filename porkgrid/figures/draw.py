"""The figures of a survey, drawn into its folder."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from porkgrid.errors import RequestError
from porkgrid.figures.chart import draw_chart
from porkgrid.figures.limit_map import draw_limit_map
from porkgrid.figures.style import save_figure
from porkgrid.survey.folder import FIGURES
from porkgrid.survey.surveys import Survey
from porkgrid.survey.view import day_bests, drawn_view, flag_shares


def draw_figures(survey: Survey, of: str | None, lines: str | None, formats: Sequence[str]) -> list[Path]:
    """Draw the chart and the limit map and return the files written.

    `of` is the measure in colour, by default the rank measure; `lines` the one in lines, by default C3, or
    arrival speed where C3 is in colour. RequestError for a measure that the survey does not store.
    """
    rank_by = survey.grid.attrs["rank_by"]
    usual = of is None and lines is None
    of = of or rank_by
    lines = lines or _second(survey, of)
    for name in (of, lines):
        if name is not None:
            _must_store(survey, name)
    names = [of, *([lines] if lines else [])]
    epochs = ("departure_epoch_jd_tdb", "arrival_epoch_jd_tdb")
    view = drawn_view(survey, list(dict.fromkeys((*names, *epochs))))
    chart = draw_chart(view, day_bests(survey, of), survey.candidates, of, lines)
    folder = survey.path / FIGURES
    folder.mkdir(exist_ok=True)
    stem = "chart" if usual else "-".join(["chart", *names])
    drawn = save_figure(chart, folder / stem, formats)
    return drawn + save_figure(draw_limit_map(view, flag_shares(survey)), folder / "limits", formats)


def _second(survey: Survey, of: str) -> str | None:
    usual = ("c3_km2_s2", "v_inf_arrival_km_s", "tof_days")
    return next((name for name in usual if name != of and name in survey.grid), None)


def _must_store(survey: Survey, name: str) -> None:
    if name not in survey.grid.data_vars or name == "blocked_by":
        stored = ", ".join(sorted(each for each in survey.grid.data_vars if each in survey.plan.measures))
        raise RequestError(f"{survey.path}: the survey does not store {name!r}; it has {stored}")

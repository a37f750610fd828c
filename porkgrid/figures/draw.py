"""The figures of a survey, drawn into its folder."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from porkgrid.errors import RequestError
from porkgrid.figures.chart import draw_chart
from porkgrid.figures.limit_map import draw_limit_map
from porkgrid.figures.style import save_figure
from porkgrid.survey.candidates import epoch_names
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
    drawn += save_figure(draw_limit_map(view, flag_shares(survey)), folder / "limits", formats)
    return drawn


def draw_flyby_maps(survey: Survey, formats: Sequence[str]) -> list[Path]:
    """Draw each flyby's date and altitude on the axes of the chart; nothing for a direct route."""
    return [
        path
        for name in map(str, survey.grid.data_vars)
        if name.startswith("flyby") and name.endswith(("_epoch_jd_tdb", "_altitude_km"))
        for path in _draw_flyby_map(survey, name, formats)
    ]


def draw_path_of(survey: Survey, candidate: int, formats: Sequence[str]) -> list[Path]:
    """Draw the path of a candidate (from 1). RequestError for a number that is not in the table."""
    from porkgrid.figures.path import draw_path
    from porkgrid.survey.pictures import route_picture

    picture = route_picture(survey.plan, *_flown(survey, candidate))
    return save_figure(draw_path(picture), _in_figures(survey, f"path-{candidate}"), formats)


def draw_flybys_of(survey: Survey, candidate: int, formats: Sequence[str]) -> list[Path]:
    """Draw the vector figure of each flyby of a candidate (from 1). RequestError where there is none."""
    from porkgrid.figures.flyby import draw_flyby
    from porkgrid.survey.pictures import flyby_picture

    flown = _flown(survey, candidate)
    if not survey.plan.flybys:
        raise RequestError(f"{survey.path}: {survey.plan.route} has no flyby to draw; --path draws the path")
    drawn = []
    for n in range(1, survey.plan.flybys + 1):
        figure = draw_flyby(flyby_picture(survey.plan, *flown, n))
        drawn += save_figure(figure, _in_figures(survey, f"flyby{n}-{candidate}"), formats)
    return drawn


def _draw_flyby_map(survey: Survey, name: str, formats: Sequence[str]) -> list[Path]:
    """The chart with a flyby's date or altitude in colour, on the axes of the chart."""
    view = drawn_view(survey, [name, "departure_epoch_jd_tdb", "arrival_epoch_jd_tdb"])
    figure = draw_chart(view, day_bests(survey, name), survey.candidates, name, None)
    flyby, _, what = name.partition("_")
    return save_figure(figure, _in_figures(survey, f"{flyby}-{what.split('_')[0]}"), formats)


def _flown(survey: Survey, candidate: int) -> tuple[list[float], list[int], list[int]]:
    """Epochs, revolutions and branches of a candidate's legs."""
    table = survey.candidates
    if not 1 <= candidate <= len(table):
        there = f"there are 1 to {len(table)}" if len(table) else "the limits left none"
        raise RequestError(f"{survey.path}: no candidate {candidate}; {there}")
    row = table.iloc[candidate - 1]
    legs = range(1, survey.plan.flybys + 2)
    return (
        [float(row[name]) for name in epoch_names(survey.plan)],
        [int(row[f"leg{n}_revs"]) for n in legs],
        [int(row[f"leg{n}_branch"]) for n in legs],
    )


def _in_figures(survey: Survey, stem: str) -> Path:
    folder = survey.path / FIGURES
    folder.mkdir(exist_ok=True)
    return folder / stem


def _second(survey: Survey, of: str) -> str | None:
    usual = ("c3_km2_s2", "v_inf_arrival_km_s", "tof_days")
    return next((name for name in usual if name != of and name in survey.grid), None)


def _must_store(survey: Survey, name: str) -> None:
    if name not in survey.grid.data_vars or name == "blocked_by":
        stored = ", ".join(sorted(each for each in survey.grid.data_vars if each in survey.plan.measures))
        raise RequestError(f"{survey.path}: the survey does not store {name!r}; it has {stored}")

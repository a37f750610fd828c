"""The figures that one request of a survey asks for."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from porkgrid.figures import draw
from porkgrid.survey.surveys import Survey


def write_charts(
    survey: Survey,
    of: str | None,
    lines: str | None,
    path: int | None,
    flyby: int | None,
    formats: Sequence[str],
) -> list[Path]:
    """Draw the chart and the limit map, or the path or flybys of a candidate (from 1); the files.

    Where neither `of` nor `lines` is named the maps of the flybys come along. RequestError for a measure that
    is not stored, or a candidate or flyby that is not there.
    """
    if path is None and flyby is None:
        drawn = draw.draw_figures(survey, of, lines, formats)
        return drawn + (draw.draw_flyby_maps(survey, formats) if of is None and lines is None else [])
    drawn = draw.draw_path_of(survey, path, formats) if path is not None else []
    return drawn + (draw.draw_flybys_of(survey, flyby, formats) if flyby is not None else [])

"""The review page of surveys, with the figures of their first candidates drawn where they are missing."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from porkgrid.errors import RequestError
from porkgrid.page.opened import Opened, open_for_page
from porkgrid.page.review import Written, plotly_script, write_review
from porkgrid.survey.folder import CANDIDATES, FIGURES


def write_page(surveys: Sequence[Path], target: Path | None, figures: int) -> tuple[list[Opened], Written]:
    """Write the page of survey folders, path and flybys of so many first candidates included.

    By default into the one survey's folder, of several to review.html. Comparisons are those under
    comparisons/. RequestError where plotly is not installed, or the surveys make no page.
    """
    plotly_script()  # refused before any work is done
    if target is None:
        target = surveys[0] / "page.html" if len(surveys) == 1 else Path("review.html")
    if target.is_dir():
        raise RequestError(f"{target}: is a folder; give a file with --out")
    opened = open_for_page(surveys)
    for each in opened:
        _draw(each, figures)
    comparisons = sorted(path.parent for path in Path("comparisons").glob("*/comparison.csv"))
    return opened, write_review(opened, comparisons, target)


def _draw(opened: Opened, most: int) -> None:
    """Draw the first candidates into the survey's folder, unless that was done since the ranking."""
    table = opened.survey.path / CANDIDATES
    if opened.missing or not table.exists():
        return
    for number in range(1, min(most, len(opened.candidates)) + 1):
        path = opened.survey.path / FIGURES / f"path-{number}.svg"
        if path.exists() and path.stat().st_mtime >= table.stat().st_mtime:
            continue
        from porkgrid.figures.draw import draw_flybys_of, draw_path_of

        draw_path_of(opened.survey, number, ["svg"])
        if opened.survey.plan.flybys:
            draw_flybys_of(opened.survey, number, ["svg"])

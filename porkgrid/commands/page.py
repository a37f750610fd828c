"""porkgrid page: the review page of one survey or of several."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

if TYPE_CHECKING:
    from porkgrid.page.opened import Opened


def page(
    surveys: Annotated[
        list[Path], typer.Argument(metavar="SURVEY…", help="Survey folders that `porkgrid sweep` made.")
    ],
    out: Annotated[
        Path | None, typer.Option(help="File to write; by default SURVEY/page.html, of several review.html.")
    ] = None,
    figures: Annotated[
        int, typer.Option(min=0, help="Draw path and flybys of so many of the first candidates.")
    ] = 3,
) -> None:
    """Write one HTML file to look at surveys in a browser: no network, opens from disk.

    The chart with a crosshair that reads every measure, limits to move, candidates ranked anew as they move,
    and what `porkgrid chart`, `period`, `slip` and `compare` have made. A survey half swept is shown as far
    as it is.

    Example: porkgrid page surveys/ouzel-to-mars-2028

    Example: porkgrid page surveys/godwit-by-venus-to-mars-2034 surveys/godwit-straight-to-mars-2035
    """
    from porkgrid import terminal
    from porkgrid.errors import RequestError
    from porkgrid.page.opened import open_for_page
    from porkgrid.page.review import plotly_script, write_review

    plotly_script()  # refused before any work is done
    target = (
        out if out is not None else surveys[0] / "page.html" if len(surveys) == 1 else Path("review.html")
    )
    if target.is_dir():
        raise RequestError(f"{target}: is a folder; give a file with --out")
    opened = open_for_page(surveys)
    for each in opened:
        _draw(each, figures)
    comparisons = sorted(path.parent for path in Path("comparisons").glob("*/comparison.csv"))
    written = write_review(opened, comparisons, target)
    for each, thinning in zip(opened, written.thinnings, strict=True):
        if each.missing:
            terminal.say(f"{each.survey.path}: half swept: {each.missing_share:.0%} of the cells are missing")
        if thinning.words:
            terminal.say(f"{each.survey.path}: {thinning.words}")
    if written.left_out:
        terminal.say(f"no room in the page for {', '.join(written.left_out)}")
    print(written.path)


def _draw(opened: Opened, most: int) -> None:
    """Draw the first candidates into the survey's folder, unless that was done since the ranking."""
    from porkgrid.survey.folder import CANDIDATES, FIGURES

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

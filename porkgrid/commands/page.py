"""porkgrid page: the review page of one survey or of several."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer


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

    Example: porkgrid page surveys/godwit-*
    """
    from porkgrid import terminal
    from porkgrid.reports.pages import write_page

    opened, written = write_page(surveys, out, figures)
    for each, thinning in zip(opened, written.thinnings, strict=True):
        if each.missing:
            terminal.say(f"{each.survey.path}: half swept: {each.missing_share:.0%} of the cells are missing")
        if thinning.words:
            terminal.say(f"{each.survey.path}: {thinning.words}")
    if written.left_out:
        terminal.say(f"no room in the page for {', '.join(written.left_out)}")
    print(written.path)

"""A page from surveys: chosen thinning, everything packed, one HTML file written whole."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass
from importlib.resources import files
from pathlib import Path
from typing import Any

from porkgrid.errors import RequestError
from porkgrid.page.beside import Room, comparisons_of, figures_of_candidates, periods_of, slip_of
from porkgrid.page.blocks import Blocks
from porkgrid.page.contents import json_safe, survey_document
from porkgrid.page.opened import Opened
from porkgrid.page.thin import Thinning, thinning_for
from porkgrid.survey.folder import write_whole

INSTALL = "pip install 'porkgrid[page]'"

MOST_BYTES = 11_500_000  # of a page
_FIGURE_BYTES = 2_500_000  # of those, for figures of all surveys together
# What a browser redraws within two tenths of a second, and what several surveys hold together
_MOST_CELLS, _MOST_CELLS_IN_ALL = 100_000, 400_000
_COARSER = 1.5  # how much fewer cells are tried where a page would grow too large
_LEAST_CELLS = 1000  # fewer are no chart

# In the order in which they use each other
_SCRIPTS = (
    "unpack",
    "model",
    "rank",
    "format",
    "chart",
    "reading",
    "limits",
    "table",
    "figures",
    "paper",
    "page",
)


@dataclass(frozen=True)
class Written:
    """A page on disk: where, how large, how each survey was thinned, and which figures found no room."""

    path: Path
    size: int
    thinnings: tuple[Thinning, ...]
    left_out: tuple[str, ...]


def plotly_script() -> str:
    """The charting library's own file. RequestError where the extra is not installed."""
    try:
        from plotly.offline import get_plotlyjs
    except ImportError:
        raise RequestError(f"the page needs plotly, which is not installed: {INSTALL} installs it") from None
    return str(get_plotlyjs())


def write_review(opened: Sequence[Opened], comparisons: Sequence[Path], path: Path) -> Written:
    """Write the page of some surveys as one file that needs no network.

    `comparisons` are folders that `porkgrid compare` wrote; those that hold all of the surveys are shown.
    RequestError where plotly is not installed, or the surveys are too many for a page of `MOST_BYTES`.
    """
    library = plotly_script()
    most_cells = min(_MOST_CELLS, _MOST_CELLS_IN_ALL // len(opened))
    while True:
        blocks, room = Blocks(), Room(_FIGURE_BYTES)
        thinnings = [thinning_for(*each.survey.plan.shape, most_cells) for each in opened]
        html = _html(_document(opened, thinnings, comparisons, blocks, room), blocks, library)
        size = len(html.encode())
        if size <= MOST_BYTES:
            break
        most_cells = int(min(most_cells, max(each.cells for each in thinnings)) / _COARSER)
        if most_cells < _LEAST_CELLS:
            raise RequestError(
                f"{len(opened)} surveys are too many for a page of {MOST_BYTES / 1e6:g} MB; give fewer"
            )
    write_whole(path, html)
    return Written(path, size, tuple(thinnings), tuple(room.left_out))


def _html(document: dict[str, Any], blocks: Blocks, library: str) -> str:
    return _filled(
        _asset("page.html"),
        {
            "title": _escaped(" · ".join(survey["name"] for survey in document["surveys"])),
            "style": _asset("page.css"),
            "data": _as_json(document),
            "blocks": "\n".join(
                f'<script type="text/plain" id="block-{number}">{text}</script>'
                for number, text in enumerate(blocks.texts)
            ),
            "library": library,
            "script": "\n".join(_asset(f"{name}.js") for name in _SCRIPTS),
        },
    )


def _document(
    opened: Sequence[Opened],
    thinnings: Sequence[Thinning],
    comparisons: Sequence[Path],
    blocks: Blocks,
    room: Room,
) -> dict[str, Any]:
    surveys = []
    for each, thinning in zip(opened, thinnings, strict=True):
        surveys.append(
            survey_document(each, thinning, blocks)
            | {
                "figures": figures_of_candidates(each, blocks, room),
                "periods": periods_of(each, blocks, room),
                "slip": slip_of(each),
            }
        )
    compared = comparisons_of(comparisons, opened, blocks, room)
    return {"surveys": surveys, "comparisons": compared, "leftOut": room.left_out}


def _asset(name: str) -> str:
    return files("porkgrid.page").joinpath("assets", name).read_text(encoding="utf-8")


def _filled(shell: str, parts: dict[str, str]) -> str:
    """The shell with each <!--part--> mark replaced, in one pass: what is put in is not searched again."""
    pieces = []
    rest = shell
    for name, text in parts.items():
        before, mark, rest = rest.partition(f"<!--{name}-->")
        assert mark, f"page.html has no place for {name}"
        pieces += [before, text]
    return "".join([*pieces, rest])


def _as_json(document: dict[str, Any]) -> str:
    """JSON that stays inside its script element whatever names and titles it holds."""
    text = json.dumps(json_safe(document), ensure_ascii=False, separators=(",", ":"), allow_nan=False)
    return text.replace("&", "\\u0026").replace("<", "\\u003c").replace(">", "\\u003e")


def _escaped(text: str) -> str:
    for sign, entity in (("&", "&amp;"), ("<", "&lt;"), (">", "&gt;")):
        text = text.replace(sign, entity)
    return text

"""What other commands have left in a survey's folder: figures, launch periods, slip, comparisons."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import Any

import pandas as pd

from porkgrid.errors import RequestError
from porkgrid.page.blocks import Blocks
from porkgrid.page.contents import table_document
from porkgrid.page.opened import Opened
from porkgrid.page.pack import packed_bytes
from porkgrid.survey.folder import CANDIDATES, FIGURES

_MIME = {".svg": "image/svg+xml", ".png": "image/png"}
_OF_CANDIDATE = re.compile(r"(path|flyby(\d+))-(\d+)")


class Room:
    """How many bytes of the page figures may still take; what did not fit is listed."""

    def __init__(self, bytes_left: int) -> None:
        self.bytes_left = bytes_left
        self.left_out: list[str] = []

    def admit(self, path: Path, blocks: Blocks) -> dict[str, Any] | None:
        """A figure as a block and its type; None where there is no room left for it."""
        text = packed_bytes(path.read_bytes())
        if len(text) > self.bytes_left:
            self.left_out.append(path.name)
            return None
        self.bytes_left -= len(text)
        return {"block": blocks.add(text), "type": _MIME[path.suffix]}


def figures_of_candidates(opened: Opened, blocks: Blocks, room: Room) -> dict[str, list[dict[str, Any]]]:
    """Path and flyby figures by candidate's rank; those older than the candidates' table are not of it."""
    folder = opened.survey.path / FIGURES
    table = opened.survey.path / CANDIDATES
    found: dict[int, list[tuple[int, Path]]] = {}
    for path in _figures(folder):
        match = _OF_CANDIDATE.fullmatch(path.stem)
        if match and table.exists() and path.stat().st_mtime >= table.stat().st_mtime:
            found.setdefault(int(match[3]), []).append((int(match[2] or 0), path))
    documents = {}
    for rank in sorted(found):
        drawn = [(number, room.admit(path, blocks)) for number, path in sorted(found[rank])]
        documents[str(rank)] = [
            figure | {"title": f"Flyby {number}" if number else "Path"} for number, figure in drawn if figure
        ]
    return documents


def periods_of(opened: Opened, blocks: Blocks, room: Room) -> list[dict[str, Any]]:
    """The launch periods that `porkgrid period` wrote: file name, table, and figure where there is room."""
    documents = []
    for path in sorted(opened.survey.path.glob("period-*.csv")):
        figure = next(
            (each for each in _figures(opened.survey.path / FIGURES) if each.stem == path.stem), None
        )
        documents.append(
            {
                "file": path.name,
                "table": table_document(_read(path)),
                "figure": None if figure is None else room.admit(figure, blocks),
            }
        )
    return documents


def slip_of(opened: Opened) -> dict[str, Any] | None:
    """The table that `porkgrid slip` wrote, if it did."""
    path = opened.survey.path / "slip.csv"
    return table_document(_read(path)) if path.exists() else None


def comparisons_of(
    folders: Sequence[Path], opened: Sequence[Opened], blocks: Blocks, room: Room
) -> list[dict[str, Any]]:
    """The comparisons among `folders` by `porkgrid compare` that hold every survey of the page."""
    names = {each.survey.plan.scenario.name for each in opened}
    documents = []
    for folder in folders:
        table = _read(folder / "comparison.csv")
        if "name" not in table or not names <= set(table["name"]):
            continue
        figure = next((each for each in _figures(folder) if each.stem == "comparison"), None)
        documents.append(
            {
                "file": str(folder / "comparison.csv"),
                "table": table_document(table),
                "figure": None if figure is None else room.admit(figure, blocks),
            }
        )
    return documents


def _figures(folder: Path) -> Iterator[Path]:
    """The figures of a folder that a page can show; of two formats SVG, which is smaller."""
    seen = set()
    for suffix in _MIME:
        for path in sorted(folder.glob(f"*{suffix}")):
            if path.stem not in seen:
                seen.add(path.stem)
                yield path


def _read(path: Path) -> pd.DataFrame:
    try:
        return pd.read_csv(path)
    except (ValueError, OSError) as error:  # pandas' parser errors are ValueErrors
        raise RequestError(f"{path}: cannot be read as a table: {error}; make it anew") from None

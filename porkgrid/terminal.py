"""What commands print: tables and JSON on standard output, progress and messages on standard error."""

from __future__ import annotations

import json
import math
import os
import sys
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

from rich import box
from rich.console import Console
from rich.table import Table

if TYPE_CHECKING:
    import pandas as pd

    from porkgrid.survey.sweep import Progress

_DIGITS = {"km/s": 3, "km²/s²": 2, "deg": 1, "days": 1, "au": 3, "1": 0, "kg": 0, "km": 0}
_PLAIN_WIDTH = 1000  # columns of a table that does not go to a terminal


def output() -> Console:
    """Where tables go."""
    return Console(width=None if sys.stdout.isatty() else _PLAIN_WIDTH)


def say(message: str) -> None:
    """Tell the user something, on standard error."""
    print(message, file=sys.stderr, flush=True)


def print_json(value: Any) -> None:
    """Print a value as JSON; what is not a number becomes null."""
    print(json.dumps(_without_nan(value), indent=2, ensure_ascii=False))


def print_table(headings: Sequence[str], rows: Iterable[Sequence[str]], title: str | None = None) -> None:
    """Print a table; columns of numbers are right-aligned."""
    body = [list(row) for row in rows]
    table = Table(box=box.SIMPLE_HEAD, title=title, title_justify="left", pad_edge=False)
    for index, heading in enumerate(headings):
        numeric = bool(body) and all(_is_number(row[index]) for row in body)
        table.add_column(_broken(heading), justify="right" if numeric else "left", no_wrap=not numeric)
    for row in body:
        table.add_row(*row)
    output().print(table, highlight=False, markup=False)


def fitting(headings: Sequence[str], rows: Sequence[Sequence[str]], width: int) -> list[int]:
    """Which columns of a table fit side by side; the last one is kept whatever happens."""
    columns = zip(map(_broken, headings), *rows, strict=True)
    taken = [3 + max(len(line) for cell in column for line in cell.split("\n")) for column in columns]
    last = len(headings) - 1
    room = width - taken[last]
    kept = []
    for index, each in enumerate(taken[:last]):
        if each > room:
            break
        room -= each
        kept.append(index)
    return [*kept, last]


def _broken(name: str, width: int = 11) -> str:
    """A long name on several lines, broken behind underscores."""
    lines = [""]
    for word in name.replace("_", "_\0").split("\0"):
        if lines[-1] and len(lines[-1]) + len(word) > width:
            lines.append("")
        lines[-1] += word
    return "\n".join(lines)


def number(value: float, unit: str) -> str:
    """A measure as a table shows it."""
    if value != value:
        return "–"
    return f"{value:.{_DIGITS.get(unit, 3)}f}"


def candidate_rows(table: pd.DataFrame, units: dict[str, str], names: Sequence[str]) -> list[list[str]]:
    """Rank, dates and the named measures of each candidate."""
    dates = [name for name in table.columns if name not in units and name != "rank"]
    return [
        [
            str(row["rank"]),
            *(str(row[name]) for name in dates),
            *(number(row[name], units[name]) for name in names),
        ]
        for _, row in table.iterrows()
    ]


@contextmanager
def sweep_progress(quiet: bool) -> Iterator[Callable[[Progress], None] | None]:
    """A bar with share, rate, time left and best value; nothing without a terminal or under NO_COLOR."""
    if quiet or not sys.stderr.isatty() or os.environ.get("NO_COLOR"):
        yield None
        return
    from rich.progress import BarColumn, Progress, TaskProgressColumn, TextColumn, TimeRemainingColumn

    columns = (BarColumn(), TaskProgressColumn(), TextColumn("{task.description}"), TimeRemainingColumn())
    with Progress(*columns, console=Console(stderr=True), transient=True) as bar:
        task = bar.add_task("sweeping")

        def report(progress: Any) -> None:
            speed = bar.tasks[task].finished_speed or bar.tasks[task].speed or math.nan
            rate = "" if speed != speed else f"{speed / 1e6:.1f} million cells/s"
            best = "" if progress.best is None else f"best {progress.best:.4g}"
            text = "  ".join(part for part in (rate, best) if part) or "sweeping"
            bar.update(task, completed=progress.cells_done, total=progress.cells, description=text)

        yield report


def _is_number(text: str) -> bool:
    try:
        float(text.replace("−", "-").replace("–", "0").replace(",", ""))
    except ValueError:
        return False
    return True


def _without_nan(value: Any) -> Any:
    if isinstance(value, dict):
        return {key: _without_nan(each) for key, each in value.items()}
    if isinstance(value, list | tuple):
        return [_without_nan(each) for each in value]
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value

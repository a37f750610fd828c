"""What commands print: tables and JSON on standard output, progress and messages on standard error."""

from __future__ import annotations

import json
import math
import os
import sys
import time
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import asdict
from typing import TYPE_CHECKING, Any

from rich import box
from rich.console import Console
from rich.table import Table

from porkgrid.showing import number

if TYPE_CHECKING:
    import pandas as pd

    from porkgrid.survey.progress import Progress

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


def candidate_rows(
    table: pd.DataFrame, units: dict[str, str], dates: Sequence[str], names: Sequence[str]
) -> list[list[str]]:
    """Rank, dates and the named measures of each candidate."""
    return [
        [
            str(row["rank"]),
            *(str(row[name]) for name in dates),
            *(number(row[name], units[name]) for name in names),
        ]
        for _, row in table.iterrows()
    ]


@contextmanager
def sweep_progress(as_json: bool) -> Iterator[Callable[[Progress], None] | None]:
    """Tell the progress of a sweep on standard error while the context lasts.

    With `as_json` a JSON document a line, once a second; else a bar with share, rate, time left and the best
    value, and nothing without a terminal or under NO_COLOR.
    """
    if as_json:
        yield _progress_lines()
    elif not sys.stderr.isatty() or os.environ.get("NO_COLOR"):
        yield None
    else:
        with _progress_bar() as report:
            yield report


def _progress_lines() -> Callable[[Progress], None]:
    last = -math.inf

    def report(progress: Progress) -> None:
        nonlocal last
        done = progress.cells_done == progress.cells
        if time.monotonic() - last > 1.0 or done:
            last = time.monotonic()
            facts = asdict(progress) | {"share": progress.cells_done / progress.cells}
            print(json.dumps(facts), file=sys.stderr, flush=True)

    return report


@contextmanager
def _progress_bar() -> Iterator[Callable[[Progress], None]]:
    from rich.progress import BarColumn, TaskProgressColumn, TextColumn
    from rich.progress import Progress as Bar

    columns = (BarColumn(), TaskProgressColumn(), TextColumn("{task.description}"))
    with Bar(*columns, console=Console(stderr=True), transient=True) as bar:
        task = bar.add_task("sweeping")

        def report(progress: Progress) -> None:
            parts = [f"{progress.cells_per_second / 1e6:.1f} million cells/s"]
            parts += [f"{_clock(progress.seconds_left)} left"]
            parts += [] if progress.best is None else [f"best {progress.best:.4g}"]
            text = "  ".join(parts)
            bar.update(task, completed=progress.cells_done, total=progress.cells, description=text)

        yield report


def _clock(seconds: float) -> str:
    minutes, rest = divmod(round(seconds), 60)
    hours, minutes = divmod(minutes, 60)
    return f"{hours}:{minutes:02d}:{rest:02d}" if hours else f"{minutes}:{rest:02d}"


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

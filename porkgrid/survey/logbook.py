"""What a sweep tells: a log in the survey folder for the morning after; warnings go to the terminal too."""

from __future__ import annotations

import logging
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

LOG = "sweep.log"
log = logging.getLogger("porkgrid.sweep")


@contextmanager
def logged(folder: Path) -> Iterator[None]:
    """Write what is logged to the folder's log as well, with the time of day (UTC offset included)."""
    book = logging.FileHandler(folder / LOG, encoding="utf-8", errors="surrogateescape")
    book.setFormatter(logging.Formatter("%(asctime)s %(levelname)s %(message)s", "%Y-%m-%dT%H:%M:%S%z"))
    book.handleError = lambda record: None  # type: ignore[method-assign]  # a full disk stops no sweep
    terminal = logging.StreamHandler()
    terminal.setFormatter(logging.Formatter("porkgrid: %(message)s"))
    terminal.setLevel(logging.WARNING)
    level = log.level
    log.setLevel(logging.INFO)
    for handler in (book, terminal):
        log.addHandler(handler)
    try:
        yield
    finally:
        for handler in (book, terminal):
            log.removeHandler(handler)
        log.setLevel(level)
        with suppress(OSError):  # closing writes what a full disk has not taken
            book.close()

"""How far a sweep has come, and at what pace."""

from __future__ import annotations

import time
from dataclasses import dataclass

from porkgrid.survey.logbook import log
from porkgrid.survey.plan import Plan
from porkgrid.survey.tiles import TileSums

NOTE_SECONDS = 60.0  # between two lines of the log


@dataclass(frozen=True)
class Progress:
    """How far a sweep has come."""

    tiles_done: int
    tiles: int
    cells_done: int
    cells: int
    best: float | None  # of the rank measure, so far
    cells_per_second: float  # of this run
    seconds_left: float

    @property
    def line(self) -> str:
        """In words, for the log."""
        best = "" if self.best is None else f", best {self.best:.6g}"
        return (
            f"{100.0 * self.cells_done / self.cells:.1f} % done, {self.cells_per_second / 1e6:.2f} million "
            f"cells/s, {self.seconds_left:.0f} s left{best}"
        )


class Pace:
    """Measures the pace of a run from its start, and notes it in the log now and then."""

    def __init__(self, plan: Plan, begun_with: TileSums) -> None:
        self._plan = plan
        self._cells_at_start = begun_with.cells
        self._started = self._noted = time.monotonic()

    def progress(self, tiles_done: int, so_far: TileSums) -> Progress:
        """The progress with so many tiles done, whose sums are `so_far`."""
        now, cells = time.monotonic(), self._plan.shape[0] * self._plan.shape[1]
        rate = (so_far.cells - self._cells_at_start) / max(now - self._started, 1e-9)
        left = (cells - so_far.cells) / max(rate, 1e-9)
        progress = Progress(tiles_done, len(self._plan.tiles), so_far.cells, cells, so_far.best, rate, left)
        if now - self._noted > NOTE_SECONDS:
            self._noted = now
            log.info(progress.line)
        return progress

"""Surveys as the page takes them: finished ones, and what is there of those that are half swept."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

import numpy as np
import pandas as pd

from porkgrid.errors import RequestError
from porkgrid.page.thin import swept_part
from porkgrid.survey.candidates import picked_at, tabulate
from porkgrid.survey.folder import COMPLETE, RUNNING, read_provenance
from porkgrid.survey.ledger import read_ledger
from porkgrid.survey.measures import BOTH, BY_DEPARTURE
from porkgrid.survey.plan import Tile
from porkgrid.survey.rank import distinct, local_bests
from porkgrid.survey.store import BLOCKED_BY, NEVER_SWEPT
from porkgrid.survey.surveys import Survey

_NO_TOPIC = ("_epoch_jd_tdb", "_branch", "_revs")  # every survey has them; none is what one compares by


@dataclass(frozen=True, eq=False)
class Opened:
    """A survey and the tiles of it that are not on disk; none of a finished one."""

    survey: Survey
    missing: tuple[Tile, ...]

    @property
    def missing_share(self) -> float:
        """The share of the grid's cells that has not been swept, 0 to 1."""
        rows, columns = self.survey.plan.shape
        return sum(tile.cells for tile in self.missing) / (rows * columns)

    @cached_property
    def swept(self) -> tuple[Tile, ...]:
        """The tiles that are on disk."""
        gone = {tile.number for tile in self.missing}
        return tuple(tile for tile in self.survey.plan.tiles if tile.number not in gone)

    @cached_property
    def candidates(self) -> pd.DataFrame:
        """The survey's table of candidates; of one half swept, ranked now from what is there."""
        if self.survey.provenance["state"] == COMPLETE:
            return self.survey.candidates
        return _ranked_so_far(self)


def open_for_page(paths: Sequence[Path]) -> list[Opened]:
    """Open surveys for a page. RequestError where one is none, holds nothing yet, or no measure is shared."""
    opened = [_open(path) for path in paths]
    twice = [str(path) for number, path in enumerate(paths) if path.resolve() in _resolved(paths[:number])]
    if twice:
        raise RequestError(*(f"{path}: given twice; a page shows each survey once" for path in twice))
    if len(opened) > 1:
        _must_share(opened)
    return opened


def _resolved(paths: Sequence[Path]) -> set[Path]:
    return {path.resolve() for path in paths}


def _open(path: Path) -> Opened:
    provenance = read_provenance(path)
    if provenance["state"] not in (COMPLETE, RUNNING):
        raise RequestError(
            f"{path}: the sweep has only begun and nothing is stored yet; `porkgrid sweep` with the same "
            "scenario goes on"
        )
    survey = Survey(path, provenance)
    if provenance["state"] == COMPLETE:
        return Opened(survey, ())
    done = read_ledger(path)
    if not done:
        raise RequestError(
            f"{path}: no tile of the sweep is finished yet; `porkgrid sweep` with the same scenario goes on"
        )
    return Opened(survey, tuple(tile for tile in survey.plan.tiles if tile.number not in done))


def _ranked_so_far(opened: Opened) -> pd.DataFrame:
    """Candidates of the tiles that are there, by the same rule as a finished sweep's."""
    survey, plan, rank = opened.survey, opened.survey.plan, opened.survey.scenario.rank
    departures, arrivals = plan.shape
    by, blocked_by = survey.grid[plan.rank_by], survey.grid[BLOCKED_BY]
    across = slice(0, arrivals, 1)

    def read(band: slice) -> tuple[np.ndarray, np.ndarray]:
        rows = slice(band.start, band.stop, 1)
        blocked = swept_part(blocked_by, opened.swept, rows, across, NEVER_SWEPT)
        if by.dims == BOTH:
            return swept_part(by, opened.swept, rows, across, np.nan), blocked
        one_date = by.values[rows, None] if by.dims == BY_DEPARTURE else by.values
        return np.broadcast_to(one_date, blocked.shape), blocked

    i, j, _ = local_bests(read, departures, plan.rank_sign)
    if not i.size:
        return tabulate(plan, [])
    picked = picked_at(survey.grid, plan, i, j)
    epochs = np.array([one.epochs for one in picked])
    return tabulate(plan, [picked[row] for row in distinct(epochs, rank.apart_days, rank.keep)])


def _must_share(opened: Sequence[Opened]) -> None:
    """Refuse surveys that have no measure in common that could be looked at in all of them."""
    topics = [{name for name in each.survey.plan.stored if not name.endswith(_NO_TOPIC)} for each in opened]
    if not set.intersection(*topics):
        raise RequestError(
            "these surveys share no measure, so a page has nothing to show of them side by side: "
            + "; ".join(
                f"{each.survey.path} stores {', '.join(sorted(names))}"
                for each, names in zip(opened, topics, strict=True)
            )
            + "; make a page of each, or sweep them with common `measures`"
        )

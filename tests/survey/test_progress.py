"""How far a sweep has come and how fast, on a clock that the test sets."""

from __future__ import annotations

import logging
import time

import pytest

from porkgrid.survey.ledger import totals
from porkgrid.survey.progress import NOTE_SECONDS, Pace, Progress
from porkgrid.survey.tiles import TileSums

CELLS = 43 * 59  # of ROOK


@pytest.fixture
def clock(monkeypatch):
    """A clock that stands still until it is set."""
    now = [1000.0]
    monkeypatch.setattr(time, "monotonic", lambda: now[0])
    return now


def so_far(cells, best=None):
    return TileSums(-1, cells, 0, {}, {}, best)


NOTHING = totals([], 1.0)


def test_the_pace_is_cells_by_seconds_and_the_rest_takes_as_long_at_that_pace(rook, clock):
    pace = Pace(rook, NOTHING)
    clock[0] += 8.0
    progress = pace.progress(3, so_far(1000, best=5.5))
    assert progress.cells_per_second == pytest.approx(125.0)
    assert progress.seconds_left == pytest.approx((CELLS - 1000) / 125.0)
    assert (progress.cells_done, progress.cells, progress.tiles_done) == (1000, CELLS, 3)
    assert (progress.tiles, progress.best) == (len(rook.tiles), 5.5)


def test_cells_of_an_earlier_run_do_not_count_for_the_pace(rook, clock):
    pace = Pace(rook, so_far(2000))
    clock[0] += 4.0
    progress = pace.progress(9, so_far(2100))
    assert progress.cells_per_second == pytest.approx(25.0)
    assert progress.seconds_left == pytest.approx((CELLS - 2100) / 25.0)
    assert progress.cells_done == 2100


def test_at_the_end_nothing_is_left(rook, clock):
    pace = Pace(rook, NOTHING)
    clock[0] += 1.0
    assert pace.progress(12, so_far(CELLS)).seconds_left == 0.0


def test_a_tile_done_in_no_time_at_all_is_no_division_by_zero(rook, clock):
    progress = Pace(rook, NOTHING).progress(1, so_far(100))
    assert progress.cells_per_second > 0.0
    assert 0.0 <= progress.seconds_left < 1.0


def test_the_log_is_told_once_a_while_and_not_of_every_tile(rook, clock, caplog):
    caplog.set_level(logging.INFO, "porkgrid.sweep")
    pace = Pace(rook, NOTHING)
    noted = []
    for _ in range(30):
        clock[0] += NOTE_SECONDS / 10.0
        pace.progress(1, so_far(500, best=4.25))
        noted.append(len(caplog.messages))
    assert noted[9] == 0
    assert noted[10] == noted[20] == 1
    assert noted[21] == 2
    assert "19.7 % done" in caplog.messages[0]
    assert "best 4.25" in caplog.messages[0]


def test_the_line_has_share_pace_time_left_and_best():
    progress = Progress(3, 12, 250_000, 1_000_000, 4.812345678, 1_250_000.0, 600.0)
    assert progress.line == "25.0 % done, 1.25 million cells/s, 600 s left, best 4.81235"
    unlucky = Progress(3, 12, 250_000, 1_000_000, None, 1_250_000.0, 600.0)
    assert unlucky.line == "25.0 % done, 1.25 million cells/s, 600 s left"

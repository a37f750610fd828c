"""Tiles on threads: all of them once, few in flight, and those in hand finished whatever happens."""

from __future__ import annotations

import threading
import time

import pytest

from porkgrid.survey.plan import Tile
from porkgrid.survey.pool import in_threads
from porkgrid.survey.tiles import TileSums

TILES = [Tile(number, slice(number, number + 1), slice(0, 4)) for number in range(20)]


def sums(tile):
    return TileSums(tile.number, tile.cells, 0, {}, {}, None)


class Work:
    """What was begun and what was done, and how many at a time."""

    def __init__(self, fails=None, seconds=0.001):
        self.begun, self.done, self.most = [], [], 0
        self._fails, self._seconds, self._lock = fails, seconds, threading.Lock()

    def __call__(self, tile):
        with self._lock:
            self.begun.append(tile.number)
            self.most = max(self.most, len(self.begun) - len(self.done))
        time.sleep(self._seconds)
        if tile.number == self._fails:
            raise OSError(28, "No space left on device")
        with self._lock:
            self.done.append(tile.number)
        return sums(tile)


@pytest.mark.parametrize("workers", [1, 2, 7, 50])
def test_every_tile_is_done_once_and_no_more_at_a_time_than_there_are_workers(workers):
    work = Work()
    found = list(in_threads(work, TILES, workers))
    assert sorted(each.tile for each in found) == list(range(20))
    assert sorted(work.begun) == list(range(20))
    assert work.most <= workers


def test_several_workers_work_at_the_same_time():
    meeting = threading.Barrier(3, timeout=20)

    def work(tile):
        meeting.wait()
        return sums(tile)

    assert len(list(in_threads(work, TILES[:6], 3))) == 6


def test_no_tiles_are_no_work():
    assert list(in_threads(Work(), [], 3)) == []


def test_a_tile_is_yielded_while_others_are_still_at_work():
    go = threading.Event()

    def work(tile):
        if tile.number == 1:
            assert go.wait(20)
        return sums(tile)

    done = in_threads(work, TILES[:2], 2)
    assert next(done).tile == 0
    go.set()
    assert next(done).tile == 1


@pytest.mark.parametrize("workers", [1, 3])
def test_an_interrupt_finishes_what_is_in_hand_and_begins_little_else(workers):
    work = Work(seconds=0.01)
    done = in_threads(work, TILES, workers)
    next(done)
    with pytest.raises(KeyboardInterrupt):
        done.throw(KeyboardInterrupt)
    assert sorted(work.begun) == sorted(work.done)
    assert 1 <= len(work.done) <= 2 * workers + 2
    time.sleep(0.05)
    assert sorted(work.begun) == sorted(work.done)  # nothing goes on behind our back


@pytest.mark.parametrize("workers", [1, 3])
def test_what_fails_in_a_tile_comes_out_and_the_others_in_hand_are_finished(workers):
    work = Work(fails=4)
    with pytest.raises(OSError, match="No space left"):
        list(in_threads(work, TILES, workers))
    assert sorted([*work.done, 4]) == sorted(work.begun)
    assert len(work.done) < 20

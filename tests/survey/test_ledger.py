"""The ledger of finished tiles, whole, torn and blotted."""

import json
import os
import threading

import pytest
from hypothesis import given
from hypothesis import strategies as st

from porkgrid.survey import ledger as ledgers
from porkgrid.survey.ledger import LEDGER, Ledger, added, read_ledger, tiles_in_doubt, totals
from porkgrid.survey.tiles import TileSums


def sums(tile, best=3.5, allowed=5):
    return TileSums(tile, 128, allowed, {"c3_km2_s2": 120}, {"c3_km2_s2": 100}, best, (210, 64))


def write(folder, *entries):
    with Ledger(folder) as ledger:
        for each in entries:
            ledger.enter(each)


def test_a_folder_without_a_ledger_has_no_finished_tiles(tmp_path):
    assert read_ledger(tmp_path) == {}


def test_entries_come_back_as_they_were_entered(tmp_path):
    write(tmp_path, sums(0), sums(7, best=None))
    write(tmp_path, sums(3))
    assert read_ledger(tmp_path) == {0: sums(0), 7: sums(7, best=None), 3: sums(3)}


def test_an_entry_is_in_the_file_before_the_ledger_is_closed(tmp_path):
    with Ledger(tmp_path) as ledger:
        ledger.enter(sums(0))
        assert read_ledger(tmp_path) == {0: sums(0)}


def test_entries_of_many_threads_are_all_whole(tmp_path):
    with Ledger(tmp_path) as ledger:

        def enter(first):
            for number in range(first, first + 50):
                ledger.enter(sums(number))

        threads = [threading.Thread(target=enter, args=(first,)) for first in range(0, 200, 50)]
        for thread in threads:
            thread.start()
        for thread in threads:
            thread.join()
    assert read_ledger(tmp_path) == {number: sums(number) for number in range(200)}


# Marks of what the disk has been asked to keep


@pytest.fixture
def always_kept(monkeypatch):
    """The disk is asked at every tile; what is in the ledger each time."""
    asked = []
    monkeypatch.setattr(ledgers, "KEEP_SECONDS", -1.0)
    monkeypatch.setattr(os, "sync", lambda: asked.append(None))
    return asked


def test_without_a_mark_every_tile_is_in_doubt_in_the_order_of_entry(tmp_path):
    write(tmp_path, sums(2), sums(0), sums(1))
    assert tiles_in_doubt(tmp_path) == [2, 0, 1]


def test_no_tile_is_in_doubt_once_the_disk_has_been_asked_to_keep_it(tmp_path, always_kept):
    write(tmp_path, sums(2))
    write(tmp_path, sums(0))
    assert len(always_kept) == 2
    assert tiles_in_doubt(tmp_path) == []
    assert read_ledger(tmp_path) == {2: sums(2), 0: sums(0)}


def test_a_mark_is_written_after_the_disk_has_been_asked_and_for_the_tiles_of_before(tmp_path, monkeypatch):
    """While the disk is busy keeping, another tile is entered: the mark must not vouch for that."""
    monkeypatch.setattr(ledgers, "KEEP_SECONDS", -1.0)
    begun, entered, marks_while_asking = threading.Event(), threading.Event(), []

    def sync():
        begun.set()
        assert entered.wait(10)
        marks_while_asking.append(b"kept" in (tmp_path / LEDGER).read_bytes())

    monkeypatch.setattr(os, "sync", sync)
    with Ledger(tmp_path) as ledger:
        ledger.enter(sums(0))
        assert begun.wait(10)
        ledger.enter(sums(1))
        entered.set()
    assert marks_while_asking == [False]
    assert tiles_in_doubt(tmp_path) == [1]


def test_the_disk_is_not_asked_more_often_than_now_and_then(tmp_path, monkeypatch):
    asked = []
    monkeypatch.setattr(os, "sync", lambda: asked.append(None))
    write(tmp_path, *map(sums, range(50)))
    assert asked == []


def test_a_mark_counts_the_tiles_of_earlier_runs(tmp_path, always_kept, monkeypatch):
    write(tmp_path, sums(0))
    write(tmp_path, sums(1))
    monkeypatch.setattr(ledgers, "KEEP_SECONDS", 1e9)
    write(tmp_path, sums(2))
    assert tiles_in_doubt(tmp_path) == [2]


def test_a_mark_that_does_not_fit_on_the_disk_is_no_fault(tmp_path, always_kept, monkeypatch, capsys):
    append = Ledger._append

    def full(self, line):
        if "kept" in line:
            raise OSError(28, "No space left on device")
        append(self, line)

    monkeypatch.setattr(Ledger, "_append", full)
    write(tmp_path, sums(0))
    assert tiles_in_doubt(tmp_path) == [0]
    assert capsys.readouterr().err == ""


# Lines torn and blotted


def test_a_last_line_torn_at_any_byte_does_not_count_and_is_cut_off(tmp_path):
    write(tmp_path, sums(0), sums(1))
    whole = (tmp_path / LEDGER).read_bytes()
    first = whole.index(b"\n") + 1
    for length in range(first, len(whole)):
        (tmp_path / LEDGER).write_bytes(whole[:length])
        assert read_ledger(tmp_path) == {0: sums(0)}
        write(tmp_path, sums(1))
        assert (tmp_path / LEDGER).read_bytes() == whole


def test_a_first_line_that_is_torn_leaves_nothing(tmp_path):
    (tmp_path / LEDGER).write_bytes(b'{"tile": 0, "cel')
    assert read_ledger(tmp_path) == {}
    write(tmp_path, sums(4))
    assert read_ledger(tmp_path) == {4: sums(4)}


ALL = {"tile": 9, "cells": 1, "allowed": 1, "forbidden": {}, "alone": {}, "best": None, "sizes": [1]}
BLOTS = [b"\0" * 40, b"\xff\xfe", b"{}", b"[1, 2]", b'{"tile": 9}', b"", b'{"kept": "all"}'] + [
    json.dumps(ALL | change).encode()
    for change in (
        {"tile": "9"}, {"tile": None}, {"tile": -1}, {"sizes": 5}, {"sizes": ["1"]}, {"cells": "1"},
        {"allowed": None}, {"best": "low"}, {"forbidden": []}, {"alone": {"c3_km2_s2": None}}, {"more": 1},
    )
]  # fmt: skip


@pytest.mark.parametrize("blot", BLOTS)
def test_a_line_that_cannot_be_read_counts_as_a_tile_not_done(tmp_path, blot):
    write(tmp_path, sums(0))
    with (tmp_path / LEDGER).open("ab") as file:
        file.write(blot + b"\n")
    write(tmp_path, sums(2))
    assert read_ledger(tmp_path) == {0: sums(0), 2: sums(2)}
    assert tiles_in_doubt(tmp_path) == [0, 2]


def test_of_a_tile_that_was_entered_again_the_last_entry_counts(tmp_path):
    write(tmp_path, sums(0), sums(1), sums(0, best=2.0))
    assert read_ledger(tmp_path) == {0: sums(0, best=2.0), 1: sums(1)}


# Totals


BEST = st.one_of(st.none(), st.integers(-50, 50).map(float))


@given(st.lists(st.tuples(st.integers(0, 99), BEST), max_size=8), st.sampled_from([1.0, -1.0]))
def test_totals_add_counts_and_keep_the_better_best(parts, sign):
    entries = [sums(number, best=best, allowed=allowed) for number, (allowed, best) in enumerate(parts)]
    found = totals(entries, sign)
    bests = [best for _, best in parts if best is not None]
    assert found.cells == 128 * len(parts)
    assert found.allowed == sum(allowed for allowed, _ in parts)
    assert found.forbidden == ({"c3_km2_s2": 120 * len(parts)} if parts else {})
    assert found.alone == ({"c3_km2_s2": 100 * len(parts)} if parts else {})
    assert found.best == (sign * min(sign * best for best in bests) if bests else None)


def test_totals_can_be_added_up_tile_by_tile():
    entries = [sums(0, best=4.0), sums(1, best=None), sums(2, best=3.0)]
    so_far = totals([], 1.0)
    for each in entries:
        so_far = added(so_far, each, 1.0)
    assert so_far == totals(entries, 1.0)

"""The ledger of finished tiles, whole, torn and blotted."""

import os

import pytest
from hypothesis import given
from hypothesis import strategies as st

from porkgrid.survey.ledger import LEDGER, enter, open_ledger, read_ledger, totals
from porkgrid.survey.tiles import TileSums


def sums(tile, best=3.5, **counts):
    return TileSums(tile, 128, counts.get("allowed", 5), {"c3_km2_s2": 120}, {"c3_km2_s2": 100}, best)


def write(folder, *entries):
    with open_ledger(folder) as ledger:
        for each in entries:
            enter(ledger, each)


def test_a_folder_without_a_ledger_has_no_finished_tiles(tmp_path):
    assert read_ledger(tmp_path) == {}


def test_entries_come_back_as_they_were_entered(tmp_path):
    write(tmp_path, sums(0), sums(7, best=None))
    write(tmp_path, sums(3))
    assert read_ledger(tmp_path) == {0: sums(0), 7: sums(7, best=None), 3: sums(3)}


def test_an_entry_is_in_the_file_before_the_ledger_is_closed(tmp_path):
    with open_ledger(tmp_path) as ledger:
        enter(ledger, sums(0))
        assert read_ledger(tmp_path) == {0: sums(0)}


def test_an_entry_has_been_sent_to_the_disk_when_it_counts(tmp_path, monkeypatch):
    on_disk = []
    monkeypatch.setattr(os, "fsync", lambda _: on_disk.append((tmp_path / LEDGER).read_bytes()))
    write(tmp_path, sums(0), sums(1))
    whole = (tmp_path / LEDGER).read_bytes()
    assert on_disk == [whole[: whole.index(b"\n") + 1], whole]


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


@pytest.mark.parametrize("blot", [b"\0" * 40, b"\xff\xfe", b"{}", b"[1, 2]", b'{"tile": 9}', b""])
def test_a_line_that_cannot_be_read_counts_as_a_tile_not_done(tmp_path, blot):
    write(tmp_path, sums(0))
    with (tmp_path / LEDGER).open("ab") as file:
        file.write(blot + b"\n")
    write(tmp_path, sums(2))
    assert read_ledger(tmp_path) == {0: sums(0), 2: sums(2)}


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

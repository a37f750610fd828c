"""Which tiles are found damaged: all that are, and none that are not."""

from __future__ import annotations

import shutil
from dataclasses import replace

import pytest

from porkgrid.survey import verify
from porkgrid.survey.ledger import LEDGER, Ledger, read_ledger, tiles_in_doubt
from porkgrid.survey.store import STORE, chunk_of, create_store, tiled, write_tile
from porkgrid.survey.tiles import compute_tile
from porkgrid.survey.verify import damaged_tiles


@pytest.fixture(scope="module")
def plan(rook):
    """ROOK in 12 tiles."""
    return replace(rook, tile_cells=256, tile_columns=32)


@pytest.fixture(scope="module")
def sound(plan, tmp_path_factory):
    """The first ten tiles written and entered. Not to be written to."""
    folder = tmp_path_factory.mktemp("sound")
    create_store(folder, plan, "0")
    with Ledger(folder) as ledger:
        for tile in plan.tiles[:10]:
            values, sums = compute_tile(plan, tile)
            ledger.enter(replace(sums, sizes=tuple(write_tile(folder, plan, tile, values))))
    return folder


@pytest.fixture
def folder(sound, tmp_path):
    shutil.copytree(sound, tmp_path, dirs_exist_ok=True)
    return tmp_path


def damaged(folder, plan):
    return damaged_tiles(folder, plan, read_ledger(folder))


def chunk(folder, plan, number, name="c3_km2_s2"):
    row, column = chunk_of(plan, plan.tiles[number])
    return folder / STORE / name / "c" / str(row) / str(column)


def change_a_byte(path):
    content = bytearray(path.read_bytes())
    content[len(content) // 2] ^= 0x10
    path.write_bytes(content)


def vouch_for_all(folder):
    """The disk has been asked to keep all ten tiles."""
    with (folder / LEDGER).open("ab") as file:
        file.write(b'{"kept": 10}\n')
    assert tiles_in_doubt(folder) == []


def test_what_is_as_it_was_written_is_not_damaged(sound, plan):
    assert len(read_ledger(sound)) == 10
    assert damaged(sound, plan) == []


def test_damage_to_any_array_of_a_tile_is_damage_to_the_tile(folder, plan):
    for number, name in enumerate(tiled(plan)):
        path = chunk(folder, plan, number % 10, name)
        whole = path.read_bytes()
        change_a_byte(path)
        assert damaged(folder, plan) == [number % 10], name
        path.write_bytes(whole)
    assert damaged(folder, plan) == []


@pytest.mark.parametrize("vouched", [False, True])
@pytest.mark.parametrize("harm", ["missing", "empty", "cut short", "longer"])
def test_a_chunk_of_another_size_is_found_however_old_it_is(folder, plan, monkeypatch, harm, vouched):
    if vouched:
        monkeypatch.setattr(verify, "READ_BYTES", 0)
        vouch_for_all(folder)
    for number in (0, 9):
        path = chunk(folder, plan, number)
        content = path.read_bytes()
        if harm == "missing":
            path.unlink()
        else:
            harmed = {"empty": b"", "cut short": content[:-1], "longer": content + b"\0"}
            path.write_bytes(harmed[harm])
    assert damaged(folder, plan) == [0, 9]


def test_a_tile_in_doubt_is_read_even_where_there_is_no_time_to_read_any(folder, plan, monkeypatch):
    monkeypatch.setattr(verify, "READ_BYTES", 0)
    change_a_byte(chunk(folder, plan, 0))
    assert damaged(folder, plan) == [0]


def test_of_tiles_that_the_disk_has_kept_the_newest_are_read_as_far_as_time_allows(folder, plan, monkeypatch):
    vouch_for_all(folder)
    entries = read_ledger(folder)
    for number in range(10):
        change_a_byte(chunk(folder, plan, number))
    taken = sum(sum(entries[number].sizes) for number in (7, 8, 9))
    taken += 3 * len(tiled(plan)) * verify._OPENING_BYTES
    monkeypatch.setattr(verify, "READ_BYTES", taken)
    assert damaged(folder, plan) == [7, 8, 9]
    monkeypatch.setattr(verify, "READ_BYTES", 10**9)
    assert damaged(folder, plan) == list(range(10))


def test_the_whole_store_gone_is_every_tile_damaged(folder, plan):
    shutil.rmtree(folder / STORE)
    assert damaged(folder, plan) == list(range(10))


def test_a_number_that_is_no_tile_of_the_plan_is_no_matter(folder, plan):
    entries = read_ledger(folder)
    entries[99] = replace(entries[0], tile=99)
    assert damaged_tiles(folder, plan, entries) == []


def test_a_tile_entered_with_other_arrays_than_the_plan_has_is_damaged(folder, plan):
    entries = read_ledger(folder)
    entries[3] = replace(entries[3], sizes=entries[3].sizes[:-1])
    assert damaged_tiles(folder, plan, entries) == [3]

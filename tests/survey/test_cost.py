"""What a sweep is said to cost, against what it takes."""

import os
import time

import pytest
from survey_scenarios import LOOPS, ROOK, changed

from porkgrid.survey.cost import predict


def disk_bytes(folder):
    return sum(path.stat().st_size for path in folder.rglob("*") if path.is_file())


def test_cells_and_solves_are_counted(rook, loops):
    cost = predict(rook)
    assert (cost.cells, cost.lambert_solves, cost.tiles) == (43 * 59, 43 * 59, 1)
    n, m = loops.shape
    assert predict(loops).lambert_solves == 3 * n * m  # no revolution, and both branches of one


def test_there_are_no_more_workers_than_cores_or_tiles(rook, small_tiles, plan_of):
    plan = plan_of(ROOK)
    assert predict(plan).tiles == 12
    assert predict(plan).workers == min(os.cpu_count(), 12)
    assert predict(plan, workers=7).workers == 7
    assert predict(plan, workers=50).workers == 12


def test_the_disk_is_that_which_the_store_takes(rook, survey, small_tiles):
    assert predict(rook).disk_bytes == pytest.approx(disk_bytes(survey.path / "grid.zarr"), rel=0.3)


def test_fewer_measures_take_less_of_everything_on_disk(plan_of, rook):
    lean = plan_of('measures = ["c3_km2_s2"]\n' + ROOK)
    assert predict(lean).disk_bytes < 0.5 * predict(rook).disk_bytes
    assert predict(lean).memory_bytes < predict(rook).memory_bytes


def test_time_grows_with_the_grid_and_falls_with_workers(plan_of):
    """16 times the cells; a tile is timed once, so only the orders of size are sure."""
    fine = changed(LOOPS, ("18.0", "0.5"), ("23.0", "0.5"))
    finer = changed(LOOPS, ("18.0", "0.125"), ("23.0", "0.125"))
    small, large = predict(plan_of(fine), workers=1), predict(plan_of(finer), workers=1)
    assert 14.0 < large.cells / small.cells < 18.0
    assert 5.0 < large.seconds / small.seconds < 50.0
    assert large.memory_bytes == small.memory_bytes  # tile by tile
    assert predict(plan_of(finer), workers=2).seconds < 0.8 * large.seconds


def test_the_time_is_that_which_the_tiles_take(plan_of, sweep_text):
    text = changed(LOOPS, ("18.0", "1.0"), ("23.0", "1.0"))
    cost = predict(plan_of(text), workers=1)
    started = time.perf_counter()
    sweep_text(text)
    assert 0.2 < cost.seconds / (time.perf_counter() - started) < 2.0

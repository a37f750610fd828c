"""What a sweep is said to cost, against what it takes."""

import os
import time
from itertools import count

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


def test_time_is_that_of_a_tile_for_all_cells_shared_among_workers(plan_of, monkeypatch):
    ticks = count()
    monkeypatch.setattr(time, "perf_counter", lambda: float(next(ticks)))  # whatever is timed takes a second
    plan = plan_of(changed(LOOPS, ("18.0", "0.5"), ("23.0", "0.5")))
    n, m = plan.shape
    tile = plan.tiles[len(plan.tiles) // 2]
    assert predict(plan, workers=1).seconds == pytest.approx(n * m / tile.cells)
    assert predict(plan, workers=3).seconds == pytest.approx(n * m / tile.cells / 3.0)


def test_memory_does_not_grow_with_the_grid(plan_of):
    fine, finer = (plan_of(changed(LOOPS, ("18.0", step), ("23.0", "0.5"))) for step in ("0.5", "0.25"))
    assert predict(fine, workers=2).memory_bytes == predict(finer, workers=2).memory_bytes
    assert predict(fine, workers=2).memory_bytes > predict(fine, workers=1).memory_bytes


@pytest.mark.slow
def test_the_time_is_that_which_the_tiles_take(plan_of, sweep_text):
    text = changed(LOOPS, ("18.0", "1.0"), ("23.0", "1.0"))
    cost = predict(plan_of(text), workers=1)
    started = time.perf_counter()
    sweep_text(text)
    assert 0.2 < cost.seconds / (time.perf_counter() - started) < 2.0

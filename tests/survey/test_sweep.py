"""A sweep in this process: what it leaves, whatever the workers, and what it does when something breaks."""

import errno
import json
from os import strerror

import numpy as np
import pytest
import xarray as xr
from survey_scenarios import LEAN, LOOPS, ROOK, changed, limited, shrink_tiles

from porkgrid import RunError
from porkgrid.survey import store as chunks_written
from porkgrid.survey import sweep as engine
from porkgrid.survey.ledger import Ledger, read_ledger
from porkgrid.survey.surveys import open_survey
from porkgrid.survey.sweep import sweep

pytestmark = pytest.mark.usefixtures("small_tiles")


@pytest.fixture(scope="module")
def scenario(scenario_of):
    return scenario_of(LEAN)


@pytest.fixture(scope="module")
def whole(scenario, tmp_path_factory):
    """LEAN in small tiles, swept at one go by two workers."""
    with pytest.MonkeyPatch.context() as patch:
        shrink_tiles(patch)
        return sweep(scenario, tmp_path_factory.mktemp("once") / "survey", workers=2)


def chunks(folder):
    """Every file of the grid by its place, as bytes."""
    grid = folder / "grid.zarr"
    return {path.relative_to(grid): path.read_bytes() for path in grid.rglob("*") if path.is_file()}


def assert_same_survey(one, other):
    assert chunks(one) == chunks(other)
    assert (one / "candidates.csv").read_bytes() == (other / "candidates.csv").read_bytes()
    assert read_ledger(one) == read_ledger(other)


def test_a_sweep_leaves_the_folder_of_the_design(survey):
    names = {path.name for path in survey.path.iterdir()}
    assert names == {
        "scenario.toml", "survey.json", "grid.zarr", "candidates.csv", "figures", "tiles.jsonl",
        "refined.csv", "sweep.log", "sweep.lock",
    }  # fmt: skip
    assert (survey.path / "scenario.toml").read_text() == ROOK


def test_provenance_says_what_was_done_with_what(survey):
    facts = json.loads((survey.path / "survey.json").read_text())
    assert facts["state"] == "complete"
    assert facts["route"] == "Earth → Mars"
    assert facts["grid"] == {"departure_dates": 43, "arrival_dates": 59}
    assert facts["cells"] == facts["lambert_solves"] == 43 * 59
    assert facts["versions"].keys() >= {"porkgrid", "python", "numpy", "numba", "jplephem"}
    (kernel,) = facts["kernels"]
    assert kernel["name"] == "DE440"
    assert len(kernel["sha256"]) == 64
    assert facts["bodies"] == {"earth": "kernel", "mars": "kernel"}
    assert facts["seconds"] > 0.0
    assert "not for flight operations" in facts["caution"]


def test_provenance_counts_what_each_flag_forbids(survey):
    blocked = survey.grid["blocked_by"]
    facts = survey.provenance
    assert facts["cells_allowed"] == np.count_nonzero(blocked.values == 0)
    for mask, name in zip(blocked.attrs["flag_masks"], blocked.attrs["flag_meanings"].split(), strict=True):
        assert facts["cells_forbidden_by"][name] == np.count_nonzero(blocked.values & np.uint32(mask))
        assert facts["cells_forbidden_by_it_alone"][name] == np.count_nonzero(blocked.values == mask)


def test_solves_are_counted_for_every_option(sweep_text):
    facts = sweep_text(LOOPS).provenance
    assert facts["lambert_solves"] == 3 * facts["cells"]


@pytest.mark.parametrize("workers", [1, 5])
def test_the_number_of_workers_does_not_change_a_bit(scenario, whole, tmp_path, workers):
    assert_same_survey(sweep(scenario, tmp_path, workers).path, whole.path)


def test_the_size_of_tiles_does_not_change_the_grid(scenario, whole, tmp_path, monkeypatch):
    monkeypatch.setattr("porkgrid.survey.plan.TILE_CELLS", 10**6)
    monkeypatch.setattr("porkgrid.survey.plan.TILE_COLUMNS", 10**4)
    other = sweep(scenario, tmp_path, 1)
    assert len(read_ledger(tmp_path)) == 1
    xr.testing.assert_allclose(other.grid.load(), whole.grid.load(), rtol=1e-6)
    assert np.array_equal(other.grid["blocked_by"].values, whole.grid["blocked_by"].values)


def test_a_finished_sweep_is_not_computed_again(scenario, whole, tmp_path, monkeypatch):
    sweep(scenario, tmp_path, 1)
    before = (tmp_path / "survey.json").read_bytes()

    def compute_tile(plan, tile):
        raise AssertionError("a tile was computed again")

    monkeypatch.setattr(engine, "compute_tile", compute_tile)
    (tmp_path / "candidates.csv").unlink()
    again = sweep(scenario, tmp_path, 1)
    assert (tmp_path / "survey.json").read_bytes() == before
    assert_same_survey(again.path, whole.path)


def test_what_a_killed_process_has_left_half_written_is_removed_even_if_no_tile_was_done(
    scenario, whole, tmp_path
):
    with pytest.raises(KeyboardInterrupt):
        sweep(scenario, tmp_path, 1, report=stop_after(1, KeyboardInterrupt))
    (tmp_path / "tiles.jsonl").unlink()
    (tmp_path / "grid.zarr" / "c3_km2_s2" / "c" / "0" / ".1.4711.part").write_bytes(b"half")
    assert_same_survey(sweep(scenario, tmp_path, 1).path, whole.path)


def test_a_fresh_sweep_is_computed_again(scenario, whole, tmp_path):
    sweep(scenario, tmp_path, 1)
    (tmp_path / "grid.zarr" / "c3_km2_s2" / "c" / "0" / "0").write_bytes(b"damaged")
    assert_same_survey(sweep(scenario, tmp_path, 1, fresh=True).path, whole.path)


def test_by_default_the_survey_goes_to_a_folder_of_its_name(scenario, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    assert str(sweep(scenario, workers=1).path) == "surveys/rook-to-mars"
    assert open_survey("surveys/rook-to-mars").provenance["state"] == "complete"


def test_progress_goes_up_to_the_whole(scenario, whole, tmp_path):
    seen = []
    sweep(scenario, tmp_path, 2, report=seen.append)
    cells = [progress.cells_done for progress in seen]
    assert cells == sorted(cells)
    assert len(seen) == 12
    assert {(progress.tiles, progress.cells) for progress in seen} == {(12, 43 * 59)}
    assert (seen[-1].tiles_done, seen[-1].cells_done) == (12, 43 * 59)
    best = [progress.best for progress in seen if progress.best is not None]
    assert best == sorted(best, reverse=True)
    assert best[-1] == pytest.approx(whole.candidates["dv_total_km_s"][0], rel=1e-9)


def stop_after(count, error):
    """A report that raises at the count-th tile."""
    seen = []

    def report(progress):
        seen.append(progress)
        if len(seen) == count:
            raise error

    return report


@pytest.mark.parametrize("workers", [1, 2])
def test_an_interrupted_sweep_saves_the_tiles_in_hand_and_goes_on_with_the_rest(
    scenario, whole, tmp_path, workers, monkeypatch
):
    with pytest.raises(KeyboardInterrupt):
        sweep(scenario, tmp_path, workers, report=stop_after(5, KeyboardInterrupt))
    done = set(read_ledger(tmp_path))
    assert 5 <= len(done) < 12
    computed, compute_tile = [], engine.compute_tile

    def counting(plan, tile):
        computed.append(tile.number)
        return compute_tile(plan, tile)

    monkeypatch.setattr(engine, "compute_tile", counting)
    assert_same_survey(sweep(scenario, tmp_path, workers).path, whole.path)
    assert sorted(computed) == sorted(set(range(12)) - done)


def refusing(original, number, at=1):
    """A function whose at-th call fails as the operating system would say it."""
    calls = []

    def function(*args, **kwargs):
        calls.append(args)
        if len(calls) == at:
            raise OSError(number, strerror(number))
        return original(*args, **kwargs)

    return function


@pytest.mark.parametrize(
    ("number", "says"),
    [
        (errno.ENOSPC, "the disk is full"),
        (errno.EACCES, "no permission to write"),
        (errno.EROFS, "no permission to write"),
        (errno.EIO, "Input/output error"),
    ],
)
def test_what_the_file_system_refuses_is_said_with_the_folder(scenario, tmp_path, monkeypatch, number, says):
    monkeypatch.setattr(engine, "create_store", refusing(engine.create_store, number))
    with pytest.raises(RunError, match=says) as caught:
        sweep(scenario, tmp_path / "survey", 2)
    assert str(caught.value).startswith(f"{tmp_path / 'survey'}: ")


@pytest.mark.parametrize(
    ("owner", "stage", "at"),
    [
        (engine, "create_store", 1),
        (engine, "write_tile", 4),
        (chunks_written, "write_chunk", 9),
        (Ledger, "enter", 4),
        (Ledger, "_append", 1),
        (engine, "pick", 1),
    ],
)
def test_a_full_disk_at_any_stage_leaves_no_half_survey_and_the_sweep_goes_on_later(
    scenario, whole, tmp_path, monkeypatch, owner, stage, at
):
    with monkeypatch.context() as patch:
        patch.setattr(owner, stage, refusing(getattr(owner, stage), errno.ENOSPC, at))
        with pytest.raises(RunError):
            sweep(scenario, tmp_path, 2)
    assert json.loads((tmp_path / "survey.json").read_text())["state"] != "complete"
    assert_same_survey(sweep(scenario, tmp_path, 2).path, whole.path)


def test_a_survey_closed_by_its_limits_is_complete_all_the_same(sweep_text):
    survey = sweep_text(limited(LEAN, "c3_km2_s2 = { max = 1 }"))
    assert survey.provenance["state"] == "complete"
    assert survey.provenance["cells_allowed"] == 0


def test_a_grid_of_one_cell_is_a_survey(sweep_text):
    windows = ("last = 2029-04-01", "last = 2028-09-01"), ("last = 2030-03-31", "last = 2029-02-15")
    one = changed(limited(LEAN, ""), *windows)
    assert len(sweep_text(one).candidates) == 1

"""A survey that the disk cannot hold is refused before it is begun."""

import shutil
from types import SimpleNamespace

import pytest
from survey_scenarios import ROOK

from porkgrid.errors import RequestError
from porkgrid.survey.room import refuse_full_disk
from porkgrid.survey.sweep import sweep


@pytest.fixture
def free(monkeypatch):
    """Make the disk have so many bytes free."""
    return lambda count: monkeypatch.setattr(shutil, "disk_usage", lambda path: SimpleNamespace(free=count))


def test_a_disk_with_room_is_not_looked_at_closer(rook, free, tmp_path, monkeypatch):
    free(1e9)
    monkeypatch.setattr("porkgrid.survey.room.compute_tile", None)
    refuse_full_disk(tmp_path / "not" / "there", rook)


def test_compression_counts(rook, free, tmp_path):
    n, m = rook.shape
    free(n * m * 4 * 20)  # of some 25 arrays plain, which take three quarters of that compressed
    refuse_full_disk(tmp_path, rook)


def test_what_would_fit_is_said_and_nothing_is_begun(scenario_of, free, tmp_path):
    free(50_000.0)
    with pytest.raises(
        RequestError, match=r"the survey takes about .* MB, and 0.05 MB are free there; steps of "
    ):
        sweep(scenario_of(ROOK), tmp_path / "survey")
    assert not (tmp_path / "survey" / "grid.zarr").exists()
    free(1e9)
    assert sweep(scenario_of(ROOK), tmp_path / "survey").provenance["state"] == "complete"

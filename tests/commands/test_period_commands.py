"""`porkgrid period` and `porkgrid slip` as a user runs them."""

from __future__ import annotations

import csv
import json

import pytest
from command import assert_refused, messages, porkgrid
from survey_scenarios import ROOK, changed, limited, written

from porkgrid.survey.admit import load_scenario
from porkgrid.survey.sweep import sweep

pytestmark = pytest.mark.slow

DAILY = changed(
    ROOK,
    (
        "first = 2028-09-01\nlast = 2029-04-01\nstep_days = 5.0",
        "first = 2028-11-01\nlast = 2029-01-10\nstep_days = 1.0",
    ),
)


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    place = tmp_path_factory.mktemp("daily")
    return sweep(load_scenario(written(place, DAILY)), place / "survey", workers=1).path


@pytest.fixture(scope="module")
def said(folder):
    return porkgrid("period", folder, "--days", "10", "--json", "--format", "svg")


def test_json_has_every_day_of_every_period_and_the_files_written(folder, said):
    assert said.returncode == 0, said.stderr
    document = json.loads(said.stdout)
    assert [document[key] for key in ("by", "days", "hold", "gap_days")] == [
        "dv_total_km_s",
        10,
        "nothing",
        0,
    ]
    best = document["periods"][0]
    assert len(best["days"]) == 10
    assert best["worst"] == max(day["dv_total_km_s"] for day in best["days"])
    assert best["required"]["c3_km2_s2"]["worst"] == max(day["c3_km2_s2"] for day in best["days"])
    assert document["growth"]["worst"][9] == pytest.approx(best["worst"], rel=1e-6)
    assert document["opportunities"] == []
    assert document["files"] == [str(folder / "period-10.csv"), str(folder / "figures" / "period-10.svg")]
    assert messages(said) == document["files"]


def test_the_csv_has_the_days_of_every_period(folder, said):
    periods = json.loads(said.stdout)["periods"]
    with (folder / "period-10.csv").open() as file:
        rows = list(csv.DictReader(file))
    assert len(rows) == 10 * len(periods)
    assert next(iter(rows[0])) == "period"
    for row, day in zip(rows, periods[0]["days"], strict=False):
        assert row["period"] == "1"
        assert row["departure"] == day["departure"]
        assert float(row["dv_total_km_s"]) == day["dv_total_km_s"]


def test_tables_say_what_is_required_day_by_day_and_by_length(folder):
    done = porkgrid("period", folder, "--days", "8", "--hold", "arrival", "--gaps", "1")
    assert done.returncode == 0, done.stderr
    for words in (
        "Best launch period of 8 days",
        "one arrival date, up to 1 day left out",
        "required",
        "abs_dla_deg",
    ):
        assert words in done.stdout
    assert (folder / "period-8-hold-arrival-gaps-1.csv").exists()
    assert (folder / "figures" / "period-8-hold-arrival-gaps-1.png").exists()


def test_slip_says_what_late_days_cost_and_writes_them(folder):
    done = porkgrid("slip", folder, "--json")
    assert done.returncode == 0, done.stderr
    rows = json.loads(done.stdout)
    assert {"late_1_change", "late_20_state", "last_departure"} <= rows[0].keys()
    assert messages(done) == [str(folder / "slip.csv")]
    with (folder / "slip.csv").open() as file:
        assert [row["last_departure"] for row in csv.DictReader(file)] == [
            row["last_departure"] for row in rows
        ]
    table = porkgrid("slip", folder, "--by", "c3_km2_s2")
    assert "Leaving late: change of c3_km2_s2 in km²/s²" in table.stdout


@pytest.mark.parametrize(
    ("arguments", "fragment"),
    [
        (("--days", "0"), "0 days: a launch period has one day at least"),
        (("--days", "90"), "longer than the departure window, 2028-11-01 to 2029-01-10: 71 days"),
        (("--days", "20", "--by", "c3"), "does not store 'c3'"),
        (("--days", "20", "--gaps", "-2"), "-2 days left out: it can be 0 or more"),
    ],
)
def test_what_cannot_be_is_refused_before_anything_is_written(folder, arguments, fragment):
    before = sorted(folder.rglob("period*"))
    assert_refused(porkgrid("period", folder, *arguments), 2, fragment)
    assert sorted(folder.rglob("period*")) == before


def test_a_survey_without_an_allowed_cell_has_no_period(tmp_path):
    scenario = written(tmp_path, limited(ROOK, "c3_km2_s2 = { max = 2 }"))
    closed = sweep(load_scenario(scenario), tmp_path / "survey", workers=1).path
    assert_refused(
        porkgrid("period", closed), 2, "no departure day is allowed; what closes most is c3_km2_s2"
    )

"""porkgrid handoff: the folder for detailed analysis, whole or not at all."""

from __future__ import annotations

import json

import pytest
from survey_scenarios import ROOK, written

from porkgrid.commands import handoff as command
from porkgrid.errors import RequestError, RunError
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.sweep import sweep

FILES = {
    "README.md", "provenance.json", "scenario.toml", "full-force.json", "full-force.md", "sheet.pdf",
    "sheet.svg", "figures/path.png",
    *(f"{model}/{name}" for model in ("patched", "full-force")
      for name in ("trajectory.oem", "trajectory.bsp", "departure.opm", "after-arrival.opm", "targets.json",
                   "targets.md")),
}  # fmt: skip


@pytest.fixture(scope="module")
def rook(tmp_path_factory):
    folder = tmp_path_factory.mktemp("handoff")
    return sweep(load_scenario(written(folder, ROOK)), folder / "survey", 1)


@pytest.fixture(scope="module")
def first(rook):
    """Candidate 1, handed off."""
    command.handoff(rook.path, candidate=1)
    return rook.path / "handoff" / "candidate-1"


def test_the_folder_has_every_file_and_no_other(first):
    assert {str(path.relative_to(first)) for path in first.rglob("*") if path.is_file()} == FILES
    assert not list(first.parent.glob(".*"))


def test_every_file_of_text_says_its_model_and_the_cautions(first):
    for name in FILES:
        if name.endswith((".oem", ".opm", ".md", ".json")):
            text = " ".join((first / name).read_text().split())
            assert "not for flight operations" in text, name
            model = "patched conics" if name.startswith("patched/") else "full force"
            assert model in text.lower().replace("full-force", "full force"), name


def test_the_check_is_told_line_by_line_with_its_thresholds(first):
    check = json.loads((first / "full-force.json").read_text())
    assert check["converged"]
    assert check["verdict"] in ("confirmed", "confirmed with changes")
    lines = {line["name"]: line for line in check["lines"]}
    assert {"c3_km2_s2", "rla_deg", "dla_deg", "departure_epoch_jd_tdb", "arrival_b_t_km", "arrival_b_r_km",
            "v_inf_arrival_km_s"} <= lines.keys()  # fmt: skip
    for line in lines.values():
        difference = (line["full_force"] - line["patched"] + 180.0) % 360.0 - 180.0
        assert line["difference"] == pytest.approx(difference) or line["unit"] != "deg"
    assert max(check["miss_km"]) < 1.0
    assert "confirmed" in check["thresholds"]


def test_the_dates_are_those_of_the_refined_candidate(first, rook):
    epochs = json.loads((first / "provenance.json").read_text())["epochs_jd_tdb"]
    row = rook.refined.iloc[0]
    assert epochs == pytest.approx([row["departure_epoch_jd_tdb"], row["arrival_epoch_jd_tdb"]], abs=1e-4)


@pytest.mark.slow
def test_dates_that_the_analyst_brings_are_flown_as_they_are(rook, capsys):
    command.handoff(rook.path, dates="2028-11-25,2029-09-25T12:00", as_json=True)
    printed = json.loads(capsys.readouterr().out)
    lines = {line["name"]: line for line in printed["lines"]}
    assert lines["departure_epoch_jd_tdb"]["patched"] == 2462100.5  # 2028-11-25, calendar arithmetic
    assert lines["arrival_epoch_jd_tdb"]["patched"] == 2462405.0
    assert (rook.path / "handoff" / "2028-11-25_2029-09-25T1200" / "sheet.pdf").exists()


def test_a_hand_off_that_is_there_is_kept_unless_told_otherwise(first, rook):
    marker = first / "README.md"
    before = marker.stat().st_mtime_ns
    with pytest.raises(RequestError, match="there is a hand-off already; --fresh replaces it"):
        command.handoff(rook.path, candidate=1)
    assert marker.stat().st_mtime_ns == before


@pytest.mark.parametrize(
    ("asked", "told"),
    [
        ({"candidate": 99}, r"no candidate 99; there are 1 to \d+"),
        ({"dates": "2028-11-25"}, "1 given for 2 encounters"),
        ({"dates": "2028-11-25,2029-09-25,2030-01-01"}, "3 given for 2 encounters"),
        ({"dates": "2028-11-25,soon"}, "'soon' is no date; write 2028-11-30"),
        ({"dates": "2020-01-01,2029-09-25"}, "2020-01-01 is outside encounter 1's window"),
        ({"dates": "2029-03-01,2029-02-20"}, "each date must follow the one before it"),
        ({}, "give either --candidate N or --dates"),
        ({"candidate": 1, "dates": "2028-11-25,2029-09-25"}, "give either --candidate N or --dates"),
    ],
)
def test_what_cannot_be_handed_off_is_refused(rook, asked, told):
    with pytest.raises(RequestError, match=told):
        command.handoff(rook.path, **{"candidate": None, "dates": None} | asked)


@pytest.mark.slow
def test_a_place_that_cannot_be_written_leaves_nothing_half_written(rook, monkeypatch):
    def full(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("porkgrid.handoff.checkfiles.write_check", full)
    with pytest.raises(RunError, match="candidate-2: cannot be written: No space left on device"):
        command.handoff(rook.path, candidate=2)
    assert not (rook.path / "handoff" / "candidate-2").exists()
    assert not list((rook.path / "handoff").glob(".*"))


@pytest.mark.slow
def test_without_spiceypy_the_kernel_is_skipped_and_that_is_said(rook, monkeypatch, capsys):
    import sys

    monkeypatch.setitem(sys.modules, "spiceypy", None)
    command.handoff(rook.path, candidate=2, fresh=True)
    folder = rook.path / "handoff" / "candidate-2"
    assert not list(folder.rglob("*.bsp"))
    assert "SPK skipped: spiceypy is not installed" in capsys.readouterr().err

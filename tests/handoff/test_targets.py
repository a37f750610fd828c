"""The target sheet holds the encounters' numbers, in full for machines and rounded for people."""

from __future__ import annotations

import datetime as dt
import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from handoff_flights import CHECKSUMS, FLIGHTS, measures_of_flight, trajectory_of

from porkgrid.handoff.targets import targets_json, targets_markdown, write_targets
from porkgrid.handoff.trajectory import Quantity
from porkgrid.sky.epochs import jd_from_date, jd_tdb_from_utc


def sheet_of(name: str) -> dict:
    return json.loads(targets_json(trajectory_of(name)))


@pytest.mark.parametrize("name", FLIGHTS)
def test_every_number_of_an_encounter_is_there_in_full(name: str) -> None:
    for ours, found in zip(trajectory_of(name).encounters, sheet_of(name)["encounters"], strict=True):
        assert found["jd_tdb"] == ours.jd_tdb
        for key, vector in (("v_inf_in_km_s", ours.v_inf_in_km_s), ("v_inf_out_km_s", ours.v_inf_out_km_s)):
            assert found[key] == (None if vector is None else list(vector))
        for key in ("c3_km2_s2", "rla_deg", "dla_deg", "b_t_km", "b_r_km"):
            assert found[key] == getattr(ours, key)
        assert found["periapsis_radius_km"] == ours.periapsis_km
        assert found["periapsis_altitude_km"] == ours.altitude_km


@pytest.mark.parametrize("name", FLIGHTS)
def test_epochs_in_utc_are_those_in_tdb(name: str) -> None:
    for found in (*sheet_of(name)["encounters"], *sheet_of(name)["burns"]):
        apart_s = (jd_tdb_from_utc(found["epoch_utc"]) - found["jd_tdb"]) * 86400.0
        assert abs(apart_s) < 0.6e-3  # written to the millisecond
        assert found["epoch_utc"] < found["epoch_tdb"]  # TDB is ahead


def test_before_1972_there_is_no_utc_to_write() -> None:
    trajectory = trajectory_of("bare")
    early = [
        replace(each, jd_tdb=jd_from_date(dt.date(1964 + k, 11, 28)))
        for k, each in enumerate(trajectory.encounters)
    ]
    early_flight = replace(trajectory, encounters=tuple(early))
    assert [each["epoch_utc"] for each in json.loads(targets_json(early_flight))["encounters"]] == [
        None,
        None,
    ]
    assert "| epoch, UTC | UTC in whole seconds begins in 1972 |" in targets_markdown(early_flight)


def test_burns_have_their_vectors_and_masses() -> None:
    burns = trajectory_of("one flyby").burns
    for ours, found in zip(burns, sheet_of("one flyby")["burns"], strict=True):
        assert found["dv_icrf_km_s"] == list(ours.dv_km_s)
        assert found["dv_km_s"] == pytest.approx(np.linalg.norm(ours.dv_km_s), rel=1e-15)
        assert found["mass_before_kg"] == ours.mass_before_kg
        assert found["propellant_kg"] == ours.propellant_kg


def test_masses_are_those_of_the_measures() -> None:
    measures = measures_of_flight("one flyby")
    masses = sheet_of("one flyby")["masses_kg"]
    assert masses == {name: value for name, value in measures.items() if name.endswith("_kg")}
    assert {"propellant_kg", "low_orbit_mass_kg"} <= masses.keys()
    assert sheet_of("direct")["masses_kg"] == {}


@pytest.mark.parametrize("name", FLIGHTS)
def test_the_sheet_says_model_caution_and_provenance(name: str) -> None:
    trajectory, sheet = trajectory_of(name), sheet_of(name)
    assert sheet["model"] == trajectory.model
    assert sheet["caution"] == trajectory.caution
    assert sheet["notes"] == list(trajectory.notes)
    (file, checksum), *_ = CHECKSUMS
    assert sheet["provenance"] == {
        "porkgrid": trajectory.version,
        "scenario": trajectory.name,
        "ephemeris": "DE440",
        "kernels": [{"file": file, "sha256": checksum}],
    }
    text = targets_markdown(trajectory)
    for said in (trajectory.model, trajectory.caution, trajectory.version, "DE440", checksum):
        assert said in text


@pytest.mark.parametrize("name", ["direct", "one flyby", "two flybys"])
def test_the_tables_show_every_encounter_and_burn(name: str) -> None:
    trajectory, text = trajectory_of(name), targets_markdown(trajectory_of(name))
    for encounter in trajectory.encounters:
        section = text.split(f" {encounter.body}\n")[1:]
        assert any(f"{encounter.periapsis_km:.3f} km" in part for part in section)
    for burn in trajectory.burns:
        (row,) = [line for line in text.splitlines() if line.startswith(f"| {burn.label} |")]
        assert f"{burn.size_km_s:.6f}" in row


@pytest.mark.parametrize("name", FLIGHTS)
def test_every_row_of_a_table_has_the_cells_of_its_head(name: str) -> None:
    columns = 0
    for line in targets_markdown(trajectory_of(name)).splitlines():
        if not line.startswith("|"):
            columns = 0
            continue
        cells = line.replace("\\|", "").count("|") - 1
        columns = columns or cells
        assert cells == columns, line


def test_a_hostile_name_stays_one_line_of_text() -> None:
    named = replace(trajectory_of("bare"), name="a|b\n# c `d` <script>")
    assert targets_markdown(named).splitlines()[0] == r"# Encounter targets: a\|b \# c \`d\` \<script\>"


def test_what_is_not_a_number_becomes_null() -> None:
    odd = replace(trajectory_of("bare"), quantities=(Quantity("mass_margin_kg", float("nan"), "kg", "…"),))
    assert json.loads(targets_json(odd))["masses_kg"] == {"mass_margin_kg": None}


def test_both_files_are_written(tmp_path: Path) -> None:
    paths = write_targets(tmp_path, trajectory_of("direct"))
    assert [path.name for path in paths] == ["targets.json", "targets.md"]
    assert json.loads(paths[0].read_text(encoding="utf-8")) == sheet_of("direct")
    assert paths[1].read_text(encoding="utf-8") == targets_markdown(trajectory_of("direct"))

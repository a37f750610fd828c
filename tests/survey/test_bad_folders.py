"""Survey folders that somebody or something has spoilt: one clear message, exit code 2, nothing deleted."""

from __future__ import annotations

import io
import json
import os
import shutil
import sys
from collections.abc import Callable
from itertools import cycle
from pathlib import Path

import numpy as np
import pytest
import xarray as xr
import zarr
from survey_scenarios import LEAN, ROOK, changed, shrink_tiles, written

from porkgrid import RequestError, open_survey
from porkgrid.cli import main
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.logbook import log
from porkgrid.survey.store import create_store
from porkgrid.survey.surveys import Survey
from porkgrid.survey.sweep import sweep


@pytest.fixture(scope="module")
def survey(scenario_of, tmp_path_factory) -> Survey:
    """LEAN in 12 tiles. Not to be written to."""
    with pytest.MonkeyPatch.context() as patch:
        shrink_tiles(patch)
        return sweep(scenario_of(LEAN), tmp_path_factory.mktemp("sound") / "survey", workers=1)


@pytest.fixture
def folder(survey, tmp_path) -> Path:
    """A sound survey of the test's own."""
    shutil.copytree(survey.path, tmp_path / "survey")
    return tmp_path / "survey"


@pytest.fixture
def run(monkeypatch, capsys) -> Callable[..., tuple[int, str, str]]:
    """Run a command in this process: its exit code and both outputs."""

    def command(*arguments: str | Path) -> tuple[int, str, str]:
        monkeypatch.setattr("sys.argv", ["porkgrid", *map(str, arguments)])
        with pytest.raises(SystemExit) as ended:
            main()
        return ended.value.code or 0, *capsys.readouterr()

    return command


def tree(folder: Path) -> dict[Path, bytes]:
    return {path: path.read_bytes() for path in folder.rglob("*") if path.is_file()}


COMMANDS_THERE_ARE = [["chart"], ["rank"], ["period", "--days", "3"]]
COMMANDS = cycle(COMMANDS_THERE_ARE)  # each of them has its turn


def assert_refused(run, folder: Path, *says: str) -> None:
    """A command on the folder ends with 2, one message, and leaves all as it is."""
    before = tree(folder)
    for name, *options in [next(COMMANDS)]:
        code, out, err = run(name, folder, *options)
        assert code == 2, (name, err)
        assert err.startswith(f"porkgrid: {folder}"), (name, err)
        assert len(err.splitlines()) == 1, (name, err)
        assert len(err) < 800
        assert all(each in err for each in says), (name, err)
        assert out == ""
    assert tree(folder) == before


# The store


def foreign_zarr(path: Path) -> None:
    shutil.rmtree(path)
    xr.Dataset({"rain": ("x", np.arange(3.0))}).to_zarr(path, zarr_format=3, consolidated=False)


def old_zarr(path: Path) -> None:
    shutil.rmtree(path)
    xr.Dataset({"rain": ("x", np.arange(3.0))}).to_zarr(path, zarr_format=2)


def bare_array(path: Path) -> None:
    shutil.rmtree(path)
    zarr.create_array(path, shape=(3,), dtype="f4")


def edited(path: Path, change: Callable[[dict], object]) -> None:
    """Change the metadata of a group."""
    facts = json.loads((path / "zarr.json").read_text())
    change(facts)
    (path / "zarr.json").write_text(json.dumps(facts))


def arrays_of(facts: dict) -> dict:
    return facts["consolidated_metadata"]["metadata"]


METADATA = {
    "missing": lambda path: (path / "zarr.json").unlink(),
    "empty": lambda path: (path / "zarr.json").write_bytes(b""),
    "garbage": lambda path: (path / "zarr.json").write_bytes(b"\xff\x00\x12" * 40),
    "truncated": lambda path: os.truncate(path / "zarr.json", 700),
    "other JSON": lambda path: (path / "zarr.json").write_text("[1, 2]"),
    "no facts": lambda path: (path / "zarr.json").write_text("{}"),
    "a folder": lambda path: [(path / "zarr.json").unlink(), (path / "zarr.json").mkdir()],
    "not consolidated": lambda path: edited(path, lambda facts: facts.pop("consolidated_metadata")),
    "another format": lambda path: edited(path, lambda facts: facts.update(zarr_format=9)),
    "unknown codec": lambda path: edited(
        path, lambda facts: arrays_of(facts)["blocked_by"].update(codecs=[{"name": "rot13"}])
    ),
    "another type": lambda path: edited(
        path, lambda facts: arrays_of(facts)["blocked_by"].update(data_type="complex9")
    ),
    "a shape of three": lambda path: edited(
        path, lambda facts: arrays_of(facts)["blocked_by"].update(shape=[43, 59, 2])
    ),
    "no dimensions": lambda path: edited(
        path, lambda facts: arrays_of(facts)["departure"].pop("dimension_names")
    ),
    "no flags": lambda path: edited(path, lambda facts: arrays_of(facts).pop("blocked_by")),
    "no store": shutil.rmtree,
    "a file": lambda path: [shutil.rmtree(path), path.write_text("grid")],
    "foreign": foreign_zarr,
    "of another zarr": old_zarr,
    "a bare array": bare_array,
}


@pytest.mark.parametrize("how", METADATA)
def test_a_store_that_is_foreign_or_spoilt_is_refused_with_what_to_do(run, folder, how):
    METADATA[how](folder / "grid.zarr")
    assert_refused(run, folder, "grid.zarr", "anew with --fresh")


def test_the_store_of_another_survey_is_refused_and_both_shapes_are_named(run, folder, loops):
    shutil.rmtree(folder / "grid.zarr")
    create_store(folder, loops, "0")
    assert_refused(run, folder, "another survey", "21 departures × 41 arrivals", "43 × 59 dates")


@pytest.mark.parametrize("name", ["blocked_by", "c3_km2_s2", "departure_epoch_jd_tdb"])
def test_an_array_that_has_gone_is_named(run, folder, name):
    shutil.rmtree(folder / "grid.zarr" / name)
    assert_refused(run, folder, f"has no array {name}", "anew with --fresh")


def test_an_array_that_the_store_has_never_had_is_named(run, folder):
    edited(folder / "grid.zarr", lambda facts: arrays_of(facts).pop("dla_deg"))
    assert_refused(run, folder, "has no array dla_deg", "anew with --fresh")


PART = Path("grid.zarr/blocked_by/c/2/1")
DAMAGE = {
    "missing": (os.unlink, "is missing"),
    "torn": (lambda path: os.truncate(path, 40), "is damaged: its checksum is wrong"),
    "empty": (lambda path: os.truncate(path, 0), "is damaged"),
    "changed": (lambda path: path.write_bytes(path.read_bytes()[:-1] + b"\x00"), "is damaged"),
}


@pytest.mark.parametrize("how", DAMAGE)
def test_a_tile_that_is_not_as_it_was_written_is_never_read_as_if_it_were(run, folder, how):
    harm, says = DAMAGE[how]
    harm(folder / PART)
    for _ in COMMANDS_THERE_ARE:
        assert_refused(run, folder, str(PART), says, "with the same scenario computes it again")
    with pytest.raises(RequestError, match=says):
        open_survey(folder).grid["blocked_by"].load()


def test_what_is_whole_of_a_damaged_grid_can_still_be_read(folder, survey):
    (folder / PART).unlink()
    rows = slice(0, 16)
    held = open_survey(folder).grid.isel(departure=rows).load()
    xr.testing.assert_identical(held, survey.grid.isel(departure=rows).load())


def test_a_coordinate_whose_values_have_gone_is_not_read_as_zeros(run, folder):
    shutil.rmtree(folder / "grid.zarr" / "arrival" / "c")
    assert_refused(run, folder, "arrival", "anew with --fresh")


def test_a_survey_of_one_departure_date_has_all_its_parts(sweep_text):
    """Its only date is the zero of its own calendar, which zarr would not have written."""
    one = sweep_text(changed(LEAN, ("last = 2029-04-01", "last = 2028-09-01")))
    assert str(open_survey(one.path).grid["departure"].values[0]).startswith("2028-09-01")


# The small files


@pytest.mark.parametrize("share", [0.0, 0.2, 0.7, 0.99])
def test_a_truncated_survey_json_is_said_to_be_unreadable(run, folder, share):
    path = folder / "survey.json"
    os.truncate(path, int(share * path.stat().st_size))
    assert_refused(run, folder, "survey.json: ", "cannot be read as a survey's provenance")


@pytest.mark.parametrize(
    "content", [b"\xff\xfe\x00", b"[" * 100_000, b"null", b'"complete"', b'{"state": "complete"}']
)
def test_what_is_no_provenance_is_refused(run, folder, content):
    (folder / "survey.json").write_bytes(content)
    assert_refused(run, folder, "survey.json: ")


@pytest.mark.parametrize("key", ["scenario_folder", "tiles", "grid", "cells", "asked"])
def test_provenance_that_lacks_a_fact_is_refused_and_the_fact_named(run, folder, key):
    facts = json.loads((folder / "survey.json").read_text())
    del facts[key]
    (folder / "survey.json").write_text(json.dumps(facts))
    assert_refused(run, folder, "survey.json: ", key, "--fresh")


def test_a_survey_of_another_version_is_refused_and_both_are_named(run, folder):
    facts = json.loads((folder / "survey.json").read_text())
    facts |= {"format": 1, "versions": {"porkgrid": "0.0.3"}}
    (folder / "survey.json").write_text(json.dumps(facts))
    assert_refused(run, folder, "made by porkgrid 0.0.3 in folder format 1", "reads format 2")


def test_a_folder_whose_metadata_have_gone_is_no_survey(run, folder):
    (folder / "survey.json").unlink()
    assert_refused(run, folder, "not a survey folder: it has no survey.json")


@pytest.mark.parametrize("content", [None, b"", b"\xff\xfe", b"name = ", b'name = "x"'])
def test_a_scenario_that_has_been_spoilt_is_refused(run, folder, content):
    path = folder / "scenario.toml"
    path.unlink()
    if content is not None:
        path.write_bytes(content)
    before = tree(folder)
    for name, *options in COMMANDS_THERE_ARE:
        code, _, err = run(name, folder, *options)
        assert code == 2, err
        assert all(line.startswith(f"porkgrid: {path}: ") for line in err.splitlines())
    assert tree(folder) == before


@pytest.mark.parametrize("content", [None, b"", b"\xff\xfe\x00", b'a,b\n1,2,3,4\n"', b"a,b\n1,2\n"])
def test_a_table_of_candidates_that_has_been_spoilt_is_refused(folder, content):
    path = folder / "candidates.csv"
    path.unlink()
    if content is not None:
        path.write_bytes(content)
    with pytest.raises(RequestError, match=r"candidates\.csv: .*with the same scenario writes it again"):
        _ = open_survey(folder).candidates


@pytest.mark.parametrize("fresh", [[], ["--fresh"]])
@pytest.mark.parametrize("name", ["grid.zarr", "figures", "candidates.csv", "tiles.jsonl"])
def test_a_link_that_leads_out_of_the_folder_is_refused_by_a_sweep(run, folder, tmp_path, name, fresh):
    outside = tmp_path / "outside"
    (folder / name).rename(outside)
    (folder / name).symlink_to(outside)
    before = tree(tmp_path)
    code, _, err = run("sweep", written(tmp_path / "given", LEAN), "--out", folder, *fresh)
    assert code == 2
    assert f"{folder / name}: is a link" in err
    assert tree(tmp_path).items() >= before.items()


@pytest.mark.parametrize("name", ["../../away", "/etc/passwd", "..", ".", "~root", "a/b", "\\u0000", "\\n"])
def test_a_scenarios_name_leads_to_no_folder_but_one_in_surveys(scenario_of, name):
    try:
        slug = scenario_of(changed(ROOK, ("Rook to Mars", name))).slug
    except RequestError:
        return
    assert "/" not in slug
    assert slug.strip(".") == slug != ""


# Odd names


@pytest.mark.parametrize(
    "name",
    ["a b\t'q\" [bold]x[/bold] {0} %s # ? * → é 😀", "-dash", "new\nline", os.fsdecode(b"latin-\xe9")],
    ids=["signs", "dash", "two lines", "no utf-8"],
)
def test_a_folder_may_have_any_name(run, tmp_path, name, monkeypatch):
    monkeypatch.setattr(log, "propagate", False)  # pytest-xdist sends what is captured, as UTF-8
    folder = tmp_path / name
    given = load_scenario(written(tmp_path / f"given {name}", LEAN))
    first = sweep(given, folder, workers=1)
    (folder / "grid.zarr" / "blocked_by" / "c" / "0" / "0").unlink()
    again = sweep(given, folder, workers=1)
    assert again.candidates.equals(first.candidates)
    code, out, err = run("rank", folder, "--keep", "1", "--json")
    assert code == 0, err
    assert json.loads(out)[0]["rank"] == 1


def test_a_path_that_is_not_text_is_printed_byte_for_byte(monkeypatch, folder, tmp_path):
    """On an output that is strict about what text is, as in most locales."""
    odd = folder.rename(tmp_path / os.fsdecode(b"latin-\xe9"))
    printed = io.BytesIO()
    monkeypatch.setattr("sys.stdout", io.TextIOWrapper(printed, encoding="utf-8", errors="strict"))
    monkeypatch.setattr("sys.argv", ["porkgrid", "chart", str(odd), "--of", "c3_km2_s2"])
    with pytest.raises(SystemExit) as ended:
        main()
    sys.stdout.flush()
    assert not ended.value.code
    assert os.fsencode(odd / "figures") in printed.getvalue()

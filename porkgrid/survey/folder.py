"""The survey folder: what it is called, whose it is, and how its small files are written."""

from __future__ import annotations

import hashlib
import json
import os
import shutil
from datetime import UTC, datetime
from fnmatch import fnmatchcase
from pathlib import Path
from typing import Any

from porkgrid.errors import RequestError
from porkgrid.scenario import Scenario
from porkgrid.survey.ledger import LEDGER
from porkgrid.survey.lock import LOCK
from porkgrid.survey.logbook import LOG
from porkgrid.survey.store import STORE

SCENARIO, PROVENANCE, CANDIDATES, FIGURES = "scenario.toml", "survey.json", "candidates.csv", "figures"
REFINED = "refined.csv"
# What is ours in a folder, as patterns, besides survey.json, which says that they are.
OURS = (SCENARIO, CANDIDATES, REFINED, FIGURES, STORE, LEDGER, "period-*.csv", "slip.csv", "trade.csv",
        "page.html", "handoff")  # fmt: skip
_PATHS = "surrogateescape"  # how Python holds what is not text in the names of files
PART = ".part"  # ending of a file that is being written
FORMAT = 2  # of the folder: raised when what is in it cannot be read as before

# States of a survey: its folder is taken, its store is there, all is written.
CLAIMED, RUNNING, COMPLETE = "claimed", "running", "complete"
# What survey.json holds besides from each state on, as far as something is made of it.
_FACTS: dict[str, dict[str, type]] = {
    CLAIMED: {"name": str, "fingerprint": str, "asked": dict, "started": str},
    RUNNING: {"route": str, "scenario_folder": str, "versions": dict, "tiles": dict, "grid": dict},
    COMPLETE: {"cells": int, "cells_allowed": int, "cells_forbidden_by": dict,
               "cells_forbidden_by_it_alone": dict},
}  # fmt: skip


def folder_of(scenario: Scenario, out: str | Path | None) -> Path:
    """Where the survey of a scenario goes: `out`, or surveys/<slug of the name>."""
    return Path(out) if out is not None else Path("surveys") / scenario.slug


def asked(scenario: Scenario) -> dict[str, Any]:
    """What the scenario asks for, whatever the comments and the layout of its file and whence it is read."""
    kernels = [str(path.absolute()) for path in scenario.kernels]
    return scenario.model_dump(mode="json", exclude={"path", "text", "description"}) | {"kernels": kernels}


def fingerprint(scenario: Scenario) -> str:
    """A checksum of what the scenario asks for."""
    return hashlib.sha256(json.dumps(asked(scenario), sort_keys=True).encode()).hexdigest()


def read_provenance(folder: Path) -> dict[str, Any]:
    """The survey.json of a folder. RequestError where the folder is no survey, or one of another version."""
    provenance = _survey_json(folder)
    if provenance.get("format") != FORMAT:
        versions = provenance.get("versions")
        versions = versions if isinstance(versions, dict) else {}
        made_by = versions.get("porkgrid", "of another version")
        raise RequestError(
            f"{folder}: was made by porkgrid {made_by} in folder format {provenance.get('format', 1)}, and "
            f"this one reads format {FORMAT}; sweep its scenario anew with --fresh"
        )
    if lacking := _lacking(provenance):
        raise RequestError(
            f"{folder / PROVENANCE}: {', '.join(lacking)} missing, or not what a sweep writes there; "
            "sweep the survey's scenario anew with --fresh"
        )
    return provenance


def _lacking(provenance: dict[str, Any]) -> list[str]:
    """Names of the facts that a survey in its state must have and has not, or not of the right kind."""
    states = list(_FACTS)
    if provenance["state"] not in states:
        return ["state"]
    wanted: dict[str, type] = {}
    for state in states[: states.index(provenance["state"]) + 1]:
        wanted |= _FACTS[state]
    inner = {"tiles": ("tile_cells", "tile_columns"), "grid": ("departure_dates", "arrival_dates")}
    return [name for name, kind in wanted.items() if not isinstance(provenance.get(name), kind)] or [
        f"{name}.{key}"
        for name in inner.keys() & wanted.keys()
        for key in inner[name]
        if not (isinstance(provenance[name].get(key), int) and provenance[name][key] > 0)
    ]


def _survey_json(folder: Path) -> dict[str, Any]:
    """The survey.json of a folder, of whatever version. RequestError where it is none of ours."""
    path = folder / PROVENANCE
    try:
        provenance = json.loads(path.read_text(encoding="utf-8", errors=_PATHS))
    except FileNotFoundError:
        raise RequestError(
            f"{folder}: not a survey folder: it has no {PROVENANCE}; `porkgrid sweep` makes one"
        ) from None
    except (ValueError, OSError, RecursionError) as error:
        raise RequestError(
            f"{path}: cannot be read as a survey's provenance: {error}; "
            "sweep its scenario into another folder"
        ) from None
    if not isinstance(provenance, dict) or not {"fingerprint", "state"} <= provenance.keys():
        raise RequestError(f"{path}: not the provenance of a porkgrid survey: no fingerprint, no state")
    return provenance


def write_provenance(folder: Path, provenance: dict[str, Any]) -> None:
    """Replace survey.json whole."""
    write_whole(folder / PROVENANCE, json.dumps(provenance, indent=2, ensure_ascii=False) + "\n")


def write_whole(path: Path, text: str) -> None:
    """Write a text file so that no reader ever finds it half-written."""
    part = path.with_name(path.name + PART)
    with part.open("w", encoding="utf-8", errors=_PATHS) as file:
        file.write(text)
        file.flush()
        os.fsync(file.fileno())
    part.replace(path)


def refuse_foreign(folder: Path) -> None:
    """RequestError where the folder holds something else than a survey, or links that lead out of it."""
    if folder.exists() and not folder.is_dir():
        raise RequestError(f"{folder}: is a file; give a folder with --out")
    if folder.is_symlink() and not folder.exists():
        raise RequestError(f"{folder}: is a link to nowhere; give a folder with --out")
    held = sorted(each.name for each in folder.iterdir()) if folder.exists() else []
    foreign = [name for name in held if name not in (PROVENANCE + PART, LOCK, LOG)]
    if foreign and PROVENANCE not in held:
        raise RequestError(f"{folder}: holds other files ({foreign[0]}, …); give another folder with --out")
    patterns = (PROVENANCE, LOCK, LOG, f"*{PART}", *OURS)
    for name in held:
        if any(fnmatchcase(name, each) for each in patterns) and (folder / name).is_symlink():
            raise RequestError(
                f"{folder / name}: is a link, and a sweep writes nowhere but in its own folder; "
                "replace it by what it points to, or give another folder with --out"
            )


def claim(folder: Path, scenario: Scenario, fresh: bool) -> bool:
    """Make the folder ready for the scenario's survey; True where one is already running or complete in it.

    RequestError where the folder holds another survey. Nothing is removed but what a survey.json, which is
    the first file in a folder of ours, vouches for: under `fresh`, or of a sweep killed before its store was.
    """
    if (folder / PROVENANCE).exists():
        _survey_json(folder)
        if not fresh:
            _same_scenario(folder, scenario)
            if read_provenance(folder)["state"] != CLAIMED:
                return True
    folder.mkdir(parents=True, exist_ok=True)
    write_provenance(folder, _first_provenance(scenario))
    _clear(folder)
    (folder / FIGURES).mkdir()
    write_whole(folder / SCENARIO, scenario.text)
    return False


def _first_provenance(scenario: Scenario) -> dict[str, Any]:
    return {
        "name": scenario.name,
        "format": FORMAT,
        "state": CLAIMED,
        "fingerprint": fingerprint(scenario),
        "asked": asked(scenario),
        "started": datetime.now(UTC).isoformat(timespec="seconds"),
    }


def _same_scenario(folder: Path, scenario: Scenario) -> None:
    held = read_provenance(folder)
    if held["fingerprint"] == fingerprint(scenario):
        return
    raise RequestError(
        f"{folder}: holds another survey, {held.get('name')!r} from {held.get('started')}, whose "
        f"scenario differs in {', '.join(differences(held.get('asked', {}), scenario))}; "
        "give another folder with --out, or --fresh to replace it"
    )


def differences(held: dict[str, Any], scenario: Scenario) -> list[str]:
    """Keys in which what a survey was asked for and what a scenario asks for are not the same."""
    wanted = asked(scenario)
    return [key for key in wanted if wanted[key] != held.get(key)] or ["its version"]


def _clear(folder: Path) -> None:
    for path in (found for pattern in OURS for found in folder.glob(pattern)):
        if path.is_dir() and not path.is_symlink():
            shutil.rmtree(path)
        else:
            path.unlink(missing_ok=True)

"""The survey folder: what it is called, whose it is, and how its small files are written."""

from __future__ import annotations

import hashlib
import json
import os
import shutil
from pathlib import Path
from typing import Any

from porkgrid.errors import RequestError
from porkgrid.scenario import Scenario
from porkgrid.survey.ledger import LEDGER
from porkgrid.survey.store import STORE

SCENARIO, PROVENANCE, CANDIDATES, FIGURES = "scenario.toml", "survey.json", "candidates.csv", "figures"
OURS = (SCENARIO, PROVENANCE, CANDIDATES, FIGURES, STORE, LEDGER)


def folder_of(scenario: Scenario, out: str | Path | None) -> Path:
    """Where the survey of a scenario goes: `out`, or surveys/<slug of the name>."""
    return Path(out) if out is not None else Path("surveys") / scenario.slug


def fingerprint(scenario: Scenario) -> str:
    """A checksum of what the scenario asks for; comments and layout of the file do not count."""
    asked = scenario.model_dump(mode="json", exclude={"path", "text", "description"})
    return hashlib.sha256(json.dumps(asked, sort_keys=True).encode()).hexdigest()


def read_provenance(folder: Path) -> dict[str, Any]:
    """The survey.json of a folder. RequestError where the folder is no survey."""
    path = folder / PROVENANCE
    try:
        provenance = json.loads(path.read_text())
    except FileNotFoundError:
        raise RequestError(
            f"{folder}: not a survey folder: it has no {PROVENANCE}; `porkgrid sweep` makes one"
        ) from None
    except (ValueError, OSError) as error:
        raise RequestError(f"{path}: cannot be read as a survey's provenance: {error}") from None
    if not isinstance(provenance, dict) or "fingerprint" not in provenance:
        raise RequestError(f"{path}: not the provenance of a porkgrid survey: it has no fingerprint")
    return provenance


def write_provenance(folder: Path, provenance: dict[str, Any]) -> None:
    """Replace survey.json whole."""
    write_whole(folder / PROVENANCE, json.dumps(provenance, indent=2, ensure_ascii=False) + "\n")


def write_whole(path: Path, text: str) -> None:
    """Write a text file so that no reader ever finds it half-written."""
    part = path.with_name(path.name + ".part")
    with part.open("w", encoding="utf-8") as file:
        file.write(text)
        file.flush()
        os.fsync(file.fileno())
    part.replace(path)


def claim(folder: Path, scenario: Scenario, fresh: bool) -> bool:
    """Make the folder ready for the scenario's survey; True where one is already begun in it.

    RequestError where the folder holds something else: it is never written over, except that `fresh`
    removes what an earlier survey of ours left there.
    """
    if folder.exists() and not folder.is_dir():
        raise RequestError(f"{folder}: is a file; give a folder with --out")
    held = sorted(each.name for each in folder.iterdir()) if folder.exists() else []
    if fresh and PROVENANCE in held:
        read_provenance(folder)
        _clear(folder)
        held = []
    if PROVENANCE in held:
        _same_scenario(folder, scenario)
        return True
    foreign = [name for name in held if name not in OURS]
    if foreign:
        raise RequestError(f"{folder}: holds other files ({foreign[0]}, …); give another folder with --out")
    _clear(folder)  # of a survey that was killed before it began
    (folder / FIGURES).mkdir(parents=True, exist_ok=True)
    write_whole(folder / SCENARIO, scenario.text)
    return False


def _same_scenario(folder: Path, scenario: Scenario) -> None:
    held = read_provenance(folder)
    if held["fingerprint"] == fingerprint(scenario):
        return
    raise RequestError(
        f"{folder}: holds another survey, {held.get('name')!r} from {held.get('started')}, whose "
        f"scenario differs in {', '.join(_differences(held.get('asked', {}), scenario))}; "
        "give another folder with --out, or --fresh to replace it"
    )


def _differences(held: dict[str, Any], scenario: Scenario) -> list[str]:
    asked = scenario.model_dump(mode="json", exclude={"path", "text", "description"})
    return [key for key in asked if asked[key] != held.get(key)] or ["its version"]


def _clear(folder: Path) -> None:
    for name in OURS:
        path = folder / name
        if path.is_dir():
            shutil.rmtree(path)
        else:
            path.unlink(missing_ok=True)

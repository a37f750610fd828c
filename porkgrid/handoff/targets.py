"""The encounter target sheet: what each encounter aims at, for machines (JSON) and for people (Markdown)."""

from __future__ import annotations

import json
import math
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np

from porkgrid.errors import RequestError
from porkgrid.handoff.ccsds import epoch_text
from porkgrid.handoff.trajectory import Burn, EncounterState, Trajectory
from porkgrid.sky.epochs import utc_iso_from_jd_tdb
from porkgrid.survey.folder import write_whole

_AXES = "ICRF; v∞ relative to the body, asymptotes of departure in the axes of the survey's measures"
_TIME = (
    "TDB, and UTC with the leap seconds known to this version (TAI − UTC = 37 s from 2017 on): a leap second "
    "still to be announced moves the UTC of later dates"
)
_AIM = "S along the incoming v∞, T = S × N/|S × N| with N the reference pole, R = S × T"
_NONE = "–"


def write_targets(folder: Path, trajectory: Trajectory) -> list[Path]:
    """Write targets.json and targets.md into the folder; their paths."""
    texts = {"targets.json": targets_json(trajectory), "targets.md": targets_markdown(trajectory)}
    for name, text in texts.items():
        write_whole(folder / name, text)
    return [folder / name for name in texts]


def targets_json(trajectory: Trajectory) -> str:
    """The sheet as a JSON document, numbers in full; null for what is not known or does not apply."""
    return json.dumps(targets_of(trajectory), indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def targets_of(trajectory: Trajectory) -> dict[str, Any]:
    """The sheet as plain data."""
    masses = [each for each in trajectory.quantities if each.unit == "kg"]
    return {
        "scenario": trajectory.name,
        "route": trajectory.route,
        "model": trajectory.model,
        "caution": trajectory.caution,
        "notes": list(trajectory.notes),
        "axes": _AXES,
        "time": _TIME,
        "aim_plane": _AIM,
        "encounters": [_encounter(each) for each in trajectory.encounters],
        "burns": [_burn(each) for each in trajectory.burns],
        "masses_kg": {each.name: _number(each.value) for each in masses},
        "measures": {
            each.name: {"value": _number(each.value), "unit": each.unit, "meaning": each.meaning}
            for each in trajectory.quantities
        },
        "provenance": {
            "porkgrid": trajectory.version,
            "scenario": trajectory.name,
            "ephemeris": trajectory.kernel,
            "kernels": [{"file": name, "sha256": checksum} for name, checksum in trajectory.checksums],
        },
    }


def targets_markdown(trajectory: Trajectory) -> str:
    """The sheet to read: a table per encounter, the burns, the masses, and where it all comes from."""
    lines = [f"# Encounter targets: {_plain(trajectory.name)}", "", f"{_plain(trajectory.route)}", ""]
    lines += [f"Model: {trajectory.model}.", "", f"> {trajectory.caution}", ""]
    lines += [f"Axes: {_AXES}. Time: {_TIME}. Aim plane: {_AIM}.", ""]
    for encounter in trajectory.encounters:
        title = encounter.label if encounter.kind != "flyby" else f"{encounter.label},"
        lines += [f"## {title} {_plain(encounter.body)}", "", *_table(_encounter_rows(encounter)), ""]
    lines += ["## Burns", "", *_burn_table(trajectory), ""]
    masses = [(each.name, f"{each.value:,.1f} kg") for each in trajectory.quantities if each.unit == "kg"]
    lines += ["## Masses", "", *(_table(masses) if masses else [_no_masses(trajectory)]), ""]
    lines += ["## How to read it", "", *(f"- {note}" for note in trajectory.notes), ""]
    lines += ["## Provenance", "", *_table(_provenance_rows(trajectory))]
    return "\n".join(lines) + "\n"


def _no_masses(trajectory: Trajectory) -> str:
    known = any(burn.mass_before_kg is not None for burn in trajectory.burns)
    return "None but those of the burns." if known else "The scenario gives no masses."


def _encounter(state: EncounterState) -> dict[str, Any]:
    return {
        "label": state.label,
        "body": state.body,
        "kind": state.kind,
        **_epoch(state.jd_tdb),
        "v_inf_in_km_s": _vector(state.v_inf_in_km_s),
        "v_inf_out_km_s": _vector(state.v_inf_out_km_s),
        "v_inf_in_speed_km_s": _speed(state.v_inf_in_km_s),
        "v_inf_out_speed_km_s": _speed(state.v_inf_out_km_s),
        "c3_km2_s2": _number(state.c3_km2_s2),
        "rla_deg": _number(state.rla_deg),
        "dla_deg": _number(state.dla_deg),
        "periapsis_radius_km": _number(state.periapsis_km),
        "periapsis_altitude_km": _number(state.altitude_km),
        "b_t_km": _number(state.b_t_km),
        "b_r_km": _number(state.b_r_km),
        "reference_pole": state.aim_pole if state.b_t_km is not None else None,
    }


def _burn(burn: Burn) -> dict[str, Any]:
    return {
        "label": burn.label,
        **_epoch(burn.jd_tdb),
        "dv_km_s": burn.size_km_s,
        "dv_icrf_km_s": _vector(burn.dv_km_s),
        "mass_before_kg": _number(burn.mass_before_kg),
        "propellant_kg": _number(burn.propellant_kg),
    }


def _encounter_rows(state: EncounterState) -> Iterator[tuple[str, str]]:
    yield "epoch, TDB", epoch_text(state.jd_tdb)
    yield "epoch, UTC", _utc(state.jd_tdb) or "UTC in whole seconds begins in 1972"
    for name, vector in (("v∞ in", state.v_inf_in_km_s), ("v∞ out", state.v_inf_out_km_s)):
        if vector is not None:
            x, y, z = vector
            yield f"{name}, x y z", f"{x:.6f}  {y:.6f}  {z:.6f} km/s"
            yield name, f"{np.linalg.norm(vector):.6f} km/s"
    for name, value, unit in (
        ("C3", state.c3_km2_s2, "km²/s²"),
        ("RLA", state.rla_deg, "deg"),
        ("DLA", state.dla_deg, "deg"),
    ):
        if value is not None:
            yield name, f"{value:.5f} {unit}"
    for name, value in (
        ("periapsis radius", state.periapsis_km),
        ("periapsis altitude", state.altitude_km),
        (f"B·T, pole of the {state.aim_pole}", state.b_t_km),
        (f"B·R, pole of the {state.aim_pole}", state.b_r_km),
    ):
        if value is not None:
            yield name, f"{value:.3f} km"


def _burn_table(trajectory: Trajectory) -> list[str]:
    if not trajectory.burns:
        return ["The route makes no burn that the survey counts: it has no parking orbit and no capture."]
    head = ["burn", "epoch, TDB", "Δv km/s", "x y z km/s", "mass before kg", "propellant kg"]
    rows = [
        [
            burn.label,
            epoch_text(burn.jd_tdb),
            f"{burn.size_km_s:.6f}",
            "  ".join(f"{value:.6f}" for value in burn.dv_km_s),
            _NONE if burn.mass_before_kg is None else f"{burn.mass_before_kg:.1f}",
            _NONE if burn.propellant_kg is None else f"{burn.propellant_kg:.1f}",
        ]
        for burn in trajectory.burns
    ]
    return [_row(head), _row(["---"] * len(head)), *map(_row, rows)]


def _provenance_rows(trajectory: Trajectory) -> Iterator[tuple[str, str]]:
    yield "porkgrid", trajectory.version
    yield "scenario", _plain(trajectory.name)
    yield "ephemeris", _plain(trajectory.kernel)
    for name, checksum in trajectory.checksums:
        yield f"SHA-256 of {_plain(name)}", checksum


def _table(rows: Iterator[tuple[str, str]] | list[tuple[str, str]]) -> list[str]:
    return ["| | |", "|---|---|", *(_row(list(row)) for row in rows)]


def _row(cells: list[str]) -> str:
    return f"| {' | '.join(cells)} |"


def _plain(text: str) -> str:
    """Text from a scenario with nothing in it that Markdown reads as markup or as a new line."""
    escaped = "".join(f"\\{c}" if c in "\\`*_[]<>#|" else c for c in text)
    return " ".join(escaped.split())


def _epoch(jd_tdb: float) -> dict[str, Any]:
    return {"epoch_tdb": epoch_text(jd_tdb), "epoch_utc": _utc(jd_tdb), "jd_tdb": float(jd_tdb)}


def _utc(jd_tdb: float) -> str | None:
    """UTC to the millisecond; None before 1972, where it did not run in whole seconds."""
    try:
        return utc_iso_from_jd_tdb(jd_tdb)
    except RequestError:
        return None


def _vector(vector: np.ndarray | None) -> list[float] | None:
    return None if vector is None else [float(value) for value in vector]


def _speed(vector: np.ndarray | None) -> float | None:
    return None if vector is None else float(np.linalg.norm(vector))


def _number(value: float | None) -> float | None:
    return None if value is None or not math.isfinite(value) else float(value)

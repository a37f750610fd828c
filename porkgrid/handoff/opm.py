"""Write states to start from as CCSDS Orbit Parameter Messages (502.0-B-2, key = value notation)."""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterator
from pathlib import Path

from porkgrid.handoff.ccsds import comments, epoch_text, heading, object_name, spacecraft_id, stamp
from porkgrid.handoff.trajectory import Burn, Trajectory, Waypoint
from porkgrid.survey.folder import write_whole

# The standard asks for a mass wherever there is a manoeuvre; one that stands in must be seen to.
_UNIT_MASS_KG = 1.0
_NO_MASS = (
    "The mass is not known to the survey: MASS of 1 kg stands in, since the standard asks for one beside "
    "manoeuvres, and MAN_DELTA_MASS is zero."
)


def write_opms(folder: Path, trajectory: Trajectory, created: dt.datetime) -> list[Path]:
    """Write a message per waypoint into the folder, `departure.opm`, `after-flyby-1.opm`, …; their paths."""
    paths = []
    for waypoint in trajectory.waypoints:
        path = folder / f"{waypoint.label.lower().replace(' ', '-')}.opm"
        write_whole(path, opm_text(trajectory, waypoint, created))
        paths.append(path)
    return paths


def opm_text(trajectory: Trajectory, waypoint: Waypoint, created: dt.datetime) -> str:
    """The message of one waypoint: its state, and a block for each burn before the next waypoint."""
    lines = ["CCSDS_OPM_VERS = 2.0", *heading(trajectory), *comments(trajectory.notes)]
    lines += [
        f"CREATION_DATE = {stamp(created)}",
        "ORIGINATOR = PORKGRID",
        "",
        *comments([f"{waypoint.label}. Burns follow up to the next message of this hand-off."]),
        f"OBJECT_NAME = {object_name(trajectory)}",
        f"OBJECT_ID = {spacecraft_id(trajectory)}",
        f"CENTER_NAME = {waypoint.centre_name}",
        "REF_FRAME = ICRF",
        "TIME_SYSTEM = TDB",
        "",
        f"EPOCH = {epoch_text(waypoint.jd_tdb)}",
    ]
    lines += [f"{axis} = {value:.6f} [km]" for axis, value in zip("XYZ", waypoint.position, strict=True)]
    lines += [
        f"{axis}_DOT = {value:.12f} [km/s]" for axis, value in zip("XYZ", waypoint.velocity, strict=True)
    ]
    if waypoint.burns:
        lines += ["", *_mass(waypoint.burns[0])]
    for burn in waypoint.burns:
        lines += ["", *_manoeuvre(burn)]
    return "\n".join(lines) + "\n"


def _mass(first: Burn) -> Iterator[str]:
    if first.mass_before_kg is None:
        yield from comments([_NO_MASS])
    yield f"MASS = {_UNIT_MASS_KG if first.mass_before_kg is None else first.mass_before_kg:.6f} [kg]"


def _manoeuvre(burn: Burn) -> Iterator[str]:
    yield from comments([f"{burn.label}: {burn.size_km_s:.6f} km/s, impulsive."])
    yield f"MAN_EPOCH_IGNITION = {epoch_text(burn.jd_tdb)}"
    yield "MAN_DURATION = 0.000 [s]"
    yield f"MAN_DELTA_MASS = {-(burn.propellant_kg or 0.0) + 0.0:.6f} [kg]"
    yield "MAN_REF_FRAME = ICRF"
    for n, value in enumerate(burn.dv_km_s, start=1):
        yield f"MAN_DV_{n} = {value:.12f} [km/s]"

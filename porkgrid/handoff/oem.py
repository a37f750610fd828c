"""Write a trajectory as a CCSDS Orbit Ephemeris Message (502.0-B-2, key = value notation)."""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterator
from pathlib import Path

from porkgrid.handoff.ccsds import comments, epoch_text, heading, object_name, spacecraft_id, stamp
from porkgrid.handoff.sampling import DEGREE
from porkgrid.handoff.trajectory import Segment, Trajectory
from porkgrid.survey.folder import write_whole


def write_oem(path: Path, trajectory: Trajectory, created: dt.datetime) -> None:
    """Write the message, whole or not at all; `created`, with a time zone, is all that may vary."""
    write_whole(path, oem_text(trajectory, created))


def oem_text(trajectory: Trajectory, created: dt.datetime) -> str:
    """The message: a block per segment, in order of time, each with the stretch it is meant for."""
    lines = ["CCSDS_OEM_VERS = 2.0", *heading(trajectory), *comments(trajectory.notes)]
    lines += [f"CREATION_DATE = {stamp(created)}", "ORIGINATOR = PORKGRID"]
    for segment in trajectory.segments:
        lines += ["", *_metadata(trajectory, segment), "", *_states(segment)]
    return "\n".join(lines) + "\n"


def _metadata(trajectory: Trajectory, segment: Segment) -> Iterator[str]:
    yield "META_START"
    yield from comments([f"{segment.label}. Model: {segment.model}."])
    first, last = epoch_text(segment.jd_tdb[0]), epoch_text(segment.jd_tdb[-1])
    values = {
        "OBJECT_NAME": object_name(trajectory),
        "OBJECT_ID": str(spacecraft_id(trajectory)),
        "CENTER_NAME": segment.centre_name,
        "REF_FRAME": "ICRF",
        "TIME_SYSTEM": "TDB",
        "START_TIME": first,
        "USEABLE_START_TIME": epoch_text(segment.usable_jd[0]),
        "USEABLE_STOP_TIME": epoch_text(segment.usable_jd[1]),
        "STOP_TIME": last,
        "INTERPOLATION": "HERMITE",
        "INTERPOLATION_DEGREE": str(DEGREE),
    }
    yield from (f"{key} = {value}" for key, value in values.items())
    yield "META_STOP"


def _states(segment: Segment) -> Iterator[str]:
    """One line per state: epoch, km to the millimetre, km/s to the nanometre a second."""
    for jd, position, velocity in zip(segment.jd_tdb, segment.position, segment.velocity, strict=True):
        x, y, z = position
        vx, vy, vz = velocity
        yield f"{epoch_text(jd)} {x:.6f} {y:.6f} {z:.6f} {vx:.12f} {vy:.12f} {vz:.12f}"

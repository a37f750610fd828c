"""Write a trajectory as an SPK file, which SPICE and its readers load beside the planets' kernel.

Type 3, Chebyshev polynomials for position and for velocity over intervals of one length: jplephem reads it
as well as SPICE. Of type 13, which could hold the states as they are, jplephem reads nothing.
"""

from __future__ import annotations

from pathlib import Path
from types import ModuleType

import numpy as np
from numpy.polynomial import chebyshev

from porkgrid.errors import RunError
from porkgrid.handoff.ccsds import ascii_text, heading, spacecraft_id
from porkgrid.handoff.sampling import STEP, interpolate
from porkgrid.handoff.trajectory import Segment, Trajectory
from porkgrid.physics.constants import DAY_S, J2000_JD
from porkgrid.survey.folder import PART

_SUN_ID = 10
_DEGREE = 15
# Length of an interval in the shortest time in which the segment changes its course (sampling.STEP), within
# about which its Taylor series converges: the Chebyshev series then falls threefold a degree, to 2e-8 of the
# little that the course bends. tests/handoff/test_spk.py holds ten metres and ten micrometres a second.
_INTERVAL = 1.5
_LONGEST_ID = 40  # of a segment, set by the format


class SpiceMissingError(Exception):
    """spiceypy is not installed, so that there is no SPK file; the caller has to say so."""

    def __init__(self) -> None:
        super().__init__("spiceypy is not installed: no SPK file; `pip install spiceypy` adds it")


def write_spk(path: Path, trajectory: Trajectory) -> None:
    """Write the file whole or not at all; the bytes depend on the trajectory alone.

    The body is `ccsds.spacecraft_id`. Arcs about the Sun come first and whole, hyperbolas about bodies after
    them: in an SPK file the later segment wins. Hyperbolas about a body without a NAIF number are left out.
    Raises SpiceMissingError without spiceypy, RunError where the file cannot be written.
    """
    spice = _spice()
    part = path.with_name(path.name + PART)
    part.unlink(missing_ok=True)
    try:
        _write(spice, part, trajectory)
        part.replace(path)
    except (spice.exceptions.SpiceyError, OSError) as error:
        reason = getattr(error, "short", "") or getattr(error, "strerror", "") or error
        raise RunError(f"cannot write the SPK file {path}: {reason}") from error
    finally:
        part.unlink(missing_ok=True)


def spk_segments(trajectory: Trajectory) -> list[Segment]:
    """The segments that the file holds, in its order."""
    known = [each for each in trajectory.segments if each.centre_naif_id is not None]
    about_sun = [each for each in known if each.centre_naif_id == _SUN_ID]
    return about_sun + [each for each in known if each.centre_naif_id != _SUN_ID]


def _spice() -> ModuleType:
    try:
        import spiceypy.utils.exceptions
    except ImportError:
        raise SpiceMissingError from None
    return spiceypy


def _write(spice: ModuleType, path: Path, trajectory: Trajectory) -> None:
    remarks = [line.removeprefix("COMMENT ") for line in heading(trajectory)]
    handle = spice.spkopn(str(path), ascii_text(trajectory.name)[:60], 0)
    try:
        spice.dafac(handle, remarks)
        for segment in spk_segments(trajectory):
            _add(spice, handle, spacecraft_id(trajectory), segment)
    except BaseException:
        spice.dafcls(handle)  # spkcls refuses a file without segments, and would hide the fault
        raise
    spice.spkcls(handle)


def _add(spice: ModuleType, handle: int, body: int, segment: Segment) -> None:
    first, last = ((jd - J2000_JD) * DAY_S for jd in segment.jd_tdb[[0, -1]])
    length, coefficients = _polynomials(segment)
    spice.spkw03(
        handle, body, segment.centre_naif_id, "J2000", first, last, ascii_text(segment.label)[:_LONGEST_ID],
        length, len(coefficients), _DEGREE, coefficients.ravel(), first,
    )  # fmt: skip


def _polynomials(segment: Segment) -> tuple[float, np.ndarray]:
    """Seconds of an interval, and coefficients (n, 6, degree + 1) of x, y, z and their rates in each."""
    span_s = segment.seconds[-1]
    shortest_s = _INTERVAL * np.diff(segment.seconds).min() / STEP
    count = int(np.ceil(span_s / shortest_s))
    length = span_s / count * (1.0 + 1e-14)  # so that rounding leaves no gap at the end
    nodes = np.cos(np.pi * (np.arange(_DEGREE + 1) + 0.5) / (_DEGREE + 1))
    seconds = (length * (np.arange(count)[:, None] + 0.5 * (nodes + 1.0))).ravel()
    states = np.concatenate(interpolate(segment.seconds, segment.position, segment.velocity, seconds), axis=1)
    values = states.reshape(count, _DEGREE + 1, 6).transpose(1, 0, 2).reshape(_DEGREE + 1, -1)
    fitted = chebyshev.chebfit(nodes, values, _DEGREE)
    return length, fitted.reshape(_DEGREE + 1, count, 6).transpose(1, 2, 0)

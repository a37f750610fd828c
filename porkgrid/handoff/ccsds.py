"""What CCSDS orbit data messages have in common: names, epochs, comments and numbers in their notation.

CCSDS 502.0-B-2, Orbit Data Messages (memory), key = value notation: printable ASCII, lines of at most 254
characters, text values in upper case.
"""

from __future__ import annotations

import datetime as dt
import hashlib
import textwrap
import unicodedata
from collections.abc import Iterable

import numpy as np

from porkgrid.handoff.trajectory import Trajectory
from porkgrid.sky.bodies import Body
from porkgrid.sky.epochs import iso_from_jd

_COMMENT_WIDTH = 110
_LONGEST_NAME = 60
_UNIX_EPOCH_JD = 2_440_587.5
_DAY_US = 86_400_000_000

# Barycentres: what DE440 has of these systems, and so what the states refer to
_BARYCENTRES = {4: "MARS", 5: "JUPITER", 6: "SATURN", 7: "URANUS", 8: "NEPTUNE", 9: "PLUTO"}

# NAIF gives missions three-digit numbers, their parts numbers × 1000, and satellites of Earth −100 000 minus
# the catalogue number (NAIF Integer ID Codes; memory). No mission holds a number of this stretch.
PRIVATE_IDS = (-9_999_999, -9_000_000)


def object_name(trajectory: Trajectory) -> str:
    """The scenario's name as the notation allows it: ASCII, upper case, single blanks."""
    return ascii_text(trajectory.name).upper()[:_LONGEST_NAME].strip() or "UNNAMED"


def spacecraft_id(trajectory: Trajectory) -> int:
    """A NAIF number for the invented spacecraft, the same for the same name and route, in `PRIVATE_IDS`."""
    key = f"{trajectory.name}\n{trajectory.route}".encode()
    low, high = PRIVATE_IDS
    return high - int.from_bytes(hashlib.sha256(key).digest()[:8]) % (high - low + 1)


def centre_name(body: Body) -> str:
    """A body as the SANA registry of orbit centres calls it."""
    if body.naif_id in _BARYCENTRES and body.name.upper() == _BARYCENTRES[body.naif_id]:
        return f"{_BARYCENTRES[body.naif_id]} BARYCENTER"
    return ascii_text(body.name).upper()


def epoch_text(jd_tdb: float) -> str:
    """A Julian date as a calendar date to the microsecond, same time scale: 2028-11-30T12:00:00.000000.

    Finer than a Julian date in a double, so that what is read back is what was held.
    """
    whole = np.floor(jd_tdb - _UNIX_EPOCH_JD)
    of_day = round((jd_tdb - _UNIX_EPOCH_JD - whole) * _DAY_US)
    return str(np.datetime64(int(whole) * _DAY_US + of_day, "us"))


def stamp(created: dt.datetime) -> str:
    """The creation date of a message; `created` has a time zone."""
    return created.astimezone(dt.UTC).replace(tzinfo=None).isoformat(timespec="seconds")


def comments(sentences: Iterable[str]) -> list[str]:
    """Sentences as COMMENT lines."""
    return [
        f"COMMENT {line}"
        for sentence in sentences
        for line in textwrap.wrap(ascii_text(sentence), _COMMENT_WIDTH)
    ]


def heading(trajectory: Trajectory) -> list[str]:
    """What the head of every message says of where it comes from."""
    kernels = ", ".join(f"{name} (SHA-256 {checksum})" for name, checksum in trajectory.checksums)
    return comments(
        [
            f"Model: {trajectory.model}.",
            f"Scenario: {trajectory.name}. Route: {trajectory.route}.",
            trajectory.caution,
            f"porkgrid {trajectory.version}. Ephemeris: {trajectory.kernel}. Kernels: {kernels}.",
            *(f"{each.label}: {each.body} {iso_from_jd(each.jd_tdb)} TDB" for each in trajectory.encounters),
        ]
    )


def ascii_text(text: str) -> str:
    """Text in printable ASCII: accents dropped, arrows and dashes spelt, other signs as underscores."""
    for sign, spelt in (
        ("→", "->"),
        ("–", "-"),
        ("—", "-"),
        ("−", "-"),
        ("∞", "inf"),
        ("Δ", "d"),
        ("·", "."),
    ):
        text = text.replace(sign, spelt)
    plain = "".join(c for c in unicodedata.normalize("NFKD", text) if not unicodedata.combining(c))
    return " ".join("".join(c if " " <= c <= "~" else "_" for c in plain).split())

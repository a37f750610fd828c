"""What a spacecraft on its way looks like from the Earth: how far off, and how near the Sun in the sky."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from porkgrid.physics.constants import AU_KM
from porkgrid.sky.bodies import find_body
from porkgrid.sky.kernel import Ephemeris

# Nearer than this the path is that of a departure or a flyby, which the legs about the Sun do not show.
NEAR_EARTH_KM = 0.01 * AU_KM
# Practice: within two to three degrees of the Sun, radio links in X band begin to fail.
CONJUNCTION_RAD = np.radians(3.0)


@dataclass(frozen=True, eq=False)
class Sightlines:
    """A flight as seen from the Sun and from the Earth, arrays (k,).

    angle_rad: at the Earth, between the Sun and the spacecraft; NaN within `NEAR_EARTH_KM`. earth_sun_km:
    the Earth's own distance from the Sun.
    """

    jd_tdb: np.ndarray
    sun_km: np.ndarray
    earth_km: np.ndarray
    angle_rad: np.ndarray
    earth_sun_km: np.ndarray


@dataclass(frozen=True)
class Conjunction:
    """A stretch of time near the Sun in the Earth's sky; `beyond` the Sun, or on this side of it."""

    first_jd: float
    last_jd: float
    least_jd: float
    least_rad: float
    beyond: bool


def sightlines(ephemeris: Ephemeris, jd_tdb: np.ndarray, position: np.ndarray) -> Sightlines:
    """Look at heliocentric places (k, 3) km, ICRF axes, at TDB Julian dates (k,) ascending."""
    earth, _ = ephemeris.states(find_body("earth", {}), jd_tdb)
    earth = earth.T
    sight = position - earth
    distance = np.linalg.norm(sight, axis=1)
    across = np.linalg.norm(np.cross(sight, -earth), axis=1)
    angle = np.arctan2(across, -np.sum(sight * earth, axis=1))
    return Sightlines(
        jd_tdb=jd_tdb,
        sun_km=np.linalg.norm(position, axis=1),
        earth_km=distance,
        angle_rad=np.where(distance < NEAR_EARTH_KM, np.nan, angle),
        earth_sun_km=np.linalg.norm(earth, axis=1),
    )


def conjunctions(seen: Sightlines, below_rad: float) -> list[Conjunction]:
    """The stretches in which the angle at the Earth is below a bound, to a straight line between samples."""
    inside = seen.angle_rad < below_rad  # False where it is NaN
    edges = np.flatnonzero(np.diff(np.concatenate(([False], inside, [False])).astype(int)))
    found = []
    for start, end in list(pairwise(edges.tolist()))[::2]:
        least = start + int(np.argmin(seen.angle_rad[start:end]))
        found.append(
            Conjunction(
                first_jd=_crossing(seen, start - 1, start, below_rad),
                last_jd=_crossing(seen, end, end - 1, below_rad),
                least_jd=float(seen.jd_tdb[least]),
                least_rad=float(seen.angle_rad[least]),
                beyond=bool(seen.earth_km[least] > seen.earth_sun_km[least]),
            )
        )
    return found


def _crossing(seen: Sightlines, outside: int, inside: int, below_rad: float) -> float:
    """When the angle passes the bound between two samples; the inner one where there is no outer."""
    if not 0 <= outside < len(seen.jd_tdb) or not np.isfinite(seen.angle_rad[outside]):
        return float(seen.jd_tdb[inside])
    high, low = seen.angle_rad[outside], seen.angle_rad[inside]
    share = (high - below_rad) / (high - low)
    return float(seen.jd_tdb[outside] + share * (seen.jd_tdb[inside] - seen.jd_tdb[outside]))

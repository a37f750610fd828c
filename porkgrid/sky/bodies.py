"""Name the bodies a route can visit, with what the formulas need to know of each."""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from porkgrid.physics.constants import GM_SUN_KM3_S2, J2000_JD, JULIAN_CENTURY_DAYS
from porkgrid.sky.elements import Elements


@dataclass(frozen=True)
class Pole:
    """Direction of a body's north pole in the ICRF at J2000, with its rates per Julian century."""

    ra_deg: float
    ra_rate_deg: float
    dec_deg: float
    dec_rate_deg: float


@dataclass(frozen=True)
class Body:
    """A place to leave, pass or reach; what is not known of it is None.

    The altitudes count from `radius_km`, the equatorial radius. `elements` is set for a small body that
    moves by two-body motion; every other one moves as the ephemeris says for its `naif_id`.
    """

    name: str
    naif_id: int | None
    gm_km3_s2: float | None
    radius_km: float | None
    pole: Pole | None
    min_flyby_altitude_km: float | None
    entry_altitude_km: float | None
    elements: Elements | None = None

    @property
    def title(self) -> str:
        """The name as a text or an axis shows it: "Mars"; a name with capitals of its own keeps them."""
        return self.name.title() if self.name.islower() else self.name

    @property
    def motion(self) -> Literal["kernel", "two-body elements"]:
        """Where the body's states come from."""
        return "kernel" if self.elements is None else "two-body elements"


# GM: DE440, from the comment area of the kernel (Park and others 2021); a test reads them back. From Mars
# outward DE440 has no planets but the barycentres of their systems (ids 4 to 9), and so these are the
# states and the GM of planet and satellites together: 0.01 to 0.03 % above the planet alone at the giants,
# 12 % at Pluto, and a barycentre within about 300 km of the planet's centre (Pluto: 2100 km; memory).
#
# Radii (equatorial) and poles: report of the IAU Working Group on Cartographic Coordinates and Rotational
# Elements 2015 (Archinal and others 2018), memory; the Sun's radius: IAU 2015 resolution B3. Periodic terms
# of the poles are left out where they stay under 0.01 degrees (Mercury, Jupiter). Further:
# - Earth: no pole of date, because the ICRF axes are the convention there. A pole of right ascension 270
#   puts the node on the x axis, so that `pole_axes` is the identity.
# - Mars: the linear form of the 2009 report (Archinal and others 2011); 2015 has periodic terms instead.
# - Neptune: 299.36 + 0.70 sin N, 43.46 - 0.51 cos N with N = 357.85 + 52.316 T, here by the straight lines
#   that fit them best over 1970 to 2100, to 0.06 degrees.
# - Moon: the mean pole; the true one circles it at 1.5 degrees.
#
# Altitudes: practice. Flyby: what missions have dared or planned with a margin over the atmosphere; at the
# giants outside the thick radiation (Jupiter) or the main rings (Saturn, Uranus). Entry: the interface
# where agencies start their entry sequences.
_TABLE = (
    # name, id, GM km³/s², radius km, pole (ra, rate, dec, rate), flyby km, entry km
    Body("sun", 10, GM_SUN_KM3_S2, 695_700.0, Pole(286.13, 0.0, 63.87, 0.0), None, None),
    Body("mercury", 199, 22_031.868551, 2_440.53, Pole(281.0103, -0.0328, 61.4155, -0.0049), 200.0, None),
    Body("venus", 299, 324_858.592, 6_051.8, Pole(272.76, 0.0, 67.16, 0.0), 300.0, 150.0),
    Body("earth", 399, 398_600.435507, 6_378.1366, Pole(270.0, 0.0, 90.0, 0.0), 300.0, 122.0),
    Body("moon", 301, 4_902.800118, 1_737.4, Pole(269.9949, 0.0031, 66.5392, 0.0130), 100.0, None),
    Body("mars", 4, 42_828.375816, 3_396.19, Pole(317.68143, -0.1061, 52.88650, -0.0609), 200.0, 125.0),
    Body(
        "jupiter",
        5,
        126_712_764.1,
        71_492.0,
        Pole(268.056595, -0.006499, 64.495303, 0.002413),
        200_000.0,
        450.0,
    ),
    Body("saturn", 6, 37_940_584.8418, 60_268.0, Pole(40.589, -0.036, 83.537, -0.004), 80_000.0, 450.0),
    Body("uranus", 7, 5_794_556.4, 25_559.0, Pole(257.311, 0.0, -15.175, 0.0), 30_000.0, 1_000.0),
    Body("neptune", 8, 6_836_527.10058, 24_764.0, Pole(299.336, 0.592, 42.955, 0.125), 4_000.0, 1_000.0),
    Body("pluto", 9, 975.5, 1_188.3, Pole(132.993, 0.0, -6.163, 0.0), 1_000.0, None),
)
BODIES: dict[str, Body] = {body.name: body for body in _TABLE}


def find_body(name_or_id: str | int, extra: Mapping[str, Body]) -> Body:
    """Return the body of a name (case does not matter) or NAIF id; bodies in `extra` come first.

    Raises LookupError with the nearest valid name, or with all of them if none is near.
    """
    wanted = str(name_or_id).strip().lower()
    known = [*extra.values(), *BODIES.values()]
    for body in known:
        if wanted == body.name.lower() or (body.naif_id is not None and wanted == str(body.naif_id)):
            return body
    raise LookupError(f"no body {str(name_or_id)!r}; {_suggestion(wanted, known)}")


def gm_of(body: Body) -> float:
    """GM of a body that must have one, km³/s²; admit.load_scenario refuses the others."""
    assert body.gm_km3_s2 is not None
    return body.gm_km3_s2


def radius_of(body: Body) -> float:
    """Equatorial radius of a body that must have one, km; admit.load_scenario refuses the others."""
    assert body.radius_km is not None
    return body.radius_km


def pole_axes(body: Body, jd: ArrayLike) -> NDArray[np.float64]:
    """Return the body's equator axes at TDB Julian dates (...) as matrices (..., 3, 3) on ICRF vectors.

    Rows: x to the ascending node of the body's equator on the ICRF equator, y, and z to its north pole
    (IAU WGCCRE). At Earth the axes are those of the ICRF. Raises ValueError if the pole is not known.
    """
    if body.pole is None:
        raise ValueError(f"the pole of {body.name} is not known")
    century = (np.asarray(jd, dtype=float) - J2000_JD) / JULIAN_CENTURY_DAYS
    ra = np.radians(body.pole.ra_deg + body.pole.ra_rate_deg * century)
    dec = np.radians(body.pole.dec_deg + body.pole.dec_rate_deg * century)
    node = np.stack([-np.sin(ra), np.cos(ra), np.zeros_like(ra)], axis=-1)
    pole = np.stack([np.cos(dec) * np.cos(ra), np.cos(dec) * np.sin(ra), np.sin(dec)], axis=-1)
    return np.stack([node, np.cross(pole, node), pole], axis=-2)


def _suggestion(wanted: str, known: Iterable[Body]) -> str:
    names = {body.name.lower(): body.name for body in known}
    near = difflib.get_close_matches(wanted, names, n=1)
    if near:
        return f'did you mean "{names[near[0]]}"?'
    return f"there are {', '.join(names.values())}, or a body of your own in [bodies]"

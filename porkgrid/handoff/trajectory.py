"""A trajectory as plain data, whatever model it comes from: what every hand-off writer reads.

Axes are those of the ICRF, epochs TDB Julian dates, km, km/s, kg.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from porkgrid.physics.constants import DAY_S


@dataclass(frozen=True, eq=False)
class Segment:
    """A piece of the path about one centre, smooth throughout: no burn lies inside it.

    jd_tdb (k,) ascending, position (k, 3) and velocity (k, 3) from the centre; k >= 4, which interpolation
    of degree 7 needs. `centre_name` is as in the SANA registry: "SUN", "EARTH", "MARS BARYCENTER";
    `centre_naif_id` is None for a body that has none. Only from `usable_jd[0]` to `usable_jd[1]` is this
    segment the one to use; beyond, a neighbour about another centre is.
    """

    label: str
    centre_name: str
    centre_naif_id: int | None
    model: str
    jd_tdb: np.ndarray
    position: np.ndarray
    velocity: np.ndarray
    usable_jd: tuple[float, float]

    @property
    def seconds(self) -> np.ndarray:
        """Times (k,) of the states, s from the first."""
        return (self.jd_tdb - self.jd_tdb[0]) * DAY_S


@dataclass(frozen=True, eq=False)
class Burn:
    """An impulsive change of velocity by `dv_km_s` (3,); masses are None where they are not known."""

    label: str
    jd_tdb: float
    dv_km_s: np.ndarray
    mass_before_kg: float | None = None
    propellant_kg: float | None = None

    @property
    def size_km_s(self) -> float:
        """How much speed it costs."""
        return float(np.linalg.norm(self.dv_km_s))


@dataclass(frozen=True, eq=False)
class EncounterState:
    """A body met; what does not apply, or is not known, is None.

    kind: "departure", "flyby" or "arrival". v∞ vectors (3,) are relative to the body. B·T and B·R refer to
    `aim_pole`. C3, and right ascension and declination of the launch asymptote, belong to a departure.
    """

    label: str
    body: str
    kind: str
    jd_tdb: float
    v_inf_in_km_s: np.ndarray | None = None
    v_inf_out_km_s: np.ndarray | None = None
    periapsis_km: float | None = None
    altitude_km: float | None = None
    b_t_km: float | None = None
    b_r_km: float | None = None
    aim_pole: str = "ecliptic of J2000"
    c3_km2_s2: float | None = None
    rla_deg: float | None = None
    dla_deg: float | None = None


@dataclass(frozen=True, eq=False)
class Waypoint:
    """A state (3,), (3,) to start from, and the burns that follow it before the next waypoint."""

    label: str
    centre_name: str
    jd_tdb: float
    position: np.ndarray
    velocity: np.ndarray
    burns: tuple[Burn, ...] = ()


@dataclass(frozen=True)
class Quantity:
    """A number of the whole route under the name that a survey gives it."""

    name: str
    value: float
    unit: str
    meaning: str


@dataclass(frozen=True, eq=False)
class Trajectory:
    """A candidate as it leaves for detailed analysis.

    Segments stand in order of time, and their usable stretches do not overlap. `notes` are sentences about
    how the model is to be read. `checksums` holds (file name, SHA-256) of each kernel used.
    """

    name: str
    route: str
    model: str
    segments: tuple[Segment, ...]
    waypoints: tuple[Waypoint, ...]
    encounters: tuple[EncounterState, ...]
    burns: tuple[Burn, ...]
    quantities: tuple[Quantity, ...]
    notes: tuple[str, ...]
    caution: str
    kernel: str
    checksums: tuple[tuple[str, str], ...]
    version: str

"""Place small bodies from osculating elements, by two-body motion round the Sun."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from porkgrid.physics.conics import ecliptic_to_icrf, elements_to_perihelion_state, propagate
from porkgrid.physics.constants import AU_KM, DAY_S, GM_SUN_KM3_S2


@dataclass(frozen=True)
class Elements:
    """Heliocentric osculating elements in the ecliptic and equinox of J2000 (IAU 1976), epochs TDB.

    Perihelion distance and date serve every eccentricity. `epoch_jd` says when the elements osculate; the
    motion itself does not need it, but the farther a date is from it the less the two-body orbit is worth.
    """

    epoch_jd: float
    q_au: float
    e: float
    i_deg: float
    node_deg: float
    argument_deg: float
    perihelion_jd: float


def elements_states(elements: Elements, jd: ArrayLike) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return heliocentric ICRF positions (3, n) km and velocities (3, n) km/s at TDB Julian dates (n,)."""
    r, v = elements_to_perihelion_state(
        elements.q_au * AU_KM,
        elements.e,
        math.radians(elements.i_deg),
        math.radians(elements.node_deg),
        math.radians(elements.argument_deg),
        GM_SUN_KM3_S2,
    )
    since_perihelion_s = (np.asarray(jd, dtype=float) - elements.perihelion_jd) * DAY_S
    positions, velocities = propagate(r, v, since_perihelion_s, GM_SUN_KM3_S2)
    return (
        np.ascontiguousarray(ecliptic_to_icrf(positions).T),
        np.ascontiguousarray(ecliptic_to_icrf(velocities).T),
    )


def perihelion_epoch_jd(epoch_jd: float, a_au: float, mean_anomaly_deg: float, gm: float) -> float:
    """Return the perihelion date that a mean anomaly at an epoch means; gm in km³/s².

    On an ellipse it is the perihelion nearest the epoch. A hyperbola has a negative semi-major axis and a
    mean anomaly that counts from its only perihelion; a parabola has neither, so give its date instead.
    """
    mean_motion_rad_s = math.sqrt(gm / (abs(a_au) * AU_KM) ** 3)
    anomaly_deg = math.remainder(mean_anomaly_deg, 360.0) if a_au > 0.0 else mean_anomaly_deg
    return epoch_jd - math.radians(anomaly_deg) / mean_motion_rad_s / DAY_S

"""How far a body's hyperbola is the path, and how long it takes from periapsis to there.

km, km/s, s, km³/s². Curtis, Orbital Mechanics for Engineering Students, sections 3.5 and 8.4 (memory).
"""

from __future__ import annotations

import numpy as np

from porkgrid.physics.constants import GM_SUN_KM3_S2
from porkgrid.physics.flyby import eccentricity


def sphere_of_influence_km(gm: float, sun_distance_km: float) -> float:
    """Radius within which a body, rather than the Sun, is the centre: R (gm/gm_sun)^(2/5), after Laplace."""
    return sun_distance_km * (gm / GM_SUN_KM3_S2) ** 0.4


def seconds_from_periapsis(v_inf: float, periapsis_km: float, gm: float, radius_km: float) -> float:
    """Time between periapsis and a radius on the hyperbola of this excess speed; 0 for a radius below it.

    r = a (e cosh F − 1), t = sqrt(a³/gm) (e sinh F − F).
    """
    if radius_km <= periapsis_km:
        return 0.0
    a = gm / v_inf**2
    e = float(eccentricity(v_inf, periapsis_km, gm))
    anomaly = np.arccosh((radius_km / a + 1.0) / e)
    return float(np.sqrt(a**3 / gm) * (e * np.sinh(anomaly) - anomaly))

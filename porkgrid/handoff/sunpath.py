"""The whole flight about the Sun at even steps, from the segments of a trajectory, for figures over time."""

from __future__ import annotations

import numpy as np

from porkgrid.handoff.sampling import interpolate
from porkgrid.handoff.trajectory import Trajectory
from porkgrid.physics.constants import DAY_S

_STEP_DAYS = 0.5  # the angle to the Sun changes by half a degree in it, and a conjunction takes days
_MOST, _LEAST = 6000, 200  # epochs per leg


def sun_path(trajectory: Trajectory) -> tuple[np.ndarray, np.ndarray]:
    """TDB Julian dates (k,) ascending and heliocentric positions (k, 3) km on the legs about the Sun.

    Where the trajectory is told from a body alone, for a few days about an encounter, there is a gap.
    """
    dates: list[np.ndarray] = []
    places: list[np.ndarray] = []
    for segment in trajectory.segments:
        if segment.centre_name != "SUN":
            continue
        first, last = segment.jd_tdb[[0, -1]]
        count = int(np.clip((last - first) / _STEP_DAYS, _LEAST, _MOST))
        jd = np.linspace(first, last, count)
        if dates and jd[0] == dates[-1][-1]:  # arcs from centre to centre share the epoch between them
            jd = jd[1:]
        seconds = (jd - first) * DAY_S
        dates.append(jd)
        places.append(interpolate(segment.seconds, segment.position, segment.velocity, seconds)[0])
    return np.concatenate(dates), np.concatenate(places)

"""Tell the season on Mars."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from porkgrid.sky.bodies import BODIES, pole_axes


def mars_ls_deg(position: ArrayLike, velocity: ArrayLike, jd: ArrayLike) -> NDArray[np.float64]:
    """Return the areocentric longitude of the Sun, Ls, in degrees (n,) from 0 (northern spring) to 360.

    position (3, n) km and velocity (3, n) km/s of Mars from the Sun in ICRF axes, jd (n,) TDB. Geometric:
    no light time. Counted in the orbit plane of the moment, from the node where the Sun crosses to the
    north of the planet's equator.
    """
    position = np.asarray(position, dtype=float).T
    normal = np.cross(position, np.asarray(velocity, dtype=float).T)
    normal /= np.linalg.norm(normal, axis=-1, keepdims=True)
    equinox = np.cross(pole_axes(BODIES["mars"], jd)[..., 2, :], normal)
    solstice = np.cross(normal, equinox)
    to_sun = -position
    along = np.sum(to_sun * equinox, axis=-1)
    ahead = np.sum(to_sun * solstice, axis=-1)
    return np.mod(np.degrees(np.arctan2(ahead, along)), 360.0)

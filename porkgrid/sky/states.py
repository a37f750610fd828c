"""Hold the states of one encounter's body on its dates: the table a grid of legs reads."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from porkgrid.sky.bodies import Body
from porkgrid.sky.kernel import Ephemeris


@dataclass(frozen=True, eq=False)
class StateTable:
    """A body's heliocentric ICRF states: jd (n,) TDB, position (3, n) km, velocity (3, n) km/s."""

    body: Body
    jd: NDArray[np.float64]
    position: NDArray[np.float64]
    velocity: NDArray[np.float64]


def state_table(ephemeris: Ephemeris, body: Body, jd: ArrayLike) -> StateTable:
    """Tabulate a body at TDB Julian dates (n,); RequestError where the ephemeris has no such state."""
    epochs = np.ascontiguousarray(jd, dtype=float)
    position, velocity = ephemeris.states(body, epochs)
    return StateTable(body, epochs, position, velocity)

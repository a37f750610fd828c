"""Bodies' motion over the days about given dates, as series: states for a search at no cost.

A call to the kernel costs a millisecond however few dates it is asked for; a local search asks for a handful
of dates again and again. Chebyshev series through the kernel's own states (Press et al., Numerical Recipes,
section 5.8; memory) give them in microseconds.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.polynomial import chebyshev

from porkgrid.physics.constants import DAY_S
from porkgrid.sky.bodies import Body
from porkgrid.sky.kernel import Ephemeris

# A series is taken as whole when its last terms are below a tenth of a metre.
_TAIL_KM = 1e-4
_FEWEST_NODES, _MOST_NODES = 16, 1024
_HOLDS = 1.002  # half spans: the highest terms, below 1 inside, are some tens there


@dataclass(frozen=True, eq=False)
class Tracks:
    """A body's heliocentric ICRF states over spans of dates (c, 2), TDB Julian dates.

    series (c, 6, nodes): Chebyshev coefficients of position, km, and velocity, km/s.
    """

    body: Body
    spans: np.ndarray
    series: np.ndarray

    def states(self, which: np.ndarray, jd: np.ndarray) -> np.ndarray:
        """States (6, a, p) at dates (a, p) in the spans numbered `which` (a,).

        A little beyond its span a series still holds; dates farther out count as so far.
        """
        first, last = self.spans[which].T[:, :, None]
        t = (2.0 * jd - first - last) / (last - first)
        terms = chebyshev.chebvander(np.clip(t, -_HOLDS, _HOLDS), self.series.shape[-1] - 1)
        return np.moveaxis(self.series[which] @ np.swapaxes(terms, 1, 2), 1, 0)


def tracks(ephemeris: Ephemeris, body: Body, spans: np.ndarray) -> Tracks:
    """Tracks of a body over spans of dates (c, 2), true to better than a metre.

    The number of nodes is doubled until the last terms say so, up to a thousand: a moon that goes round in
    hours would need more over weeks, and is placed less well.
    """
    spans = np.clip(spans, *ephemeris.coverage(body))
    nodes = _FEWEST_NODES
    while True:
        series = _series(ephemeris, body, spans, nodes)
        if np.max(np.abs(series[:, :3, -2:])) < _TAIL_KM or nodes >= _MOST_NODES:
            return Tracks(body, spans, series)
        nodes *= 2


def _series(ephemeris: Ephemeris, body: Body, spans: np.ndarray, nodes: int) -> np.ndarray:
    """Coefficients (c, 6, nodes) of the polynomials through the Chebyshev nodes of each span."""
    angle = np.pi * (np.arange(nodes) + 0.5) / nodes
    middle, half = spans.mean(axis=1), 0.5 * (spans[:, 1] - spans[:, 0])
    ahead = half[:, None] * np.cos(angle)
    jd = middle[:, None] + ahead
    states = np.concatenate(ephemeris.states(body, jd.ravel())).reshape(6, len(spans), nodes)
    # A Julian date is rounded to 40 microseconds, which is two metres of Mercury's way
    states[:3] += states[3:] * DAY_S * (ahead - (jd - middle[:, None]))
    weights = 2.0 / nodes * np.cos(np.arange(nodes) * angle[:, None])
    weights[:, 0] /= 2.0
    return np.swapaxes(states, 0, 1) @ weights

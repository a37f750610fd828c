"""At which epochs a path is written down, so that interpolation between them gives it back."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from porkgrid.physics.conics import propagate
from porkgrid.physics.constants import DAY_S

DEGREE = 7  # Hermite over four states, which is what readers of ephemeris messages offer

# The step in units of 1/`course_rate`, within about which a path's Taylor series converges: degree 7 then
# misses by about r · step⁸. tests/handoff/test_oem.py holds the kilometre that the message promises.
STEP = 0.06
_LEAST_STATES = 8


def course_rate(r: np.ndarray, v: np.ndarray, gm: float) -> float:
    """How fast gravity and motion change the course at a place (3,) from a centre, 1/s."""
    return float(np.sqrt(gm / np.linalg.norm(r) ** 3 + (v @ v) / (r @ r)))


def sample_seconds(rate_at: Callable[[float], float], span_s: float) -> np.ndarray:
    """Times (k,) from 0 to `span_s` at which to take states of a path.

    rate_at: `course_rate` at a time. A fast hyperbola is to begin or end at its periapsis: steps are laid
    from the end where the rate is greater, since far out they are long enough to leap over a periapsis.
    """
    backward = rate_at(span_s) > rate_at(0.0)
    times = [0.0]
    while times[-1] < span_s:
        times.append(times[-1] + STEP / rate_at(span_s - times[-1] if backward else times[-1]))
    if len(times) < _LEAST_STATES:
        return np.linspace(0.0, span_s, _LEAST_STATES)
    laid = np.array(times) * (span_s / times[-1])
    return span_s - laid[::-1] if backward else laid


def sample_conic(
    r: np.ndarray, v: np.ndarray, gm: float, jd_at: float, first_jd: float, last_jd: float
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Epochs (k,), positions (k, 3) and velocities (k, 3) of the conic with state r, v at `jd_at`.

    The states are those of the epochs as they are held, a double each, so that no rounding of a Julian date
    (20 microseconds, half a metre at 30 km/s) comes between them.
    """
    start_s = (first_jd - jd_at) * DAY_S

    def rate_at(at_s: float) -> float:
        return course_rate(*propagate(r, v, start_s + at_s, gm), gm)

    seconds = sample_seconds(rate_at, (last_jd - first_jd) * DAY_S)
    jd = first_jd + seconds / DAY_S
    jd[0], jd[-1] = first_jd, last_jd
    position, velocity = propagate(r, v, (jd - jd_at) * DAY_S, gm)
    return jd, position, velocity


def interpolate(
    nodes_s: np.ndarray, position: np.ndarray, velocity: np.ndarray, at_s: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Positions and velocities (m, 3) at times (m,), as a reader of states at `nodes_s` (k,) finds them.

    Hermite of `DEGREE` through the four states (k, 3) nearest to the interval that holds the time.
    """
    from scipy.interpolate import KroghInterpolator  # scipy is dear to import

    states = (DEGREE + 1) // 2
    holding = np.searchsorted(nodes_s, at_s, side="right") - 1
    first = np.clip(holding - states // 2 + 1, 0, len(nodes_s) - states)
    found_r, found_v = np.empty((len(at_s), 3)), np.empty((len(at_s), 3))
    for start in np.unique(first):
        here, inside = slice(start, start + states), first == start
        data = np.stack([position[here], velocity[here]], axis=1).reshape(-1, 3)
        middle = nodes_s[here].mean()
        curve = KroghInterpolator(np.repeat(nodes_s[here] - middle, 2), data)
        found_r[inside], found_v[inside] = curve.derivatives(at_s[inside] - middle, 2)
    return found_r, found_v

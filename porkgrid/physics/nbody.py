"""Fly a massless probe among point masses whose paths are given, and tell how the end hangs on the start.

Equations of motion about the central body (Battin, An Introduction to the Mathematics and Methods of
Astrodynamics, section 8.2; memory), r the probe and r_j the bodies from the central one:

    r'' = −gm r/|r|³ + Σ gm_j [ (r_j − r)/|r_j − r|³ − r_j/|r_j|³ ]

The second part in the bracket is the pull on the centre itself, which carries the axes along. Near one of the
bodies it is better to integrate ρ = r − r_j, whose digits are those of the distance to it: ρ'' = r'' − r_j'',
with the body's own acceleration from its track. That is the same motion, told from an `origin`: CENTRE, or
the number of a body. The sensitivity Φ = ∂(end)/∂(start) obeys Φ' = [[0, 1], [∂r''/∂r, 0]] Φ and is
integrated beside the path (section 9.2).

Integration: Dormand and Prince's pair of order 8 (Hairer, Norsett and Wanner, Solving Ordinary Differential
Equations I, 1993; memory) as scipy has it. Times in s, km, km/s, km³/s²; states (6,) are position and
velocity.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numba import njit
from numpy.typing import NDArray
from scipy.integrate import solve_ivp

from porkgrid.physics.timeflight import PLAIN
from porkgrid.physics.tracks import Tracks, fill_acceleration, fill_positions

Floats = NDArray[np.float64]

CENTRE = -1
METHOD = "DOP853"
# Relative tolerance per step, near the least that doubles bear (scipy: 100 roundings), and absolute ones far
# under it, so that a component that passes through zero does not stop the integration.
RTOL = 3e-14
ATOL_KM, ATOL_KM_S = 1e-7, 1e-13
# The sensitivity steers Newton's method and needs no more than a few digits of its own.
RTOL_SENSITIVITY = 1e-9
_ATOL_SENSITIVITY = np.block(
    [[np.full((3, 3), 1e-6), np.full((3, 3), 1.0)], [np.full((3, 3), 1e-13), np.full((3, 3), 1e-6)]]
)


@dataclass(frozen=True, eq=False)
class Field:
    """What pulls: the central body's gm, and those (b,) of the bodies on the tracks about it; 0 pulls not."""

    gm_centre: float
    gm: Floats
    tracks: Tracks


class FlightError(Exception):
    """Nothing to fly from, or steps that became too small, as they do through a body's centre."""


@dataclass(frozen=True, eq=False)
class Arc:
    """A path as integrated: times (k,) s in the order flown, states (6, k) at the integrator's own steps.

    `between` gives the states (6, m) at any times (m,) of the flight, by the method's own interpolation.
    """

    t_s: Floats
    states: Floats
    between: Callable[[Floats], Floats]


def acceleration(field: Field, t_s: float, state: Floats, origin: int) -> Floats:
    """Acceleration (3,) km/s² of a probe in this state (6,) from the origin."""
    return _motion(t_s, np.ascontiguousarray(state), origin, *_arguments(field))[3:]


def fly(field: Field, t0_s: float, t1_s: float, state: Floats, origin: int) -> Arc:
    """Carry a state (6,) from one time to another, forwards or backwards. FlightError if it cannot be."""
    _refuse_unknown(state)
    arguments = (origin, *_arguments(field))
    atol = np.repeat([ATOL_KM, ATOL_KM_S], 3)
    path = solve_ivp(
        lambda t, y: _motion(t, y, *arguments),
        (t0_s, t1_s), state, METHOD, rtol=RTOL, atol=atol, dense_output=True,
    )  # fmt: skip
    _refuse_broken(path)
    return Arc(path.t, path.y, path.sol)


def fly_with_sensitivity(
    field: Field, t0_s: float, t1_s: float, state: Floats, origin: int
) -> tuple[Floats, Floats]:
    """The state (6,) at the end, and the sensitivity (6, 6) of it to the state at the start."""
    _refuse_unknown(state)
    arguments = (origin, *_arguments(field))
    start = np.concatenate([state, np.eye(6).ravel()])
    rtol = np.repeat([RTOL, RTOL_SENSITIVITY], [6, 36])
    atol = np.concatenate([np.repeat([ATOL_KM, ATOL_KM_S], 3), _ATOL_SENSITIVITY.ravel()])
    path = solve_ivp(
        lambda t, y: _motion_and_sensitivity(t, y, *arguments),
        (t0_s, t1_s), start, METHOD, rtol=rtol, atol=atol, t_eval=[t1_s],
    )  # fmt: skip
    _refuse_broken(path)
    return path.y[:6, -1], path.y[6:, -1].reshape(6, 6)


def _refuse_unknown(state: Floats) -> None:
    if not np.isfinite(state).all():
        raise FlightError("the state to start from is not known")


def _refuse_broken(path: Any) -> None:
    if not path.success or not np.isfinite(path.y).all():
        raise FlightError(str(path.message))


def _arguments(field: Field) -> tuple[float, Floats, float, float, Floats]:
    tracks = field.tracks
    return field.gm_centre, field.gm, tracks.start_s, tracks.piece_s, tracks.coefficients


@njit(**PLAIN)
def _motion(t, y, origin, gm_centre, gm, start, length, coefficients):
    """y' of y = (ρ, v)."""
    places = np.empty((gm.shape[0], 3))
    fill_positions(t, start, length, coefficients, places)
    out, r = np.empty(6), np.empty(3)
    for i in range(3):
        out[i] = y[3 + i]
        r[i] = y[i] if origin < 0 else places[origin, i] + y[i]
    cube = (r[0] * r[0] + r[1] * r[1] + r[2] * r[2]) ** 1.5
    for i in range(3):
        out[3 + i] = -gm_centre * r[i] / cube
    if origin >= 0:
        carried = np.empty(3)
        fill_acceleration(t, start, length, coefficients, origin, carried)
        for i in range(3):
            out[3 + i] -= carried[i]
    for b in range(gm.shape[0]):
        if gm[b] == 0.0:
            continue
        px, py, pz = places[b]
        dx, dy, dz = px - r[0], py - r[1], pz - r[2]
        if b == origin:
            dx, dy, dz = -y[0], -y[1], -y[2]
        near = gm[b] / (dx * dx + dy * dy + dz * dz) ** 1.5
        far = gm[b] / (px * px + py * py + pz * pz) ** 1.5
        out[3] += near * dx - far * px
        out[4] += near * dy - far * py
        out[5] += near * dz - far * pz
    return out


@njit(**PLAIN)
def _motion_and_sensitivity(t, y, origin, gm_centre, gm, start, length, coefficients):
    """y' of y = (ρ, v, Φ by rows)."""
    places = np.empty((gm.shape[0], 3))
    fill_positions(t, start, length, coefficients, places)
    out, gradient, r = np.empty(42), np.zeros((3, 3)), y[:3].copy()
    out[:6] = _motion(t, y[:6], origin, gm_centre, gm, start, length, coefficients)
    if origin >= 0:
        r += places[origin]
    _add_gradient(gm_centre, r, gradient)
    for b in range(gm.shape[0]):
        if gm[b] != 0.0:
            _add_gradient(gm[b], y[:3] if b == origin else r - places[b], gradient)
    for j in range(6):
        for i in range(3):
            out[6 + 6 * i + j] = y[6 + 6 * (3 + i) + j]
            total = 0.0
            for k in range(3):
                total += gradient[i, k] * y[6 + 6 * k + j]
            out[6 + 6 * (3 + i) + j] = total
    return out


@njit(**PLAIN)
def _add_gradient(gm, d, gradient):
    """Add ∂(−gm d/|d|³)/∂d = gm (3 d dᵀ/|d|⁵ − 1/|d|³)."""
    square = d[0] * d[0] + d[1] * d[1] + d[2] * d[2]
    cube = gm / (square * math.sqrt(square))
    for i in range(3):
        gradient[i, i] -= cube
        for k in range(3):
            gradient[i, k] += 3.0 * cube * d[i] * d[k] / square

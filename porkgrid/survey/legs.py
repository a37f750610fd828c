"""Legs: a Lambert solve for every pair of dates of two encounters."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numba import njit

from porkgrid.physics.arcs import distance_range, transfer_angle
from porkgrid.physics.constants import DAY_S, GM_SUN_KM3_S2
from porkgrid.physics.lambert import BLOCK, ECLIPTIC_POLE_ICRF, SCRATCH_ROWS, lambert_fan, norm_row
from porkgrid.physics.timeflight import PLAIN, ROW
from porkgrid.sky.states import StateTable

_POLE = np.array(ECLIPTIC_POLE_ICRF)


@dataclass(frozen=True)
class LegOption:
    """One way to fly a leg: whole revolutions, which of the two solutions, and the direction."""

    revs: int = 0
    right: bool = False
    retrograde: bool = False

    @property
    def branch(self) -> int:
        """−1 left, +1 right, 0 without revolutions."""
        return 0 if self.revs == 0 else (1 if self.right else -1)


def leg_options(max_revs: int, retrograde: bool) -> list[LegOption]:
    """Every option of a leg: no revolutions, then both branches of 1 to `max_revs`."""
    options = [LegOption(0, False, retrograde)]
    for revs in range(1, max_revs + 1):
        options += [LegOption(revs, False, retrograde), LegOption(revs, True, retrograde)]
    return options


@dataclass
class LegCells:
    """One leg in every cell of a grid of n × m dates; NaN where it cannot be flown.

    Vectors are in ICRF axes with the components first; shapes broadcast to (3, n, m).
    """

    r1: np.ndarray  # km, heliocentric, of the body left
    r2: np.ndarray  # km, of the body reached
    body_velocity1: np.ndarray  # km/s, heliocentric
    body_velocity2: np.ndarray
    jd2: np.ndarray  # TDB Julian date of reaching it, broadcasts to (n, m)
    tof_days: np.ndarray  # (n, m)
    v_inf_out: np.ndarray  # (3, n, m) km/s, relative to the body left
    v_inf_in: np.ndarray  # (3, n, m) km/s, relative to the body reached
    status: np.ndarray  # (n, m) what became of the problem: physics.lambert
    revs: np.ndarray  # (n, m)
    branch: np.ndarray  # (n, m): −1 left, +1 right, 0 without revolutions

    @cached_property
    def transfer_angle_rad(self) -> np.ndarray:
        """(n, m) angle swept in the last revolution, 0 to 2π."""
        return transfer_angle(self.r1, self.r2, self.v_inf_out + self.body_velocity1)

    @cached_property
    def sun_range_km(self) -> tuple[np.ndarray, np.ndarray]:
        """Least and greatest distance from the Sun on the arc flown, (n, m) each."""
        v1, v2 = self.v_inf_out + self.body_velocity1, self.v_inf_in + self.body_velocity2
        return distance_range(self.r1, v1, self.r2, v2, self.revs > 0, GM_SUN_KM3_S2)


def solve_leg(departure: StateTable, arrival: StateTable, option: LegOption) -> LegCells:
    """Fly one option of a leg between all dates of two tables."""
    n, m = len(departure.jd), len(arrival.jd)
    v_out, v_in = np.empty((3, n, m)), np.empty((3, n, m))
    status = np.empty((n, m), dtype=np.int8)
    _leg_grid(
        departure.jd, departure.position, departure.velocity,
        arrival.jd, arrival.position, arrival.velocity,
        GM_SUN_KM3_S2, _POLE, -1.0 if option.retrograde else 1.0, option.revs, option.right,
        v_out, v_in, status,
    )  # fmt: skip
    return LegCells(
        r1=departure.position[:, :, None],
        r2=arrival.position[:, None, :],
        body_velocity1=departure.velocity[:, :, None],
        body_velocity2=arrival.velocity[:, None, :],
        jd2=arrival.jd[None, :],
        tof_days=arrival.jd[None, :] - departure.jd[:, None],
        v_inf_out=v_out,
        v_inf_in=v_in,
        status=status,
        revs=np.full((n, m), option.revs, dtype=np.int8),
        branch=np.full((n, m), option.branch, dtype=np.int8),
    )


@njit(**PLAIN)
def _leg_grid(jd1, x1, u1, jd2, x2, u2, gm, pole, way, revs, right, v_out, v_in, status):
    """Excess speeds at both ends for all dates: v_out, v_in (3, n, m); x, u are (3, dates) states."""
    for left in range(0, jd2.shape[0], BLOCK):
        end = min(left + BLOCK, jd2.shape[0])
        b, w2 = x2[:, left:end].copy(), u2[:, left:end].copy()
        scratch = np.empty((SCRATCH_ROWS, end - left))
        v1, v2, d2 = np.empty_like(b), np.empty_like(b), np.empty(end - left)
        norm_row(b, d2)
        tof = np.empty(end - left)
        for i in range(jd1.shape[0]):
            _seconds_between(jd1[i], jd2[left:end], tof)
            lambert_fan(
                x1[:, i], b, d2, tof, gm, pole, way, revs, right, scratch, v1, v2, status[i, left:end]
            )
            for k in range(3):
                _minus_constant(v1[k], u1[k, i], v_out[k, i, left:end])
                _minus(v2[k], w2[k], v_in[k, i, left:end])


@njit(**PLAIN)
def energy_and_arrival_speed(jd1, x1, u1, jd2, x2, u2, gm, pole, way, c3, v_arrival):
    """Only C3 (n, m) km²/s² and arrival excess speed (n, m) km/s of flights without revolutions.

    The leanest form of a survey, for grids so large that nothing else can be kept.
    """
    for left in range(0, jd2.shape[0], BLOCK):
        end = min(left + BLOCK, jd2.shape[0])
        b, w2 = x2[:, left:end].copy(), u2[:, left:end].copy()
        scratch = np.empty((SCRATCH_ROWS, end - left))
        v1, v2, d2 = np.empty_like(b), np.empty_like(b), np.empty(end - left)
        norm_row(b, d2)
        tof, status = np.empty(end - left), np.empty(end - left, dtype=np.int8)
        for i in range(jd1.shape[0]):
            _seconds_between(jd1[i], jd2[left:end], tof)
            lambert_fan(x1[:, i], b, d2, tof, gm, pole, way, 0, False, scratch, v1, v2, status)
            _energy_row(v1, u1[:, i], v2, w2, c3[i, left:end], v_arrival[i, left:end])


@njit(**ROW)
def _seconds_between(jd1, jd2, tof):
    for j in range(jd2.shape[0]):
        tof[j] = (jd2[j] - jd1) * DAY_S


@njit(**ROW)
def _minus_constant(a, b, out):
    for j in range(a.shape[0]):
        out[j] = a[j] - b


@njit(**ROW)
def _minus(a, b, out):
    for j in range(a.shape[0]):
        out[j] = a[j] - b[j]


@njit(**ROW)
def _energy_row(v1, w1, v2, w2, c3, v_arrival):
    px, py, pz = w1[0], w1[1], w1[2]
    for j in range(c3.shape[0]):
        x, y, z = v1[0, j] - px, v1[1, j] - py, v1[2, j] - pz
        c3[j] = x * x + y * y + z * z
        x, y, z = v2[0, j] - w2[0, j], v2[1, j] - w2[1, j], v2[2, j] - w2[2, j]
        v_arrival[j] = math.sqrt(x * x + y * y + z * z)

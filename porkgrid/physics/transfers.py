"""Transfers between circular coplanar orbits by tangent burns, as floors to compare with.

Any astrodynamics text, for instance Curtis, Orbital Mechanics for Engineering Students, sections 6.2 and 6.3
(memory). Radii in km from the central body, GM in km³/s², times in s, speeds in km/s; arrays broadcast.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

Floats = NDArray[np.float64]

_MOST_STEPS = 60  # Newton from above on a convex function: a dozen are enough for any ratio of radii


class Transfer(NamedTuple):
    """What a transfer takes: the change of speed at each burn and the time of flight; arrays (...)."""

    departure_km_s: Floats
    middle_km_s: Floats  # 0 where there are two burns only
    arrival_km_s: Floats
    tof_s: Floats

    @property
    def total_km_s(self) -> Floats:
        """Sum of the burns."""
        return self.departure_km_s + self.middle_km_s + self.arrival_km_s


def hohmann(r1: ArrayLike, r2: ArrayLike, gm: ArrayLike) -> Transfer:
    """Half an ellipse from the circle r1 to the circle r2, tangent to both: the cheapest with two burns."""
    r1, r2, gm = (np.asarray(each, dtype=float) for each in (r1, r2, gm))
    departure = np.abs(_apsis_speed(r1, r2, gm) - _circle_speed(r1, gm))
    arrival = np.abs(_apsis_speed(r2, r1, gm) - _circle_speed(r2, gm))
    return Transfer(departure, np.zeros_like(departure), arrival, _half_period(r1, r2, gm))


def bielliptic(r1: ArrayLike, r2: ArrayLike, r_mid: ArrayLike, gm: ArrayLike) -> Transfer:
    """Two half-ellipses, from the circle r1 out to r_mid and from there to the circle r2.

    r_mid is at least the larger of both; at that radius the transfer is Hohmann's with a circular half-turn.
    """
    r1, r2, r_mid, gm = (np.asarray(each, dtype=float) for each in (r1, r2, r_mid, gm))
    departure = np.abs(_apsis_speed(r1, r_mid, gm) - _circle_speed(r1, gm))
    middle = np.abs(_apsis_speed(r_mid, r2, gm) - _apsis_speed(r_mid, r1, gm))
    arrival = np.abs(_apsis_speed(r2, r_mid, gm) - _circle_speed(r2, gm))
    return Transfer(departure, middle, arrival, _half_period(r1, r_mid, gm) + _half_period(r_mid, r2, gm))


def bielliptic_mid_radius(tof: ArrayLike, r1: ArrayLike, r2: ArrayLike, gm: ArrayLike) -> Floats:
    """The r_mid for which two half-ellipses take the time tof; NaN where even r_mid = max(r1, r2) is slower.

    The time is a convex, rising function of r_mid. If both ellipses had the mean of r1 and r2 at their other
    end they would take less (Jensen), so that the r_mid of that picture is never too small; Newton's method
    comes down from there and cannot overshoot.
    """
    tof, r1, r2, gm = np.broadcast_arrays(*(np.asarray(each, dtype=float) for each in (tof, r1, r2, gm)))
    least = np.maximum(r1, r2)
    shortest = _half_period(r1, least, gm) + _half_period(least, r2, gm)
    there = (tof >= shortest) & np.isfinite(tof)
    sure = np.where(there, tof, shortest)
    r_mid = 2.0 * np.cbrt(gm * np.square(sure / (2.0 * np.pi))) - 0.5 * (r1 + r2)
    for _ in range(_MOST_STEPS):
        first, second = _half_period(r1, r_mid, gm), _half_period(r_mid, r2, gm)
        slope = 1.5 * (first / (r1 + r_mid) + second / (r_mid + r2))
        step = np.maximum((first + second - sure) / slope, 0.0)
        r_mid = r_mid - step
        if np.all(~there | (step <= 4.0 * np.finfo(float).eps * r_mid)):
            break
    return np.where(there, np.maximum(r_mid, least), np.nan)


def _circle_speed(r: Floats, gm: Floats) -> Floats:
    return np.sqrt(gm / r)


def _apsis_speed(r: Floats, other: Floats, gm: Floats) -> Floats:
    """Speed at the apsis r of an ellipse whose other apsis is `other` (vis-viva)."""
    return np.sqrt(2.0 * gm * other / (r * (r + other)))


def _half_period(r: Floats, other: Floats, gm: Floats) -> Floats:
    return np.pi * np.sqrt((0.5 * (r + other)) ** 3 / gm)

"""Joins: legs into a body and legs out of it, brought together at a flyby on every date.

For one date the legs out are sorted by w = sqrt(v∞² + 2/y_min), their speed at the lowest periapsis allowed.
The burn at any higher periapsis is at least |w out − w in|, so a leg in needs to look only at a slice of
them; a turn that needs a lower periapsis shows by its cosine alone. What is left gets its burn.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numba import njit

from porkgrid.physics.timeflight import PLAIN, ROW
from porkgrid.physics.turns import burn_at, periapsis, periapsis_far

# Rows of `LegEnds.fields`: unit vector of v∞, v∞², w, sine and cosine of the half-turn at the lowest
# periapsis, heliocentric speed, share of the Δv
UX, UY, UZ, V2, W, SINE, COSINE, SPEED, DV = range(9)
FIELDS = 9

# A bound forbids nothing that it would allow but for rounding; the burn itself decides.
SLACK = 1e-9


@dataclass(frozen=True, eq=False)
class LegEnds:
    """The ends of legs at a flyby body, for each of its n dates the legs that can be flown, k at the most.

    fields (n, FIELDS, k); cost (n, k); leg (n, k) says which leg of the table it is; count (n,) how many
    there are.
    """

    fields: np.ndarray
    cost: np.ndarray
    leg: np.ndarray
    count: np.ndarray


@dataclass(frozen=True)
class FlybyBounds:
    """What a flyby may be; y is the periapsis radius over GM, in s²/km²."""

    y_min: float
    y_max: float = math.inf
    burn_max: float = math.inf
    turn_min_rad: float = 0.0
    turn_max_rad: float = math.pi
    gain_min: float = -math.inf
    gain_max: float = math.inf

    def as_array(self, burn_weight: float, dv_max: float, slack: float = SLACK) -> np.ndarray:
        """The numbers that the kernel reads."""
        return np.array(
            [self.y_min, self.y_max, self.burn_max, math.cos(self.turn_max_rad), math.cos(self.turn_min_rad),
             self.gain_min, self.gain_max, burn_weight, dv_max, slack]
        )  # fmt: skip


def leg_ends(
    v_inf: np.ndarray, speed: np.ndarray, valid: np.ndarray, cost: np.ndarray, dv: np.ndarray, y_min: float
) -> LegEnds:
    """Sort the ends of legs at each of n dates by w.

    v_inf (3, n, k) km/s; speed, cost, dv (n, k); valid (n, k) says which legs can be flown and are allowed.
    """
    _, n, k = v_inf.shape
    v2 = v_inf[0] ** 2 + v_inf[1] ** 2 + v_inf[2] ** 2
    w = np.where(valid, np.sqrt(v2 + 2.0 / y_min), np.inf)
    order = np.argsort(w, axis=1, kind="stable")
    count = valid.sum(axis=1)
    widest = max(int(count.max(initial=0)), 1)
    order = order[:, :widest]
    with np.errstate(invalid="ignore", divide="ignore"):
        unit = v_inf / np.sqrt(v2)
        sine = 1.0 / (1.0 + v2 * y_min)
        cosine = np.sqrt(v2 * y_min * (2.0 + v2 * y_min)) * sine
    parts = (unit[0], unit[1], unit[2], v2, w, sine, cosine, speed, dv)
    fields = np.empty((n, FIELDS, widest))
    for row, part in enumerate(parts):
        fields[:, row] = np.take_along_axis(np.broadcast_to(part, (n, k)), order, axis=1)
    return LegEnds(
        fields, np.take_along_axis(cost, order, axis=1), order.astype(np.int32), count.astype(np.int64)
    )


@njit(**ROW)
def _screen(inward, p, cost_in, outward, cost_out, lo, hi, c_min, c_max, weight, slack, cosine, least):
    """cos δ and the least cost of joining one leg in to legs out lo to hi; infinite where it cannot turn."""
    ux, uy, uz, w = inward[UX, p], inward[UY, p], inward[UZ, p], inward[W, p]
    s1, c1 = inward[SINE, p], inward[COSINE, p]
    for e in range(lo, hi):
        c = ux * outward[UX, e] + uy * outward[UY, e] + uz * outward[UZ, e]
        sharpest = c1 * outward[COSINE, e] - s1 * outward[SINE, e]
        floor = cost_in + cost_out[e] + weight * abs(outward[W, e] - w)
        turnable = (c >= sharpest - slack) & (c >= c_min - slack) & (c <= c_max + slack)
        cosine[e] = c
        least[e] = floor - slack if turnable else math.inf


@njit(**ROW)
def _burns(a2, b2, cosine, y_min, y_max, burn_max, burn):
    """Burn of every pair; infinite where it or the periapsis is outside its bounds."""
    far = 0
    for k in range(b2.shape[0]):
        y = periapsis(a2, b2[k], cosine[k])
        spent = burn_at(a2, b2[k], y)
        burn[k] = spent if (y_min <= y) & (y <= y_max) & (spent <= burn_max) else math.inf
        far += 1 if (a2 > 9.0 * b2[k]) | (b2[k] > 9.0 * a2) else 0
    if far == 0:
        return
    for k in range(b2.shape[0]):
        if a2 > 9.0 * b2[k] or b2[k] > 9.0 * a2:
            y = periapsis_far(a2, b2[k], cosine[k], periapsis(a2, b2[k], cosine[k]))
            spent = burn_at(a2, b2[k], y)
            burn[k] = spent if y_min <= y <= y_max and spent <= burn_max else math.inf


@njit(**PLAIN)
def _column(leg, columns):
    """leg % columns, for the few options that a leg has; a division would cost more than the burn."""
    while leg >= columns:
        leg -= columns
    return leg


@njit(**PLAIN)
def _first_at_least(sorted_values, count, value):
    low, high = 0, count
    while low < high:
        middle = (low + high) // 2
        if sorted_values[middle] < value:
            low = middle + 1
        else:
            high = middle
    return low


@njit(**PLAIN)
def join(
    in_fields, in_cost, in_count, out_fields, out_cost, out_leg, out_count, columns, stride, bounds,
    best, from_leg, by_leg, tally,
):  # fmt: skip
    """Join legs at a flyby on all its dates, keeping the cheapest way into each state.

    in_fields (n, FIELDS, k_in), in_cost (n, k_in): cost of the route up to and with the leg in, infinite
    where it cannot be reached; out_*: as in `LegEnds`, its cost that of the leg out alone. The state that a
    leg out at date j leads to is j · stride + leg % columns, an index into best, from_leg and by_leg (flat):
    from_leg gets j · k_in + (place in the list of legs in), by_leg the leg out. States whose `best` is −inf
    on entry are closed. tally (3,) counts pairs that could not be turned, those whose burn was computed, and
    those joined. bounds: FlybyBounds.as_array.
    """
    y_min, y_max, burn_max, c_min, c_max = bounds[0], bounds[1], bounds[2], bounds[3], bounds[4]
    gain_min, gain_max, weight, dv_max, slack = bounds[5], bounds[6], bounds[7], bounds[8], bounds[9]
    k_in, k_out = in_fields.shape[2], out_fields.shape[2]
    cosine, least = np.empty(k_out), np.empty(k_out)
    b2, c = np.empty(k_out), np.empty(k_out)
    burn, place = np.empty(k_out), np.empty(k_out, dtype=np.int64)
    for j in range(in_fields.shape[0]):
        inward, outward, cost_out = in_fields[j], out_fields[j], out_cost[j]
        count = out_count[j]
        if count == 0:
            continue
        for p in range(in_count[j]):
            cost_in = in_cost[j, p]
            if cost_in == math.inf:
                continue
            w = inward[W, p]
            reach = burn_max * (1.0 + slack) + slack
            lo = _first_at_least(outward[W], count, w - reach)
            hi = _first_at_least(outward[W], count, w + reach)
            _screen(inward, p, cost_in, outward, cost_out, lo, hi, c_min, c_max, weight, slack, cosine, least)
            kept = 0
            for e in range(lo, hi):
                if least[e] < best[j * stride + _column(out_leg[j, e], columns)]:
                    place[kept] = e
                    b2[kept], c[kept] = outward[V2, e], cosine[e]
                    kept += 1
                elif least[e] == math.inf:
                    tally[0] += 1
            _burns(inward[V2, p], b2[:kept], c[:kept], y_min, y_max, burn_max, burn[:kept])
            tally[1] += kept
            for k in range(kept):
                if burn[k] == math.inf:
                    continue
                e = place[k]
                gain = outward[SPEED, e] - inward[SPEED, p]
                dv = inward[DV, p] + outward[DV, e] + burn[k]
                if not (c_min <= c[k] <= c_max and gain_min <= gain <= gain_max and dv <= dv_max):
                    continue
                tally[2] += 1
                cost = cost_in + cost_out[e] + weight * burn[k]
                state = j * stride + _column(out_leg[j, e], columns)
                if cost < best[state]:
                    best[state] = cost
                    from_leg[state] = j * k_in + p
                    by_leg[state] = out_leg[j, e]


@njit(**PLAIN)
def turns(in_fields, in_cost, in_count, out_fields, out_count, bounds):
    """Whether any leg in can be turned into any leg out, whatever the burn; arrays as in `join`."""
    c_min, c_max = bounds[3], bounds[4]
    for j in range(in_fields.shape[0]):
        inward, outward = in_fields[j], out_fields[j]
        for p in range(in_count[j]):
            if in_cost[j, p] == math.inf:
                continue
            for e in range(out_count[j]):
                c = inward[UX, p] * outward[UX, e] + inward[UY, p] * outward[UY, e]
                c += inward[UZ, p] * outward[UZ, e]
                sharpest = inward[COSINE, p] * outward[COSINE, e] - inward[SINE, p] * outward[SINE, e]
                if c >= sharpest and c_min <= c <= c_max:
                    return True
    return False

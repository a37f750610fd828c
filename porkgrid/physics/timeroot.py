"""The inverse of the time equation, one problem at a time, for the whole domain.

The row loops of `timeflight` settle almost every transfer without revolutions. What they leave (θ near 0 or
360°, very fast or very long flights) and all transfers with revolutions are solved here: Halley's method on
ln t against ln z inside a bracket, where z is whichever of q, 1 − u, p and u keeps its digits in the case.
"""

from __future__ import annotations

import math

from numba import njit

from porkgrid.physics.timeflight import PLAIN, shape_function

_FROM_Q, _FROM_W, _FROM_P, _FROM_U = 0, 1, 2, 3  # the unknown z is q, w = 1 − u, p, u

_NEAR_PARABOLA = 1e-4
_F1, _F2, _F3, _F4 = 2 / 5, 8 / 35, 8 / 63, 16 / 231  # Taylor coefficients of F at u = 1


@njit(**PLAIN)
def _shape(kind, z, sigma, delta):
    """(q, w = 1 − u, p, σ − u) from the unknown z, each without cancellation."""
    above = 1.0 + sigma if sigma > 0.0 else delta
    below = delta if sigma > 0.0 else 1.0 - sigma
    if kind == _FROM_Q:
        return z, 2.0 - z, above - sigma * z, above - z
    if kind == _FROM_W:
        return 2.0 - z, z, below + sigma * z, z - below
    if kind == _FROM_P:
        w = (z - below) / sigma
        return 2.0 - w, w, z, w - below
    return 1.0 + z, 1.0 - z, 1.0 - sigma * z, sigma - z


@njit(**PLAIN)
def _flight(q, w, p, sigma, revs):
    """(g, a, b) with t = √p g, dt/du = √p a, d²t/du² = √p b."""
    phi = shape_function(q)
    if revs == 0 and abs(w) < _NEAR_PARABOLA:
        phi1 = -(_F1 + w * (2.0 * _F2 + w * 3.0 * _F3))
        phi2 = 2.0 * _F2 + w * (6.0 * _F3 + w * 12.0 * _F4)
    else:
        i = 1.0 / (q * w)
        if revs > 0:
            phi += revs * math.pi * i * math.sqrt(i)
        u = q - 1.0
        phi1 = (3.0 * u * phi - 2.0) * i
        phi2 = (3.0 * phi + 5.0 * u * phi1) * i
    half = 0.5 * sigma / p
    g = sigma + p * phi
    if sigma < 0.0 and q > 3.0:
        g = phi * (1.0 + sigma * _reciprocal_excess(q - 1.0))
    a = p * phi1 - 1.5 * sigma * phi - sigma * half
    b = p * phi2 - 2.5 * sigma * phi1 - 2.0 * sigma * half * half - half * a
    return g, a, b


@njit(**PLAIN)
def _reciprocal_excess(u):
    """1/F(u) − u for u > 1; as u grows it falls to 0 and σ + pF = F(1 + σ(1/F − u)) keeps its digits."""
    root = math.sqrt((u - 1.0) * (u + 1.0))
    ratio = math.log(u + root) / root
    return (u * ratio - 1.0) / (u - ratio)


@njit(**PLAIN)
def least_time(sigma, delta, revs):
    """(q, w, t, d²t/du²) at the least time in which `revs` >= 1 revolutions can be flown.

    dt/du = 0 is bracketed in η, u = tanh η, which keeps the digits of 1 + u and 1 − u at both ends: as
    θ → 0 or 360° the minimum runs to u = ±1 like δ^(2/3).
    """
    low, high = -20.0, 20.0
    eta = 0.0
    q = w = 1.0
    for _ in range(200):
        q, w = 2.0 / (1.0 + math.exp(-2.0 * eta)), 2.0 / (1.0 + math.exp(2.0 * eta))
        p = (1.0 + sigma if sigma > 0.0 else delta) - sigma * q
        if sigma > 0.0:
            p = delta + sigma * w
        _, a, b = _flight(q, w, p, sigma, revs)
        if a < 0.0:
            low = eta
        else:
            high = eta
        # a(1 − u²)^(5/2) is bounded and nearly linear in η; da/du = b + σa/(2p)
        slope = (b + 0.5 * sigma * a / p) * q * w - 5.0 * (q - 1.0) * a
        step = -a / slope if slope > 0.0 else math.inf
        new = eta + step
        if not low < new < high:
            new = 0.5 * (low + high)
        if abs(new - eta) < 1e-9:
            break
        eta = new
    p = delta + sigma * w if sigma > 0.0 else delta - sigma * q
    g, _, b = _flight(q, w, p, sigma, revs)
    return q, w, math.sqrt(p) * g, math.sqrt(p) * b


@njit(**PLAIN)
def _zero_rev_start(sigma, delta, t):
    """(kind, z, low, high) for a transfer without revolutions."""
    t_middle = sigma + 0.5 * math.pi  # u = 0
    if t >= t_middle:
        above = 1.0 + sigma if sigma > 0.0 else delta
        guess = above * math.pi ** (2 / 3) / (2.0 * t ** (2 / 3) + above * math.pi ** (2 / 3))
        return _FROM_Q, min(max(guess, 1e-300), 1.0), 0.0, 1.0
    if sigma > 0.5:
        return _FROM_P, min((t / t_middle) ** 2, 1.0), 0.0, 1.0
    if sigma > 0.0:
        u_half = 0.5 / sigma  # p = ½
        if t < math.sqrt(0.5) * (sigma + 0.5 * shape_function(1.0 + u_half)):
            return _FROM_P, min((t / sigma) ** 2, 0.4), 0.0, 0.5
        return _FROM_U, min(1.0 / t, u_half), 0.0, u_half
    return _FROM_U, 1.0 / t - sigma / (t * t), 0.0, math.inf


@njit(**PLAIN)
def solve(sigma, delta, t, revs, right):
    """The transfer that takes the scaled time t: (p, σ − u, found).

    With revolutions, `right` chooses the root with the larger u. `found` is False where t is under the least
    time of that many revolutions; then p and σ − u are NaN.
    """
    if revs == 0:
        kind, z, low, high = _zero_rev_start(sigma, delta, t)
    else:
        t_middle = sigma + (revs + 0.5) * math.pi
        if t >= t_middle:
            # u = 0 is flown faster than t: the roots lie on either side of it, whatever the least time is
            kind, low, high = (_FROM_W if right else _FROM_Q), 0.0, 1.0
            far = _far_root(sigma, delta, t, revs, right)
            middle = _far_root(sigma, delta, t_middle, revs, right)
            z = min(far * (1.0 + (1.0 / middle - 1.0) * far / middle), 1.0)
        else:
            q, w, t_least, bend = least_time(sigma, delta, revs)
            if t < t_least:
                return math.nan, math.nan, False
            close = math.sqrt(2.0 * (t - t_least) / bend)
            if right == (q > 1.0):  # between the least time and the end of u on its side
                kind, low, high = (_FROM_W if right else _FROM_Q), 0.0, (w if right else q)
                z = min(
                    max(_far_root(sigma, delta, t, revs, right), high - close),
                    0.5 * (high + max(high - close, 0.0)),
                )
            else:  # between the least time and u = 0
                kind, low, high = (_FROM_Q if right else _FROM_W), (q if right else w), 1.0
                z = min(low + close, 0.5 * (low + 1.0))
    z = _root(kind, z, low, high, sigma, delta, t, revs, right)
    _, _, p, h = _shape(kind, z, sigma, delta)
    return p, h, True


@njit(**PLAIN)
def _far_root(sigma, delta, t, revs, right):
    """q (left) or 1 − u (right) for t → ∞, where t falls as its power −3/2."""
    above = delta if (right == (sigma > 0.0)) else 1.0 + abs(sigma)
    turns = revs if right else revs + 1.0
    return above * 0.5 * (turns * math.pi / t) ** (2 / 3)


@njit(**PLAIN)
def _root(kind, z, low, high, sigma, delta, t, revs, right):
    # t falls as p falls, and as q or w does on the far side of the least time
    rising = kind == _FROM_P or (revs > 0 and right == (kind == _FROM_Q))
    for _ in range(200):
        q, w, p, _ = _shape(kind, z, sigma, delta)
        g, a, b = _flight(q, w, p, sigma, revs)
        miss = math.log(math.sqrt(p) * g / t)
        if (miss > 0.0) == rising:
            high = z
        else:
            low = z
        # derivatives of ln t by ln z
        du = -1.0 / sigma if kind == _FROM_P else (-1.0 if kind == _FROM_W else 1.0)
        d1 = z * du * a / g
        d2 = z * z * du * du * b / g + d1 - d1 * d1
        step = -miss * d1 / (d1 * d1 - 0.5 * miss * d2)
        new = z * math.exp(min(max(step, -3.0), 3.0)) if step == step else math.nan
        if abs(step) < 1e-11:
            return new
        if not low < new < high:
            new = _middle(low, high, z)
            if new == z:
                return z
        z = new
    return z


@njit(**PLAIN)
def _middle(low, high, z):
    """Halve the bracket in ln z, or step out where an end is not known yet."""
    if low == 0.0:
        return min(0.1 * z, 0.1 * high)
    if high == math.inf:
        return 10.0 * z
    return math.sqrt(low) * math.sqrt(high)

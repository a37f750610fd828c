"""Fly from a body's periapsis out into the Solar System: first told from the body, then from the Sun.

Near a body a place from the Sun has too few digits: of 1e8 km a double holds 1e-8, which periapsis
stretches by a factor of a million until the next encounter. Told from the body the same motion keeps ten
thousand times more.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from porkgrid.handoff.forces import Forces
from porkgrid.physics.nbody import CENTRE, Arc, acceleration, fly, fly_with_sensitivity
from porkgrid.physics.tracks import state_on_track
from porkgrid.sky.bodies import Body

Floats = NDArray[np.float64]

# How long a flight is told from the body, in times sqrt(r³/GM) of its periapsis, at which it is some hundred
# radii out; and the most of a flight for that.
_NEAR_TIMES, _NEAR_SHARE = 100.0, 0.25
_NEAR_BARE_S = 3600.0  # from a body's centre, which does not pull: nothing is gained


@dataclass(frozen=True, eq=False)
class Outset:
    """Where a flight starts, forwards or backwards: state (6,) from the body at a time of the field."""

    body: Body
    t_s: float
    relative: Floats


def carry(forces: Forces, outset: Outset, until_s: float) -> Arc:
    """Fly until a time: the path as states from the Sun."""
    origin = forces.index(outset.body)
    switch_s = _switch_s(outset, until_s)
    told = fly(forces.field, outset.t_s, switch_s, outset.relative, origin)

    def near_from_sun(t_s: Floats) -> Floats:
        return told.between(t_s) + _body_states(forces, outset.body, t_s)

    states = told.states + _body_states(forces, outset.body, told.t_s)
    near = Arc(told.t_s, states, near_from_sun)
    far = fly(forces.field, switch_s, until_s, states[:, -1], CENTRE)
    early, late = (near, far) if until_s > outset.t_s else (far, near)
    return Arc(
        np.concatenate([near.t_s, far.t_s[1:]]),
        np.concatenate([near.states, far.states[:, 1:]], axis=1),
        spliced(early, late, switch_s),
    )


def spliced(early: Arc, late: Arc, seam_s: float) -> Callable[[Floats], Floats]:
    """States (6, m) at times (m,) from the one arc up to the seam, and from the other after it."""

    def between(t_s: Floats) -> Floats:
        states = np.empty((6, t_s.size))
        for arc, here in ((early, t_s <= seam_s), (late, t_s > seam_s)):
            if here.any():
                states[:, here] = arc.between(t_s[here])
        return states

    return between


def carry_with_sensitivity(forces: Forces, outset: Outset, until_s: float) -> tuple[Floats, Floats]:
    """Fly until a time: state (6,) from the Sun, and its sensitivity (6, 6) to the state at the outset."""
    origin = forces.index(outset.body)
    switch_s = _switch_s(outset, until_s)
    near, first = fly_with_sensitivity(forces.field, outset.t_s, switch_s, outset.relative, origin)
    from_sun = near + body_state(forces, outset.body, switch_s)
    far, second = fly_with_sensitivity(forces.field, switch_s, until_s, from_sun, CENTRE)
    return far, second @ first


def rate(forces: Forces, outset: Outset) -> Floats:
    """How the state from the body changes at the outset, (6,) per s."""
    pull = acceleration(forces.field, outset.t_s, outset.relative, forces.index(outset.body))
    return np.concatenate([outset.relative[3:], pull])


def body_state(forces: Forces, body: Body, t_s: float) -> Floats:
    """State (6,) of a body from the Sun at a time of the field."""
    place, velocity, _ = state_on_track(forces.field.tracks, forces.index(body), t_s)
    return np.concatenate([place, velocity])


def _body_states(forces: Forces, body: Body, t_s: Floats) -> Floats:
    return np.stack([body_state(forces, body, float(t)) for t in t_s], axis=1)


def _switch_s(outset: Outset, until_s: float) -> float:
    whole = until_s - outset.t_s
    gm, radius = outset.body.gm_km3_s2, float(np.linalg.norm(outset.relative[:3]))
    near = _NEAR_BARE_S
    if gm is not None and radius > 0.0:
        near = _NEAR_TIMES * math.sqrt(radius**3 / gm)
    return outset.t_s + math.copysign(min(near, _NEAR_SHARE * abs(whole)), whole)

"""Flybys over the whole domain of speeds and turns, and their exact angles at mpmath's precision."""

import math

import numpy as np
from hypothesis import assume
from hypothesis import strategies as st
from mpmath import mp, mpf

SPEED = st.floats(-4.0, 3.0).map(lambda x: 10.0**x)  # km/s
TINY = st.floats(-12.0, 0.0).map(lambda x: 10.0**x)  # rad
SIDE = st.sampled_from([-1.0, 1.0])
TURN = st.one_of(
    TINY,
    TINY.map(lambda x: math.pi - x),
    # Of very different speeds the faster hardly turns and the slower turns by 90°: flat there
    st.builds(lambda x, side: 0.5 * math.pi + side * x, TINY, SIDE),
    st.floats(0.01, 3.13),
)
PARTS = st.tuples(*[st.floats(-1.0, 1.0)] * 3)


@st.composite
def velocities(draw):
    """Draw two velocities of any speeds and turn, in any plane."""
    first, second = np.array(draw(PARTS)), np.array(draw(PARTS))
    assume(np.linalg.norm(np.cross(first, second)) > 1e-3)
    x = first / np.linalg.norm(first)
    z = np.cross(x, second)
    z /= np.linalg.norm(z)
    angle = draw(TURN)
    return draw(SPEED) * x, draw(SPEED) * (math.cos(angle) * x + math.sin(angle) * np.cross(z, x))


def exact(v):
    """Take doubles as they are."""
    return mp.matrix([mpf(float(x)) for x in v])


def exact_cross(a, b):
    return mp.matrix([a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]])


def exact_angle(a, b):
    """Return the angle between two vectors of doubles and what it lacks to π."""
    a, b = exact(a), exact(b)
    sine, cosine = mp.norm(exact_cross(a, b)), mp.fdot(a, b)
    return mp.atan2(sine, cosine), mp.atan2(sine, -cosine)


def exact_turn(a, b, y):
    """Return δ of two velocities and y = r/GM, half a hyperbola's turn each."""
    return sum(mp.asin(1 / (1 + mp.fdot(exact(v), exact(v)) * y)) for v in (a, b))


def steepness(a, b, y):
    """Return −dδ/d ln y: how much of the turn hangs on the periapsis."""
    squares = [mp.fdot(exact(v), exact(v)) * y for v in (a, b)]
    return sum(p / ((1 + p) * mp.sqrt(p * (2 + p))) for p in squares)

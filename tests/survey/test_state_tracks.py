"""Series of a body's motion, against the kernel that they were made from."""

from __future__ import annotations

import numpy as np
import pytest

from porkgrid.sky.bodies import find_body
from porkgrid.sky.kernel import open_ephemeris
from porkgrid.survey.tracks import tracks

FIRST_JD = 2462000.5


@pytest.fixture(scope="module")
def ephemeris():
    return open_ephemeris()


@pytest.mark.parametrize("name", ["mercury", "earth", "moon", "jupiter"])
@pytest.mark.parametrize("days", [0.5, 22.0, 130.0])
def test_states_are_those_of_the_kernel_to_a_metre(ephemeris, name, days):
    body = find_body(name, {})
    spans = FIRST_JD + np.array([[0.0, days], [200.25, 200.25 + days]])
    found = tracks(ephemeris, body, spans)
    which = np.array([1, 0, 1])
    jd = np.random.default_rng(3).uniform(spans[which, 0], spans[which, 1], (40, 3)).T
    states = found.states(which, jd)
    assert states.shape == (6, 3, 40)
    for row in range(3):
        position, velocity = ephemeris.states(body, jd[row])
        assert np.abs(states[:3, row] - position).max() < 3e-4
        assert np.abs(states[3:, row] - velocity).max() < 1e-8


def test_spans_beyond_the_kernel_end_with_it(ephemeris):
    body = find_body("earth", {})
    first, last = ephemeris.coverage(body)
    found = tracks(ephemeris, body, np.array([[first - 5.0, first + 10.0], [last - 10.0, last + 5.0]]))
    assert found.spans.tolist() == [[first, first + 10.0], [last - 10.0, last]]
    position, _ = ephemeris.states(body, np.array([first, last]))
    ends = found.states(np.array([0, 1]), np.array([[first], [last]]))
    assert np.abs(ends[:3, :, 0] - position).max() < 1e-3

"""The equations of multiple shooting: their slopes, and that conics solve them where no planet pulls."""

from dataclasses import replace

import numpy as np
import pytest

from porkgrid.handoff.forces import forces_over
from porkgrid.handoff.shooting import Problem, join, linearise
from porkgrid.handoff.stops import End, Hold, Pass
from porkgrid.physics.constants import AU_KM, DAY_S, GM_SUN_KM3_S2
from porkgrid.physics.lambert import ECLIPTIC_POLE_ICRF, lambert
from porkgrid.sky.bodies import BODIES
from porkgrid.sky.kernel import open_ephemeris

POLE = np.array(ECLIPTIC_POLE_ICRF)
EPOCHS = (2464171.5, 2464306.5, 2464521.5)  # a route of scenarios/earth-venus-mars-2034.toml


def excess_speeds(ephemeris, bodies, epochs):
    """v∞ out of and into the bodies of every leg, (n, 3) each, as conics have them."""
    states = [ephemeris.states(body, [jd]) for body, jd in zip(bodies, epochs, strict=True)]
    r, v = (np.hstack(column).T for column in zip(*states, strict=True))
    v1, v2 = lambert(r[:-1], r[1:], np.diff(epochs) * DAY_S, GM_SUN_KM3_S2)
    return v1 - v[:-1], v2 - v[1:]


@pytest.fixture(scope="module")
def ephemeris():
    return open_ephemeris()


@pytest.fixture(scope="module")
def by_venus(ephemeris):
    """Earth, Venus, Mars, and the conics' excess speeds as a first guess."""
    bodies = [BODIES[name] for name in ("earth", "venus", "mars")]
    forces = forces_over(ephemeris, bodies, EPOCHS[0], EPOCHS[-1])
    out, into = excess_speeds(ephemeris, bodies, EPOCHS)
    seconds = [forces.seconds(jd) for jd in EPOCHS]
    stops = (
        End(bodies[0], seconds[0], 6578.0, np.array([0.0, 0.0, 1.0]), 0.3),
        Pass(bodies[1], seconds[1], 0.0, 6351.8, Hold.BURN),
        End(bodies[2], seconds[2], 3796.0, POLE, 0.0),
    )
    return Problem(forces, stops), np.concatenate([out[0], into[0], out[1], [0.0], into[1]])


def test_the_slopes_are_those_of_the_equations(by_venus):
    problem, x = by_venus
    here = linearise(problem, x)
    assert here.jacobian.shape == (13, 13)
    for k in range(13):
        step = np.zeros(13)
        step[k] = 1e-6
        slope = (linearise(problem, x + step).value - linearise(problem, x - step).value) / 2e-6
        assert np.abs(here.jacobian[:, k] - slope).max() <= 1e-4 * np.abs(here.jacobian[:, k]).max()


def test_a_flyby_is_joined_without_a_burn_when_its_epoch_is_free(by_venus):
    problem, guess = by_venus
    solution = join(problem, guess)
    assert solution.converged
    assert np.abs(np.linalg.norm(solution.x[3:6]) - np.linalg.norm(solution.x[6:9])) <= 1e-6
    joints = linearise(problem, solution.x).value[:12].reshape(2, 2, 3) * [[[AU_KM], [30.0]]]
    assert np.linalg.norm(joints[:, 0], axis=-1).max() <= 0.01
    assert np.linalg.norm(joints[:, 1], axis=-1).max() <= 1e-9


def test_where_no_planet_pulls_the_conic_is_the_solution(ephemeris):
    """From centre to centre: patched conics are then no approximation, to a metre."""
    bodies, epochs = (BODIES["earth"], BODIES["mars"]), (2462098.5, 2462398.5)
    forces = forces_over(ephemeris, bodies, *epochs)
    bare = replace(forces, field=replace(forces.field, gm=np.zeros_like(forces.field.gm)))
    stops = tuple(
        End(body, bare.seconds(jd), 0.0, POLE, 0.0) for body, jd in zip(bodies, epochs, strict=True)
    )
    out, into = excess_speeds(ephemeris, bodies, epochs)
    guess = np.concatenate([out[0], into[0]])
    assert np.abs(linearise(Problem(bare, stops), guess).value[:3]).max() * AU_KM <= 1e-3
    solution = join(Problem(bare, stops), guess + 0.1)
    assert solution.converged
    assert len(solution.history) > 1
    np.testing.assert_allclose(solution.x, guess, rtol=0.0, atol=1e-9)


def test_a_first_guess_that_cannot_be_flown_is_a_result(by_venus):
    problem, guess = by_venus
    broken = guess.copy()
    broken[:3] = np.nan
    solution = join(problem, broken)
    assert not solution.converged
    assert "first guess" in solution.ended

"""Where there is no transfer, or no plane to fly in, the Lambert solver answers NaN and nothing else."""

import numpy as np
import pytest
from mpmath_lambert import least_time

from porkgrid.physics.constants import AU_KM, DAY_S, GM_SUN_KM3_S2
from porkgrid.physics.lambert import lambert

R1 = np.array([1.0, 0.25, -0.5]) * AU_KM
R2 = np.array([-0.7, 1.2, 0.1]) * AU_KM
FLIGHT = 200 * DAY_S


def is_refused(r1, r2, tof, **kind) -> bool:
    """Whether all six components are NaN, and whether it stays so inside an array of good problems."""
    v1, v2 = lambert(r1, r2, tof, GM_SUN_KM3_S2, **kind)
    rows1, rows2 = lambert([R1, r1, R1], [R2, r2, R2], [3e9, tof, 3e9], GM_SUN_KM3_S2, **kind)
    assert np.isfinite(rows1[[0, 2]]).all()
    assert np.isfinite(rows2[[0, 2]]).all()
    return bool(np.isnan([v1, v2, rows1[1], rows2[1]]).all())


def test_the_problem_the_others_spoil_is_solvable():
    assert not is_refused(R1, R2, FLIGHT)


@pytest.mark.parametrize("factor", [-1.0, -2.0, -0.25])
def test_half_a_turn_exactly_has_no_plane(factor):
    assert is_refused(R1, factor * R1, FLIGHT)
    assert is_refused(R1, factor * R1, FLIGHT, retrograde=True)


@pytest.mark.parametrize("factor", [1.0, 2.0, 0.5])
def test_no_turn_or_a_whole_one_has_no_plane(factor):
    assert is_refused(R1, factor * R1, FLIGHT)
    assert is_refused(R1, factor * R1, 20 * FLIGHT, revs=1)


@pytest.mark.parametrize("tof", [0.0, -1.0, -FLIGHT, np.nan, np.inf, -np.inf])
def test_a_flight_time_that_is_not_positive_and_finite_is_no_flight(tof):
    assert is_refused(R1, R2, tof)


@pytest.mark.parametrize("bad", [np.nan, np.inf, -np.inf])
def test_positions_must_be_finite(bad):
    spoiled = np.array([AU_KM, bad, 0.0])
    assert is_refused(spoiled, R2, FLIGHT)
    assert is_refused(R1, spoiled, FLIGHT)


def test_positions_must_not_be_at_the_centre():
    assert is_refused(np.zeros(3), R2, FLIGHT)
    assert is_refused(R1, np.zeros(3), FLIGHT)


@pytest.mark.parametrize("revs", [1, 2, 3, 7])
@pytest.mark.parametrize("branch", ["left", "right"])
@pytest.mark.parametrize("retrograde", [False, True])
def test_revolutions_fit_from_the_least_time_on_and_not_below(revs, branch, retrograde):
    least = float(least_time(R1, R2, GM_SUN_KM3_S2, revs, retrograde))
    kind = {"revs": revs, "branch": branch, "retrograde": retrograde}
    for share in (1 - 1e-11, 0.999, 0.5, 1e-3):
        assert is_refused(R1, R2, least * share, **kind)
    for share in (1 + 1e-11, 1.001, 2.0):
        assert not is_refused(R1, R2, least * share, **kind)

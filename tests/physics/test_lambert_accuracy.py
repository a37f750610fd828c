"""Accuracy of the Lambert solver over its whole domain, judged from outside.

Two judges: flight_time_judge looks at millions of answers in longdouble, mpmath_lambert at thousands with
50 digits. test_lambert_judge.py judges them.
"""

from collections import Counter

import flight_time_judge as judge
import mpmath_lambert
import numpy as np
import pytest
from lambert_problems import POLE, Problems, random_problems, solve_all

from porkgrid.physics.lambert import lambert

RESIDUAL = 1e-11  # of the flight time, relative
VELOCITY = 1e-10  # of each velocity, relative to its length
FLOOR_ULPS = 4  # the answer's components may be off by this many half ulps before the judge counts it
EXCUSED_ROUNDINGS = 10  # a velocity may be off by what this many roundings of every input would do to it
LEAST_TIME_BAND = 1e-12  # so near the least time (relative), "one root or none" is a matter of rounding
CHUNK = 200_000


def check_chunk(problems: Problems) -> tuple[Counter, float]:
    """Assert all that must hold of a chunk's answers; return counts by kind, and the worst residual."""
    v1, v2 = solve_all(lambert, problems)
    finite = np.isfinite(v1).all(1) & np.isfinite(v2).all(1)
    empty = np.isnan(v1).all(1) & np.isnan(v2).all(1)
    slack = problems.tof / np.where(problems.revs > 0, problems.least_tof, 1) - 1
    exists = (problems.revs == 0) | (slack > LEAST_TIME_BAND)
    absent = (problems.revs > 0) & (slack < -LEAST_TIME_BAND)
    nobody(exists & ~finite, problems, "no answer where a transfer exists")
    nobody(absent & ~empty, problems, "an answer where there is no transfer")

    kept = exists & finite
    part, w1, w2 = problems[kept], v1[kept], v2[kept]
    shape = judge.shape(part.r1, part.r2, POLE)
    x, x_error = judge.recover_x(shape, part.gm, part.r1, part.r2, w1, w2)
    residual, floor = judge.time_residual(shape, x, x_error, part.revs, part.tof, part.gm)
    assert floor.max() < 0.05 * RESIDUAL, "the judge's floor must not decide"
    nobody(~(residual <= RESIDUAL + FLOOR_ULPS * floor), part, "flight time off", residual)
    check_one_conic(part, shape, x, w1, w2)
    check_branch(part, shape, x)
    seen = Counter(solved=int(kept.sum()), impossible=int(absent.sum()), hyperbolic=int((x > 1).sum()))
    return seen, float(residual.max())


def check_one_conic(part, shape, x, v1, v2):
    """Both velocities must be of one conic through both points; near 0 and 180° its plane is uncertain."""
    tolerance = VELOCITY + 8 * judge.HALF_ULP / shape.sine
    for found, wanted in zip((v1, v2), judge.velocities(shape, x, part.gm, part.r1, part.r2), strict=True):
        off = np.linalg.norm((found - wanted).astype(float), axis=1) / np.linalg.norm(
            wanted.astype(float), axis=1
        )
        nobody(~(off <= tolerance), part, "velocities of different conics", off)


def check_branch(part, shape, x):
    """Left is the root below the x of least time, right the one above (x grows with u)."""
    told_apart = (part.revs > 0) & (part.tof > part.least_tof * (1 + 1e-9))
    _, x_least = judge.least_time(shape[told_apart], part.revs[told_apart])
    wrong = np.zeros(len(part), bool)
    wrong[told_apart] = (x[told_apart] < x_least) != part.left[told_apart]
    nobody(wrong, part, "the other branch's root")


def nobody(guilty, problems, charge, amount=None):
    """Fail with the first few guilty problems written out, the worst first."""
    if not guilty.any():
        return
    indices = np.flatnonzero(guilty)
    if amount is not None:
        indices = indices[np.argsort(-np.asarray(amount, float)[indices])]
    lines = [problems.text(i) + ("" if amount is None else f"  {float(amount[i]):.3g}") for i in indices[:5]]
    pytest.fail("\n".join([f"{charge}: {len(indices)} of {len(problems)}", *lines]), pytrace=False)


def test_two_hundred_thousand_random_problems_have_the_right_flight_time():
    seen, worst = check_chunk(random_problems(np.random.default_rng(20), CHUNK))
    assert min(seen["impossible"], seen["hyperbolic"]) > 0.05 * CHUNK, "the draw must hold all kinds"
    print(f"\n{dict(seen)}, worst flight-time residual {worst:.2g}")


def test_revolutions_near_their_least_time_between_neighbouring_directions_keep_their_digits():
    """As θ nears 0 or 360° the least time runs to u = ±1, where 1 - u² has few digits left."""
    problems = random_problems(np.random.default_rng(24), CHUNK, corner_share=1.0)
    from_full_turn = np.minimum(problems.theta, 2 * np.pi - problems.theta)
    chosen = (problems.revs > 0) & (from_full_turn < 1e-3) & (problems.tof < 1.1 * problems.least_tof)
    assert chosen.sum() > 10_000
    check_chunk(problems[chosen])


@pytest.mark.slow
def test_ten_million_random_problems_have_the_right_flight_time():
    rng = np.random.default_rng(21)
    total, worst = Counter(), 0.0
    for _ in range(10_000_000 // CHUNK):
        seen, residual = check_chunk(random_problems(rng, CHUNK))
        total, worst = total + seen, max(worst, residual)
    print(f"\n{dict(total)}, worst flight-time residual {worst:.2g}")


def place(problems: Problems, i: int) -> str:
    """Say in which corner of the domain problem i lies, for the count of excuses."""
    theta = problems.theta[i]
    for name, angle in (("0", 0.0), ("180°", np.pi), ("360°", 2 * np.pi)):
        if abs(theta - angle) < 0.01:
            return f"θ within 0.01 rad of {name}"
    if problems.revs[i] and problems.tof[i] < problems.least_tof[i] * 1.01:
        return "within 1 % of the least time"
    return "elsewhere"


def compare_with_fifty_digits(problems: Problems) -> None:
    """Every velocity within 1e-10, or within what the problem's conditioning makes of EXCUSED_ROUNDINGS."""
    v1, v2 = solve_all(lambert, problems)
    excused, over, compared = Counter(), [], 0
    for i in range(len(problems)):
        branch = "left" if problems.left[i] else "right"
        exact = mpmath_lambert.solve(
            problems.r1[i], problems.r2[i], problems.tof[i], problems.gm, int(problems.revs[i]), branch
        )
        near_least = abs(problems.tof[i] / (problems.least_tof[i] or np.inf) - 1) < LEAST_TIME_BAND
        if exact is None or near_least:
            assert np.isnan(v1[i]).all() or near_least, problems.text(i)
            continue
        compared += 1
        for error, condition in zip(
            exact.errors(v1[i], v2[i]), (exact.condition1, exact.condition2), strict=True
        ):
            allowed = EXCUSED_ROUNDINGS * judge.HALF_ULP * condition
            if error > max(VELOCITY, allowed):
                over.append(f"{problems.text(i)}  off {error:.3g}, excusable {allowed:.3g}")
            elif error > VELOCITY:
                excused[place(problems, i)] += 1
    print(f"\n{compared} compared; velocities beyond 1e-10 but excused: {dict(excused) or 0}")
    assert compared > 0.6 * len(problems)
    assert not over, "\n".join([f"{len(over)} velocities off", *over[:5]])


def test_three_hundred_random_velocities_agree_with_fifty_digits():
    compare_with_fifty_digits(random_problems(np.random.default_rng(22), 300))


@pytest.mark.slow
def test_ten_thousand_random_velocities_agree_with_fifty_digits():
    compare_with_fifty_digits(random_problems(np.random.default_rng(23), 10_000))

"""The judges of the Lambert solver are themselves judged, by Kepler's equation and by each other."""

import flight_time_judge as judge
import lambert_problems
import mpmath_lambert
import numpy as np
import pytest
from mpmath_lambert import mp


def draw(n, seed):
    """Random problems that have a transfer, most of them in the corners, with their 50-digit answers."""
    problems = lambert_problems.random_problems(np.random.default_rng(seed), n, corner_share=0.7)
    answers = [solve(problems, i) for i in range(n)]
    kept = np.array([a is not None for a in answers])
    return problems[kept], [a for a in answers if a is not None]


def solve(problems, i, nudge=1.0):
    return mpmath_lambert.solve(
        problems.r1[i], problems.r2[i], problems.tof[i] * nudge, problems.gm,
        int(problems.revs[i]), "left" if problems.left[i] else "right",
    )  # fmt: skip


def as_doubles(answers):
    return tuple(np.array([[float(x) for x in getattr(a, v)] for a in answers]) for v in ("v1", "v2"))


def dot(a, b):
    return sum(x * y for x, y in zip(a, b, strict=True))


def cross(a, b):
    return [a[i - 2] * b[i - 1] - a[i - 1] * b[i - 2] for i in range(3)]


def eccentricity_vector(r, v, gm):
    n = mp.sqrt(dot(r, r))
    return [x / gm - y / n for x, y in zip(cross(v, cross(r, v)), r, strict=True)]


def mean_anomaly(r, v, a, gm):
    """Kepler's equation, ellipse (a > 0) or hyperbola: from the state to the mean anomaly."""
    e_cos = 1 - mp.sqrt(dot(r, r)) / a
    e_sin = dot(r, v) / mp.sqrt(gm * abs(a))
    if a > 0:
        return mp.atan2(e_sin, e_cos) - e_sin
    return e_sin - mp.atanh(e_sin / e_cos)


@pytest.fixture(scope="module")
def solved():
    return draw(200, seed=11)


def test_fifty_digit_answers_satisfy_keplers_equation_to_thirty_digits(solved):
    problems, answers = solved
    assert len(answers) > 120
    for i, answer in enumerate(answers):
        gm = mp.mpf(problems.gm)
        r1, r2 = ([mp.mpf(float(x)) for x in r[i]] for r in (problems.r1, problems.r2))
        n1, n2 = (mp.sqrt(dot(r, r)) for r in (r1, r2))
        h, e = cross(r1, answer.v1), eccentricity_vector(r1, answer.v1, gm)
        for mine, other in ((h, cross(r2, answer.v2)), (e, eccentricity_vector(r2, answer.v2, gm))):
            size = mp.sqrt(dot(mine, mine))
            assert all(abs(x - y) < 1e-30 * size for x, y in zip(mine, other, strict=True))
        assert abs(dot(h, h) / gm - n2 - dot(e, r2)) < 1e-30 * n2, "r2 is not on the conic"
        a = 1 / (2 / n1 - dot(answer.v1, answer.v1) / gm)
        swept = mean_anomaly(r2, answer.v2, a, gm) - mean_anomaly(r1, answer.v1, a, gm)
        if a > 0:
            swept = swept % (2 * mp.pi) + 2 * mp.pi * int(problems.revs[i])
        flown = swept * mp.sqrt(abs(a) ** 3 / gm)
        assert abs(flown / mp.mpf(float(problems.tof[i])) - 1) < 1e-30, problems.text(i)


def test_condition_estimate_bounds_what_a_small_change_of_the_flight_time_does(solved):
    problems, answers = solved
    nudge = 1 + 2.0**-40
    for i, answer in enumerate(answers):
        if problems.tof[i] < problems.least_tof[i] * (1 + 1e-6):
            continue  # beside the least time the answer is not differentiable on this scale
        moved = solve(problems, i, nudge)
        change = [
            mp.sqrt(sum((x - y) ** 2 for x, y in zip(a, b, strict=True)) / dot(a, a))
            for a, b in ((answer.v1, moved.v1), (answer.v2, moved.v2))
        ]
        assert change[0] <= 1.001 * answer.condition1 * (nudge - 1), problems.text(i)
        assert change[1] <= 1.001 * answer.condition2 * (nudge - 1), problems.text(i)


def test_longdouble_judge_finds_no_fault_in_fifty_digit_answers_beyond_their_rounding(solved):
    problems, answers = solved
    v1, v2 = as_doubles(answers)
    shape = judge.shape(problems.r1, problems.r2, lambert_problems.POLE)
    x, x_error = judge.recover_x(shape, problems.gm, problems.r1, problems.r2, v1, v2)
    residual, floor = judge.time_residual(shape, x, x_error, problems.revs, problems.tof, problems.gm)
    assert (residual <= floor + 1e-15).all()
    assert floor.max() < 1e-12, "rounding alone would come near the tolerance"


def test_longdouble_judge_sees_an_error_of_one_part_in_ten_thousand_million(solved):
    problems, _ = solved
    answers = [solve(problems, i, 1 + 1e-10) for i in range(len(problems))]
    v1, v2 = as_doubles(answers)
    shape = judge.shape(problems.r1, problems.r2, lambert_problems.POLE)
    x, x_error = judge.recover_x(shape, problems.gm, problems.r1, problems.r2, v1, v2)
    residual, _ = judge.time_residual(shape, x, x_error, problems.revs, problems.tof, problems.gm)
    assert residual == pytest.approx(np.full(len(problems), 1e-10), rel=0.01)


def test_both_judges_agree_on_the_least_flight_time_of_a_number_of_revolutions():
    problems = lambert_problems.random_problems(np.random.default_rng(5), 300, corner_share=0.8)
    problems = problems[problems.revs > 0]
    for i in range(len(problems)):
        exact = mpmath_lambert.least_time(problems.r1[i], problems.r2[i], problems.gm, int(problems.revs[i]))
        assert problems.least_tof[i] == pytest.approx(float(exact), rel=1e-14), problems.text(i)


def test_the_judges_search_for_the_least_flight_time_ends_where_it_is_hardest():
    """A short chord flown the long way: dT/dx bends within x ~ sqrt(c/s), where Newton alone goes astray."""
    r1 = [42407552.45143781, 99468272.19086096, 103587771.28602786]
    r2 = [42319279.169032976, 99230825.74126448, 103434457.6044508]
    shape = judge.shape(np.array([r1]), np.array([r2]), lambert_problems.POLE)
    found = judge.least_time(shape, np.array([4]))[0] * judge.time_scale(shape, 1.0)
    assert float(found[0]) == pytest.approx(float(mpmath_lambert.least_time(r1, r2, 1.0, 4)), rel=1e-14)

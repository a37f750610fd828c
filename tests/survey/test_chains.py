"""The search for flyby dates equals exhaustive enumeration, made here of other parts (scipy: periapses)."""

from itertools import product

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import brentq

from porkgrid.physics.constants import DAY_S, GM_SUN_KM3_S2
from porkgrid.physics.lambert import lambert
from porkgrid.sky.bodies import find_body
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.chains import search_block
from porkgrid.survey.legtables import leg_table
from porkgrid.survey.plan import make_plan

# Bodies, first dates and steps in days of routes known to have cheap flybys nearby.
ROUTES = {
    "EVM": (("earth", "venus", "mars"), ("2034-07-10", "2034-11-28", "2035-06-20"), (6, 4, 9)),
    "EVEJ": (
        ("earth", "venus", "earth", "jupiter"),
        ("2029-10-10", "2030-03-20", "2031-01-15", "2034-01-01"),
        (7, 5, 6, 60),
    ),
    "EVVEJ": (
        ("earth", "venus", "venus", "earth", "jupiter"),
        ("2032-12-13", "2033-03-26", "2034-02-23", "2035-06-02", "2038-05-11"),
        (4, 4, 4, 4, 8),
    ),
}
ORBIT = "{ periapsis_altitude_km = 300, apoapsis_altitude_km = 300 }"


def plan_of(folder, route, dates, burn, limits, max_revs, by="dv_total_km_s", order="least"):
    bodies, firsts, steps = ROUTES[route]
    text = [f'name = "{route}"']
    for n, (body, first, step) in enumerate(zip(bodies, firsts, steps, strict=True)):
        last = np.datetime64(first) + (dates - 1) * step
        text.append(f'[[encounter]]\nbody = "{body}"\nfirst = {first}\nlast = {last}\nstep_days = {step}')
        if n == 0:
            text.append(f"parking = {ORBIT}")
        elif n == len(bodies) - 1:
            text.append(f"capture = {ORBIT}")
        else:
            text.append(f"flyby = {{ min_altitude_km = 300, max_burn_km_s = {burn} }}")
    text += [f"[[leg]]\nmax_revs = {max_revs}" for _ in bodies[1:]]
    text.append("[limits]")
    text += [f"{name} = {{ max = {most} }}" for name, most in limits.items()]
    text.append(f'[rank]\nby = "{by}"\norder = "{order}"')
    path = folder / "scenario.toml"
    path.write_text("\n".join(text) + "\n")
    return make_plan(load_scenario(path))


def flown(plan, leg, i, j, option):
    """Excess velocities out and in of one leg, or None where it cannot be flown."""
    here, there = plan.tables[leg], plan.tables[leg + 1]
    v1, v2 = lambert(
        here.position[:, i], there.position[:, j], (there.jd[j] - here.jd[i]) * DAY_S, GM_SUN_KM3_S2,
        revs=option.revs, branch="right" if option.right else "left",
    )  # fmt: skip
    return None if np.isnan(v1[0]) else (v1 - here.velocity[:, i], v2 - there.velocity[:, j])


def passed(v_in, v_out, body):
    """Altitude and burn of the flyby between two excess velocities."""
    a, b = np.linalg.norm(v_in), np.linalg.norm(v_out)
    turn = np.arctan2(np.linalg.norm(np.cross(v_in, v_out)), v_in @ v_out)

    def excess(log_r):
        y = np.exp(log_r) / body.gm_km3_s2
        return np.arcsin(1 / (1 + a * a * y)) + np.arcsin(1 / (1 + b * b * y)) - turn

    radius = np.exp(brentq(excess, -20, 40, xtol=1e-14))
    speeds = [np.sqrt(v * v + 2 * body.gm_km3_s2 / radius) for v in (a, b)]
    return radius - body.radius_km, abs(speeds[1] - speeds[0])


def orbit_burn(v_inf, body):
    r = body.radius_km + 300
    return np.sqrt(v_inf @ v_inf + 2 * body.gm_km3_s2 / r) - np.sqrt(body.gm_km3_s2 / r)


def enumerated(plan, burn, limits, value):
    """Best value of every (departure, arrival) cell by trying everything."""
    bodies = [find_body(table.body.name, {}) for table in plan.tables]
    sizes = [len(table.jd) for table in plan.tables]
    legs = [
        {
            (i, j, o): flown(plan, k, i, j, option)
            for i, j in product(range(sizes[k]), range(sizes[k + 1]))
            for o, option in enumerate(plan.options[k])
        }
        for k in range(len(sizes) - 1)
    ]
    best = np.full((sizes[0], sizes[-1]), np.inf)
    flybys = {}
    for dates in product(*map(range, sizes)):
        if plan.tables[-1].jd[dates[-1]] - plan.tables[0].jd[dates[0]] > limits.get("tof_days", np.inf):
            continue
        for ways in product(*(range(len(options)) for options in plan.options)):
            keys = [(dates[k], dates[k + 1], ways[k]) for k in range(len(legs))]
            route = [legs[k][key] for k, key in enumerate(keys)]
            if any(leg is None for leg in route):
                continue
            c3 = route[0][0] @ route[0][0]
            if c3 > limits.get("c3_km2_s2", np.inf):
                continue
            burns = []
            for k in range(1, len(legs)):
                key = (k, keys[k - 1], keys[k])
                if key not in flybys:
                    flybys[key] = passed(route[k - 1][1], route[k][0], bodies[k])
                altitude, spent = flybys[key]
                if altitude < 300 or spent > burn:
                    break
                burns.append(spent)
            if len(burns) < len(legs) - 1:
                continue
            dv = orbit_burn(route[0][0], bodies[0]) + sum(burns) + orbit_burn(route[-1][1], bodies[-1])
            if dv > limits.get("dv_total_km_s", np.inf):
                continue
            cell = dates[0], dates[-1]
            best[cell] = min(best[cell], value(c3, dv, route))
    return best


def searched(plan):
    first = leg_table(plan, 1, plan.tables[0], plan.tables[1])
    return search_block(plan, plan.search, plan.tables[0], first)


def agree(found, expected, tolerance=1e-9):
    np.testing.assert_array_equal(np.isfinite(found), np.isfinite(expected))
    alive = np.isfinite(expected)
    np.testing.assert_allclose(found[alive], expected[alive], atol=tolerance)


LIMITS = st.fixed_dictionaries(
    {},
    optional={
        "c3_km2_s2": st.floats(8, 60),
        "tof_days": st.floats(250, 1800),
        "dv_total_km_s": st.floats(5, 16),
    },
)


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    return tmp_path_factory.mktemp("chains")


@settings(max_examples=12, deadline=None)
@given(burn=st.floats(0.3, 6.0), limits=LIMITS, max_revs=st.integers(0, 1))
def test_a_route_with_one_flyby_is_the_best_of_all_flyby_dates_and_leg_options(
    folder, burn, limits, max_revs
):
    plan = plan_of(folder, "EVM", 4, burn, limits, max_revs)
    agree(searched(plan).cost, enumerated(plan, burn, limits, lambda c3, dv, route: dv))


@settings(max_examples=5, deadline=None)
@given(burn=st.floats(2.0, 5.0), limits=LIMITS)
def test_a_chain_of_two_flybys_is_the_best_of_all_dates_between(folder, burn, limits):
    plan = plan_of(folder, "EVEJ", 4, burn, limits, 0)
    agree(searched(plan).cost, enumerated(plan, burn, limits, lambda c3, dv, route: dv))


def test_a_chain_of_three_flybys_with_revolutions_is_the_best_of_all_dates_between(folder):
    """The two-year route to Jupiter of bench_routes.py, cut down to three dates an encounter."""
    plan = plan_of(folder, "EVVEJ", 3, 1.0, {}, 1)
    expected = enumerated(plan, 1.0, {}, lambda c3, dv, route: dv)
    assert np.isfinite(expected).any()
    agree(searched(plan).cost, expected)


def test_the_enumeration_finds_routes_at_all(folder):
    """Else the two tests above would compare nothing."""
    assert np.isfinite(searched(plan_of(folder, "EVM", 4, 3.0, {}, 0)).cost).any()
    assert np.isfinite(searched(plan_of(folder, "EVEJ", 4, 4.0, {}, 0)).cost).any()


def test_ranking_by_a_measure_of_the_first_leg_searches_by_it_under_a_limit_on_the_total(folder):
    limits = {"dv_total_km_s": 12.0}
    plan = plan_of(folder, "EVM", 4, 3.0, limits, 0, by="c3_km2_s2")
    agree(searched(plan).cost, enumerated(plan, 3.0, limits, lambda c3, dv, route: c3), tolerance=1e-7)


def test_ranking_for_the_most_takes_the_most(folder):
    plan = plan_of(folder, "EVM", 4, 3.0, {}, 0, by="v_inf_arrival_km_s", order="most")
    expected = enumerated(plan, 3.0, {}, lambda c3, dv, route: -np.linalg.norm(route[-1][1]))
    agree(searched(plan).cost, expected, tolerance=1e-7)

"""The join of legs at a flyby: what pruning leaves out changes no answer, and it leaves out much."""

import math
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from porkgrid.physics.flyby import burn, periapsis_radius, turn_angle
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.chains import _first_legs, flyby_bounds
from porkgrid.survey.joins import SLACK, V2, FlybyBounds, LegEnds, W, join, leg_ends
from porkgrid.survey.legtables import leg_table
from porkgrid.survey.plan import make_plan

SCENARIO = Path(__file__).parents[2] / "scenarios" / "earth-venus-mars-2034.toml"
VENUS_Y_MIN = (6051.8 + 300.0) / 324_858.592
DENSE = math.inf


@dataclass
class Joined:
    best: np.ndarray
    from_leg: np.ndarray
    by_leg: np.ndarray
    tally: np.ndarray


def joined(inward: LegEnds, outward: LegEnds, states: int, bounds: np.ndarray, best=None) -> Joined:
    """Join so that the state of a leg out is its number."""
    best = np.full(states, math.inf) if best is None else best.copy()
    from_leg, by_leg = np.full(states, -1, dtype=np.int64), np.full(states, -1, dtype=np.int32)
    tally = np.zeros(3, dtype=np.int64)
    join(
        inward.fields, inward.cost, inward.count,
        outward.fields, outward.cost, outward.leg, outward.count,
        states, 0, bounds, best, from_leg, by_leg, tally,
    )  # fmt: skip
    return Joined(best, from_leg, by_leg, tally)


def assert_same_to_the_last_bit(one: Joined, other: Joined) -> None:
    for name in ("best", "from_leg", "by_leg"):
        np.testing.assert_array_equal(getattr(one, name), getattr(other, name))


# A real scenario


@pytest.fixture(scope="module")
def departures():
    """Every 25th departure of Earth–Venus–Mars joined pruned and dense."""
    plan = make_plan(load_scenario(SCENARIO))
    table = plan.tables[0]
    first = leg_table(plan, 1, table, plan.tables[1])
    pairs = []
    for i in range(0, len(table.jd), 25):
        inward = _first_legs(first, plan.tables[1], plan.search.y_min[0], i)
        of = {
            slack: joined(
                inward,
                plan.search.out[0],
                len(plan.tables[-1].jd),
                flyby_bounds(plan, 1).as_array(1.0, math.inf, slack),
            )
            for slack in (SLACK, DENSE)
        }
        pairs.append((of[SLACK], of[DENSE]))
    return pairs


def test_pruned_equals_dense_to_the_last_bit(departures):
    for pruned, dense in departures:
        assert_same_to_the_last_bit(pruned, dense)
    assert any(np.isfinite(dense.best).any() for _, dense in departures)


def test_dense_computes_every_pair_of_legs_and_pruned_five_times_fewer_burns(departures):
    pruned, dense = (sum(pair[which].tally for pair in departures) for which in (0, 1))
    assert dense[0] == 0  # nothing is left out for its turn
    assert dense[1] >= 5 * pruned[1] > 0


# Random legs


def legs(rng: np.random.Generator, dates: int, number: int) -> dict[str, np.ndarray]:
    """Legs with excess speeds of 2 to 9 km/s, all in a cone of some 60 degrees."""
    direction = rng.normal(size=(3, dates, number)) * 0.5
    direction[0] += 1.0
    direction /= np.linalg.norm(direction, axis=0)
    return {
        "v_inf": direction * rng.uniform(2.0, 9.0, (dates, number)),
        "speed": rng.uniform(30.0, 42.0, (dates, number)),
        "valid": rng.random((dates, number)) < 0.8,
        "cost": rng.uniform(0.0, 4.0, (dates, number)),
        "dv": rng.uniform(0.0, 4.0, (dates, number)),
    }


def ends(parts: dict[str, np.ndarray], bounds: FlybyBounds) -> LegEnds:
    return leg_ends(**parts, y_min=bounds.y_min)


def enumerated(inward, outward, bounds: FlybyBounds, weight: float, dv_max: float) -> np.ndarray:
    """Least cost of every state by trying all pairs, with the other, general kernels of `physics.flyby`."""
    came = {name: part[..., :, None] for name, part in inward.items()}  # (…, dates, legs in, 1)
    left = {name: part[..., None, :] for name, part in outward.items()}  # (…, dates, 1, legs out)
    y, spent = periapsis_radius(came["v_inf"], left["v_inf"], 1.0), burn(came["v_inf"], left["v_inf"], 1.0)
    turn = turn_angle(came["v_inf"], left["v_inf"])
    gain = left["speed"] - came["speed"]
    dv = came["dv"] + left["dv"] + spent
    allowed = came["valid"] & left["valid"]
    allowed &= (bounds.y_min <= y) & (y <= bounds.y_max) & (spent <= bounds.burn_max)
    allowed &= (bounds.turn_min_rad <= turn) & (turn <= bounds.turn_max_rad)
    allowed &= (bounds.gain_min <= gain) & (gain <= bounds.gain_max) & (dv <= dv_max)
    return np.where(allowed, came["cost"] + left["cost"] + weight * spent, math.inf).min(axis=(0, 1))


BOUNDS = st.builds(
    FlybyBounds,
    y_min=st.floats(0.3 * VENUS_Y_MIN, 3.0 * VENUS_Y_MIN),
    y_max=st.one_of(st.just(math.inf), st.floats(0.05, 1.0)),
    burn_max=st.one_of(st.just(math.inf), st.floats(0.01, 3.0)),
    turn_min_rad=st.one_of(st.just(0.0), st.floats(0.0, 0.5)),
    turn_max_rad=st.one_of(st.just(math.pi), st.floats(0.6, 3.0)),
    gain_min=st.one_of(st.just(-math.inf), st.floats(-9.0, 0.0)),
    gain_max=st.one_of(st.just(math.inf), st.floats(1.0, 9.0)),
)


@settings(max_examples=60, deadline=None)
@given(
    seed=st.integers(0, 2**32 - 1),
    bounds=BOUNDS,
    weight=st.sampled_from([1.0, 1e-9, 0.0]),
    dv_max=st.one_of(st.just(math.inf), st.floats(2.0, 8.0)),
)
def test_pruning_changes_no_answer_whatever_the_limits(seed, bounds, weight, dv_max):
    rng = np.random.default_rng(seed)
    inward, outward = legs(rng, 5, 9), legs(rng, 5, 11)
    pair = ends(inward, bounds), ends(outward, bounds)
    pruned = joined(*pair, 11, bounds.as_array(weight, dv_max))
    assert_same_to_the_last_bit(pruned, joined(*pair, 11, bounds.as_array(weight, dv_max, DENSE)))
    expected = enumerated(inward, outward, bounds, weight, dv_max)
    np.testing.assert_array_equal(np.isfinite(pruned.best), np.isfinite(expected))
    np.testing.assert_allclose(pruned.best, expected, rtol=1e-12)


def test_random_legs_do_join_and_do_fail(rng_pair):
    """Else the test above would compare nothing."""
    inward, outward, bounds = rng_pair
    best = joined(ends(inward, bounds), ends(outward, bounds), 11, bounds.as_array(1.0, math.inf)).best
    assert np.isfinite(best).any()
    strict = replace(bounds, burn_max=0.02)
    best = joined(ends(inward, strict), ends(outward, strict), 11, strict.as_array(1.0, math.inf)).best
    assert not np.isfinite(best).all()


@pytest.fixture
def rng_pair():
    rng = np.random.default_rng(1973)
    return legs(rng, 5, 9), legs(rng, 5, 11), FlybyBounds(y_min=VENUS_Y_MIN, burn_max=0.5)


def test_the_pointers_lead_to_the_pair_of_legs_whose_cost_is_kept(rng_pair):
    inward, outward, bounds = rng_pair
    came, left = ends(inward, bounds), ends(outward, bounds)
    found = joined(came, left, 11, bounds.as_array(1.0, math.inf))
    for state in np.flatnonzero(np.isfinite(found.best)):
        j, place = divmod(int(found.from_leg[state]), came.leg.shape[1])
        p, e = int(came.leg[j, place]), int(found.by_leg[state])
        assert e == state
        spent = burn(inward["v_inf"][:, j, p], outward["v_inf"][:, j, e], 1.0)
        cost = inward["cost"][j, p] + outward["cost"][j, e] + spent
        assert found.best[state] == pytest.approx(cost, rel=1e-12)


def test_a_closed_state_stays_closed(rng_pair):
    inward, outward, bounds = rng_pair
    pair = ends(inward, bounds), ends(outward, bounds)
    free = joined(*pair, 11, bounds.as_array(1.0, math.inf))
    state = int(np.argmin(free.best))
    closed = np.full(11, math.inf)
    closed[state] = -math.inf
    for slack in (SLACK, DENSE):
        found = joined(*pair, 11, bounds.as_array(1.0, math.inf, slack), closed)
        assert found.best[state] == -math.inf
        assert found.from_leg[state] == -1
        np.testing.assert_array_equal(np.delete(found.best, state), np.delete(free.best, state))


def test_a_burn_of_exactly_the_limit_is_allowed_and_one_ulp_more_is_not(rng_pair):
    inward, outward, bounds = rng_pair
    for parts in (inward, outward):
        parts["cost"][:] = 0.0
    free = replace(bounds, burn_max=math.inf)
    pair = ends(inward, free), ends(outward, free)
    found = joined(*pair, 11, free.as_array(1.0, math.inf))
    state = int(np.argmax(np.where(np.isfinite(found.best), found.best, -1.0)))
    spent = found.best[state]  # with nothing else to pay, the least burn of all
    assert spent > 0.0
    exactly, less = (replace(bounds, burn_max=limit) for limit in (spent, np.nextafter(spent, 0.0)))
    assert joined(*pair, 11, exactly.as_array(1.0, math.inf)).best[state] == spent
    assert joined(*pair, 11, less.as_array(1.0, math.inf)).best[state] == math.inf


# Slices


def test_ends_are_sorted_by_their_speed_at_the_lowest_periapsis_and_know_their_legs(rng_pair):
    parts, _, bounds = rng_pair
    sorted_ends = ends(parts, bounds)
    v2 = np.sum(parts["v_inf"] ** 2, axis=0)
    for j, count in enumerate(sorted_ends.count):
        assert count == parts["valid"][j].sum()
        leg, w = sorted_ends.leg[j, :count], sorted_ends.fields[j, W, :count]
        assert np.all(np.diff(w) >= 0.0)
        assert sorted(leg) == list(np.flatnonzero(parts["valid"][j]))
        np.testing.assert_allclose(w, np.sqrt(v2[j, leg] + 2.0 / bounds.y_min), rtol=1e-15)
        np.testing.assert_allclose(sorted_ends.fields[j, V2, :count], v2[j, leg], rtol=1e-15)
        np.testing.assert_array_equal(sorted_ends.cost[j, :count], parts["cost"][j, leg])


def test_ends_are_as_wide_as_the_date_with_the_most_legs(rng_pair):
    parts, _, bounds = rng_pair
    assert ends(parts, bounds).leg.shape[1] == parts["valid"].sum(axis=1).max()
    none = {**parts, "valid": np.zeros_like(parts["valid"])}
    empty = ends(none, bounds)
    assert empty.count.max() == 0
    assert not np.isfinite(joined(empty, empty, 9, bounds.as_array(1.0, math.inf)).best).any()


def test_a_leg_that_cannot_be_flown_may_be_nan(rng_pair):
    inward, outward, bounds = rng_pair
    values = bounds.as_array(1.0, math.inf)
    expected = joined(ends(inward, bounds), ends(outward, bounds), 11, values)
    for parts in (inward, outward):
        parts["v_inf"][:, ~parts["valid"]] = np.nan
        parts["speed"][~parts["valid"]] = np.nan
    assert_same_to_the_last_bit(joined(ends(inward, bounds), ends(outward, bounds), 11, values), expected)


# Ties


@pytest.mark.parametrize("slack", [SLACK, DENSE])
def test_of_equal_ways_the_earliest_date_and_the_first_leg_is_kept(slack):
    """So that the same scenario gives the same routes on every machine and with any number of workers."""
    one = legs(np.random.default_rng(3), 1, 1)
    one["valid"][:] = True
    same = {name: np.repeat(np.repeat(part, 3, axis=-2), 4, axis=-1) for name, part in one.items()}
    bounds = FlybyBounds(y_min=VENUS_Y_MIN)
    turned = {**same, "v_inf": rotated(same["v_inf"], math.radians(20.0))}
    came, left = ends(same, bounds), ends(turned, bounds)
    best, from_leg, by_leg = np.full(1, math.inf), np.full(1, -1, np.int64), np.full(1, -1, np.int32)
    join(
        came.fields, came.cost, came.count, left.fields, left.cost, left.leg, left.count,
        1, 0, bounds.as_array(1.0, math.inf, slack), best, from_leg, by_leg, np.zeros(3, dtype=np.int64),
    )  # fmt: skip
    assert np.isfinite(best[0])
    assert divmod(int(from_leg[0]), 4) == (0, 0)
    assert came.leg[0, 0] == 0
    assert by_leg[0] == 0


def rotated(vector: np.ndarray, angle: float) -> np.ndarray:
    """Turn about the third axis."""
    x, y, z = vector
    c, s = math.cos(angle), math.sin(angle)
    return np.stack([c * x - s * y, s * x + c * y, z])

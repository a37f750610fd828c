"""Candidates' dates made continuous: against dense searches, under limits, and from anywhere near."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from grid_candidates import changed_plan, grid_candidates

from porkgrid.sky.bodies import find_body
from porkgrid.sky.epochs import iso_from_jd, jd_from_date
from porkgrid.sky.states import state_table
from porkgrid.survey.candidates import Picked, measures_at
from porkgrid.survey.plan import Plan
from porkgrid.survey.refine import SAME_DAYS, Refined, refine, refined_table
from porkgrid.survey.routes import fly_between

DIRECT, BY_VENUS = "earth-mars-2028.toml", "earth-venus-mars-2034.toml"
DENSE_DAYS = 0.01
# About the best routes of BY_VENUS, at steps so coarse that the search for flyby dates takes a second
SMALL_BY_VENUS = tuple(
    (
        f"first = {first}\nlast = {last}\nstep_days = 1.0",
        f"first = {later}\nlast = {sooner}\nstep_days = {step}",
    )
    for first, last, later, sooner, step in (
        ("2034-01-01", "2035-02-04", "2034-05-01", "2034-10-31", 4.0),
        ("2034-06-01", "2035-03-27", "2034-09-01", "2035-03-15", 4.0),
        ("2035-01-01", "2036-05-14", "2035-01-01", "2036-05-14", 6.0),
    )
)


@pytest.fixture(scope="module")
def direct(tmp_path_factory) -> Plan:
    return changed_plan(tmp_path_factory.mktemp("direct"), DIRECT)


@pytest.fixture(scope="module")
def direct_picked(direct) -> list[Picked]:
    return grid_candidates(direct)


@pytest.fixture(scope="module")
def by_venus(tmp_path_factory) -> Plan:
    return changed_plan(tmp_path_factory.mktemp("venus"), BY_VENUS, *SMALL_BY_VENUS)


@pytest.fixture(scope="module")
def venus_picked(by_venus) -> list[Picked]:
    return grid_candidates(by_venus)


def dense_best(plan: Plan, about: tuple[float, float], days: float) -> float:
    """The best allowed value of the ranked measure on a grid of 0.01 days about two dates."""
    offsets = np.arange(-days, days, DENSE_DAYS)
    tables = [
        state_table(plan.ephemeris, table.body, jd + offsets)
        for table, jd in zip(plan.tables, about, strict=True)
    ]
    earth, _ = plan.ephemeris.states(find_body("earth", {}), tables[-1].jd)
    cells, blocked = fly_between(plan, *tables, earth)
    values = np.broadcast_to(plan.measures[plan.rank_by].compute(cells), blocked.shape)
    return plan.rank_sign * float(np.min(plan.rank_sign * values[blocked == 0]))


def broken(plan: Plan, measures: dict[str, float]) -> list[str]:
    return [
        bound.name for bound in plan.bounds if bound.forbids(np.array(measures[bound.measure.name])).any()
    ]


def assert_sound(plan: Plan, refined: list[Refined], picked: list[Picked]) -> None:
    """No worse than the grid, limits and windows kept, every candidate accounted for, best first."""
    numbers = sorted(number for one in refined for number in (one.number, *one.merged))
    assert numbers == list(range(1, len(picked) + 1))
    for one in refined:
        assert one.grid == picked[one.number - 1]
        assert one.measures == pytest.approx(measures_at(plan, one.picked), rel=1e-10, abs=1e-10)
        assert one.value == one.measures[plan.rank_by]
        assert plan.rank_sign * one.value <= plan.rank_sign * one.grid_value
        assert not broken(plan, one.measures)
        for jd, encounter in zip(one.picked.epochs, plan.scenario.encounters, strict=True):
            assert jd_from_date(encounter.first) <= jd <= jd_from_date(encounter.last)
    values = [plan.rank_sign * one.value for one in refined]
    assert np.all(np.diff(values) > -1e-7 * np.abs(values[1:]))


def test_a_direct_window_is_refined_to_what_a_dense_search_finds(direct, direct_picked):
    refined = refine(direct, direct_picked)
    assert_sound(direct, refined, direct_picked)
    assert len(refined) == len(direct_picked) >= 2
    for one in refined:
        assert one.converged, one
        assert one.value < one.grid_value
        assert one.value == pytest.approx(dense_best(direct, one.picked.epochs, 1.0), abs=1e-6)


def test_a_limit_just_below_the_optimum_is_kept_and_named(direct, direct_picked, tmp_path):
    free = refine(direct, direct_picked)[0]
    most = free.measures["c3_km2_s2"] - 0.05
    tight = changed_plan(tmp_path, DIRECT, ("c3_km2_s2 = { max = 16 }", f"c3_km2_s2 = {{ max = {most!r} }}"))
    picked = grid_candidates(tight)
    one = refine(tight, picked)[0]
    assert_sound(tight, [one], picked[:1])
    assert one.converged
    assert "c3_km2_s2" in one.active
    assert one.measures["c3_km2_s2"] == pytest.approx(most, abs=1e-5)
    assert free.value < one.value
    dense = dense_best(tight, one.picked.epochs, 1.0)
    assert dense - 1e-4 < one.value < dense + 1e-8  # a grid cannot come as near to the limit


def test_a_window_that_ends_before_the_optimum_is_kept_and_named(direct, direct_picked, tmp_path):
    free = refine(direct, direct_picked)[0]
    last = iso_from_jd(np.floor(free.picked.epochs[0] - 2.0) + 0.5)
    plan = changed_plan(tmp_path, DIRECT, ("last = 2029-04-15", f"last = {last}"))
    picked = grid_candidates(plan)
    one = refine(plan, picked)[0]
    assert_sound(plan, [one], picked[:1])
    assert one.converged
    assert one.active == ("departure last",)
    assert iso_from_jd(one.picked.epochs[0]) == last


def test_an_encounter_of_one_date_stays_on_it(tmp_path):
    plan = changed_plan(
        tmp_path, DIRECT, ("first = 2029-05-01\nlast = 2030-03-31", "first = 2029-09-25\nlast = 2029-09-25")
    )
    picked = grid_candidates(plan)
    one = refine(plan, picked)[0]
    assert_sound(plan, [one], picked[:1])
    assert one.converged
    assert one.moved_days[0] != 0.0
    assert one.moved_days[1] == 0.0
    assert one.active[-2:] == ("arrival first", "arrival last")


def test_a_coarse_grid_is_refined_to_the_same_optimum_as_a_fine_one(direct, direct_picked, tmp_path):
    fine = refine(direct, direct_picked)[0]
    coarse = changed_plan(tmp_path, DIRECT, ("step_days = 1.0", "step_days = 12.0"))
    found = refine(coarse, grid_candidates(coarse))[0]
    assert found.converged
    assert found.value == pytest.approx(fine.value, abs=1e-8)


def test_every_start_about_an_optimum_leads_to_it(direct, direct_picked):
    best = refine(direct, direct_picked)[0]
    rng = np.random.default_rng(5)
    starts = [
        Picked(tuple(best.picked.epochs + rng.uniform(-5.0, 5.0, 2)), best.picked.options) for _ in range(40)
    ]
    allowed = [one for one in starts if not broken(direct, measures_at(direct, one))]
    assert len(allowed) > 10
    for one in allowed:
        (found,) = refine(direct, [one])
        assert_sound(direct, [found], [one])
        assert found.converged
        assert found.value == pytest.approx(best.value, abs=1e-8)


def test_candidates_that_fall_into_one_are_merged_and_the_better_rank_is_kept(direct, direct_picked):
    first, other = direct_picked[:2]
    shifted = Picked((first.epochs[0] + 2.0, first.epochs[1] + 1.0), first.options)
    refined = refine(direct, [first, other, shifted])
    assert [(one.number, one.merged) for one in refined] == [(1, (3,)), (2, ())]


def test_without_apart_days_only_the_same_dates_are_merged(tmp_path):
    plan = changed_plan(tmp_path, DIRECT, ("apart_days = 10", "apart_days = 0"), ("keep = 20", "keep = 2"))
    first = grid_candidates(plan)[0]
    steps = [
        first,
        *(Picked((first.epochs[0] - days, first.epochs[1]), first.options) for days in (1.0, 5.0)),
    ]
    refined = refine(plan, steps)
    assert_sound(plan, refined, steps)
    assert [(one.number, one.merged) for one in refined] == [(1, (2,)), (3, ())]
    assert refined[1].stopped == ("departure",)
    assert not refined[1].converged
    assert refined[1].moved_days[0] == pytest.approx(2.0)  # as far as it may
    apart = np.abs(np.subtract(refined[0].picked.epochs, refined[1].picked.epochs))
    assert apart.max() > SAME_DAYS


def test_dates_that_no_limit_allows_nearby_are_left_as_they_are(direct, direct_picked):
    best = direct_picked[0]
    astray = Picked((best.epochs[0] - 60.0, best.epochs[1] + 60.0), best.options)
    (one,) = refine(direct, [astray])
    assert one.picked == astray
    assert one.value == one.grid_value
    assert not one.converged
    assert "kept the grid's dates" in one.fault
    assert broken(direct, one.measures)[0] in one.fault


def test_no_candidates_refine_to_none(direct):
    assert refine(direct, []) == []
    assert refined_table(direct, []).empty


def test_an_unpowered_flyby_closes_or_says_what_keeps_it_open(by_venus, venus_picked):
    refined = refine(by_venus, venus_picked)
    assert_sound(by_venus, refined, venus_picked)
    assert max(one.grid_burns_m_s[0] for one in refined) > 10.0
    best = refined[0]
    assert best.converged
    assert best.burns_m_s[0] < 1.0 < best.grid_burns_m_s[0]
    for one in refined:
        assert one.burns_m_s[0] < 1.0 or one.active, one
        assert one.burns_m_s == (1e3 * one.measures["flyby1_burn_km_s"],)


def test_no_allowed_dates_about_a_refined_flyby_route_are_better(by_venus, venus_picked):
    rng = np.random.default_rng(7)
    converged = [one for one in refine(by_venus, venus_picked) if one.converged]
    assert converged
    for one in converged:
        for spread_days in (0.02, 0.3):
            for _ in range(25):
                epochs = one.picked.epochs + rng.uniform(-spread_days, spread_days, 3)
                there = measures_at(by_venus, Picked(tuple(epochs), one.picked.options))
                assert broken(by_venus, there) or there[by_venus.rank_by] > one.value - 1e-8


def test_every_start_about_a_closed_flyby_leads_to_it(by_venus, venus_picked):
    best = refine(by_venus, venus_picked)[0]
    rng = np.random.default_rng(11)
    starts = [
        Picked(tuple(best.picked.epochs + rng.uniform(-2.0, 2.0, 3)), best.picked.options) for _ in range(60)
    ]
    allowed = [one for one in starts if not broken(by_venus, measures_at(by_venus, one))]
    assert len(allowed) > 10
    for one in allowed:
        (found,) = refine(by_venus, [one])
        assert found.converged
        assert found.burns_m_s[0] < 0.01
        # 1e-7 km/s of the burn is left open, for a limit is kept by so much
        assert found.value == pytest.approx(best.value, abs=2e-7)


def test_where_only_the_launch_is_ranked_a_flyby_burns_what_it_may(tmp_path):
    plan = changed_plan(tmp_path, BY_VENUS, *SMALL_BY_VENUS, ('by = "dv_total_km_s"', 'by = "c3_km2_s2"'))
    picked = grid_candidates(plan)
    refined = refine(plan, picked)
    assert_sound(plan, refined, picked)
    assert any("flyby1_burn_km_s" in one.active for one in refined)


@pytest.mark.parametrize(("by", "order"), [("tof_days", "least"), ("arrival_epoch_jd_tdb", "most")])
def test_a_rank_by_dates_alone_goes_to_a_limit(tmp_path, by, order):
    plan = changed_plan(tmp_path, DIRECT, ('by = "dv_total_km_s"', f'by = "{by}"\norder = "{order}"'))
    picked = grid_candidates(plan)
    refined = refine(plan, picked)
    assert_sound(plan, refined, picked)
    one = refined[0]
    assert one.converged
    assert one.active
    assert one.value == pytest.approx(dense_best(plan, one.picked.epochs, 1.0), abs=0.03)


def test_a_mass_of_which_more_is_better_is_refined_upwards(tmp_path):
    plan = changed_plan(tmp_path, DIRECT, ('by = "dv_total_km_s"', 'by = "delivered_mass_kg"'))
    picked = grid_candidates(plan)
    refined = refine(plan, picked)
    assert_sound(plan, refined, picked)
    assert plan.rank_sign == -1.0
    for one in refined:
        assert one.value > one.grid_value
        assert one.converged
        assert one.value == pytest.approx(dense_best(plan, one.picked.epochs, 1.0), rel=1e-6)


def test_the_table_shows_refined_and_grid_values(direct, direct_picked):
    refined = refine(direct, direct_picked)
    table = refined_table(direct, refined)
    assert list(table.columns[:3]) == ["rank", "departure", "arrival"]
    assert list(table.columns[-3:]) == ["grid_dv_total_km_s", "gain", "grid_rank"]
    assert set(direct.measures) < set(table.columns)
    assert list(table["rank"]) == list(range(1, len(refined) + 1))
    assert np.array_equal(table["grid_dv_total_km_s"] - table["dv_total_km_s"], table["gain"])
    assert (table["gain"] > 0.0).all()
    assert all("T" in date for date in table["departure"])
    assert table["departure"][0] == iso_from_jd(table["departure_epoch_jd_tdb"][0])


def test_many_candidates_at_once_fare_as_they_do_alone(direct, direct_picked, monkeypatch):
    together = refine(direct, direct_picked)
    monkeypatch.setattr("porkgrid.survey.refine._POINTS_AT_ONCE", 1)
    alone = refine(direct, direct_picked)
    assert [replace(one, measures={}) for one in together] == [replace(one, measures={}) for one in alone]

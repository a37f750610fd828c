"""Proposals for a first scenario: seasons, windows and limits."""

from __future__ import annotations

from datetime import date, timedelta

import numpy as np
import pytest

from porkgrid.errors import RequestError
from porkgrid.scenario.firstfile import first_name, scenario_text, season_words, season_year
from porkgrid.scenario.proposal import Proposal, reaches
from porkgrid.sky.bodies import BODIES
from porkgrid.sky.kernel import open_ephemeris
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.orbitsizes import hohmann_days, orbit_size, synodic_days
from porkgrid.survey.plan import make_plan
from porkgrid.survey.suggest import suggest
from porkgrid.survey.tiles import compute_tile

DIRECT = [
    ("earth", "mars", 2028),
    ("earth", "mars", 2031),
    ("earth", "mars", 2033),
    ("earth", "mars", 2037),
    ("earth", "venus", 2031),
    ("earth", "venus", 2034),
    ("earth", "mercury", 2031),
    ("earth", "jupiter", 2032),
    ("earth", "saturn", 2031),
    ("earth", "neptune", 2031),
    ("earth", "pluto", 2030),
    ("venus", "earth", 2032),
    ("mars", "earth", 2033),
    ("mercury", "earth", 2031),
    ("uranus", "neptune", 2000),
]
BY_FLYBYS = [("earth", "venus", "mars", 2034), ("earth", "venus", "mars", 2032)]


def proposed(*names_and_year) -> Proposal:
    *names, year = names_and_year
    return suggest([BODIES[name] for name in names], year)


def swept(proposal: Proposal, folder) -> tuple[np.ndarray, np.ndarray]:
    """Which cells (n, m) of the proposal's file are allowed, and their total Δv."""
    file = folder / "proposed.toml"
    file.write_text(scenario_text(proposal, first_name(proposal), "porkgrid new", "proposed.toml"))
    plan = make_plan(load_scenario(file))
    allowed, total = np.zeros(plan.shape, dtype=bool), np.zeros(plan.shape)
    for tile in plan.tiles:
        values, _ = compute_tile(plan, tile)
        allowed[tile.rows, tile.columns] = values["blocked_by"] == 0
        total[tile.rows, tile.columns] = values["dv_total_km_s"]
    return allowed, total


@pytest.mark.slow
@pytest.mark.parametrize("request_", DIRECT, ids=lambda each: "-".join(map(str, each)))
def test_the_season_of_a_direct_flight_closes_inside_the_windows(request_, tmp_path):
    proposal = proposed(*request_)
    allowed, total = swept(proposal, tmp_path)
    assert 0.03 < allowed.mean() < 0.6
    for edge in (allowed[0], allowed[-1], allowed[:, 0], allowed[:, -1]):
        assert not edge.any()
    # the sweep's finer dates cannot miss the optimum by much, nor find a better season in the same window
    assert total[allowed].min() == pytest.approx(proposal.optimum.dv_total_km_s, abs=0.02)


def test_where_seasons_run_into_each_other_the_window_is_cut_and_the_file_says_so(tmp_path):
    proposal = proposed("jupiter", "earth", 2040)  # flights of years, among which some meet the Earth well
    allowed, _ = swept(proposal, tmp_path)
    assert proposal.cut
    assert allowed.any()
    comments = (tmp_path / "proposed.toml").read_text().replace("\n# ", " ")
    assert "seasons run into each other" in comments


@pytest.mark.slow
@pytest.mark.parametrize("request_", BY_FLYBYS, ids=lambda each: "-".join(map(str, each)))
def test_a_route_with_a_flyby_has_allowed_cells_and_closes_inside_the_windows(request_, tmp_path):
    proposal = proposed(*request_)
    allowed, total = swept(proposal, tmp_path)
    assert 0.03 < allowed.mean() < 0.6
    assert not allowed[0].any()
    assert not allowed[-1].any()
    assert total[allowed].min() == pytest.approx(proposal.optimum.dv_total_km_s, abs=0.1)


@pytest.mark.parametrize(
    ("year", "months"),
    # years and months of the seasons: any mission handbook's list of Mars opportunities (memory)
    [
        (2028, {(2028, 11), (2028, 12)}),
        (2030, {(2030, 12)}),
        (2033, {(2033, 4)}),
        (2035, {(2035, 6), (2035, 7)}),
    ],
)
def test_the_season_to_mars_is_the_one_that_handbooks_list(year, months):
    leave = proposed("earth", "mars", year).optimum.dates[0]
    assert (leave.year, leave.month) in months


def test_a_season_that_is_least_the_december_before_belongs_to_the_year_it_reaches_into():
    proposal = proposed("earth", "mars", 2031)
    assert proposal.optimum.dates[0].year == 2030
    assert season_year(proposal) == 2031
    assert "reaches into 2031" in season_words(proposal)


def test_a_year_without_a_season_gets_the_next_and_is_told_its_neighbours():
    proposal = proposed("earth", "mars", 2032)
    assert season_year(proposal) == 2033
    words = season_words(proposal)
    assert "no season in 2032" in words
    assert "December 2030" in words
    assert "April 2033" in words


def test_a_few_days_of_another_years_season_do_not_make_it_one():
    assert not reaches(date(2028, 10, 21), date(2029, 1, 5), 2029)
    assert reaches(date(2028, 10, 21), date(2029, 1, 5), 2028)
    assert reaches(date(2030, 11, 19), date(2031, 3, 5), 2031)


@pytest.mark.slow
def test_a_route_by_venus_that_has_no_season_in_a_year_gets_one_of_a_later_year():
    proposal = proposed("earth", "venus", "mars", 2033)
    assert proposal.optimum.dates[0] > date(2033, 12, 31)
    assert "no season in 2033" in season_words(proposal)


def test_the_best_of_the_seasons_of_a_year_is_taken():
    proposal = proposed("earth", "mercury", 2031)
    within = [each for each in proposal.seasons if each.year == 2031]
    assert len(within) >= 3  # the synodic period is 116 days
    assert min(abs(each - proposal.optimum.dates[0]) for each in within) < timedelta(days=10)


def test_steps_are_a_day_to_mars_finer_to_mercury_and_coarser_to_saturn():
    steps = {
        target: [window.step_days for window in proposed("earth", target, 2031).windows]
        for target in ("mars", "mercury", "saturn")
    }
    assert steps["mars"] == [1.0, 1.0]
    assert steps["mercury"][1] < 1.0
    assert steps["saturn"][1] > 1.0


def test_limits_are_above_the_optimum_and_written_in_round_numbers():
    proposal = proposed("earth", "mars", 2033)
    least, limits = proposal.optimum, proposal.limits
    assert least.c3_km2_s2 < limits.c3_km2_s2 < 3 * least.c3_km2_s2
    assert least.v_inf_arrival_km_s < limits.v_inf_arrival_km_s < 2 * least.v_inf_arrival_km_s
    assert least.tof_days < limits.tof_days <= 1.6 * least.tof_days
    assert limits.c3_km2_s2 % 1 == 0
    assert limits.tof_days % 10 == 0
    assert (10 * limits.v_inf_arrival_km_s) % 1 == pytest.approx(0)


@pytest.mark.parametrize("year", [1500, 12345, 0, -5])
def test_a_year_outside_the_ephemeris_is_refused_with_the_years_that_are_inside(year):
    with pytest.raises(RequestError, match=r"--year .*give a year from 15\d\d to 26\d\d"):
        proposed("earth", "mars", year)


def test_an_arrival_beyond_the_ephemeris_is_refused():
    with pytest.raises(RequestError, match="neptune: reached after"):
        proposed("earth", "neptune", 2648)


def test_orbit_sizes_agree_with_handbooks():
    # NSSDCA planetary fact sheets (memory): sidereal periods and synodic periods; Hohmann to Mars 258.9 days
    ephemeris = open_ephemeris()
    orbits = {name: orbit_size(ephemeris, BODIES[name], 2_462_000.5) for name in ("mercury", "earth", "mars")}
    assert orbits["mercury"].period_days == pytest.approx(87.97, abs=0.05)
    assert orbits["mars"].period_days == pytest.approx(686.98, abs=0.5)
    assert synodic_days(orbits["earth"], orbits["mars"]) == pytest.approx(779.9, rel=0.005)
    assert hohmann_days(orbits["earth"], orbits["mars"]) == pytest.approx(258.9, rel=0.002)

"""Seasons of a survey of many years."""

import math

import numpy as np
import pytest
from survey_scenarios import ROOK, changed, limited

from porkgrid.survey.opportunities import holds_several, opportunities, synodic_days
from porkgrid.survey.period import launch_periods

YEARS = changed(
    limited(ROOK, "c3_km2_s2 = { max = 14 }\ntof_days = { min = 120, max = 420 }"),
    (
        "first = 2028-09-01\nlast = 2029-04-01\nstep_days = 5.0",
        "first = 2028-12-05\nlast = 2035-06-20\nstep_days = 5.0",
    ),
    (
        "first = 2029-02-15\nlast = 2030-03-31\nstep_days = 7.0",
        "first = 2029-04-01\nlast = 2036-08-31\nstep_days = 8.0",
    ),
)


@pytest.fixture(scope="module")
def years(scenario_of, tmp_path_factory):
    from porkgrid.survey.sweep import sweep

    return sweep(scenario_of(YEARS), tmp_path_factory.mktemp("years") / "survey", workers=1)


def test_the_synodic_period_of_earth_and_mars_is_two_years_and_seven_weeks(rook, petrel):
    """779.9 days (practice); mean motions from one state each are off by the planets' pull, under 0.5 %."""
    assert synodic_days(rook) == pytest.approx(779.9, rel=5e-3)
    assert synodic_days(petrel) == pytest.approx(779.9, rel=5e-3)


def test_a_route_back_to_its_first_body_has_no_seasons_of_this_kind(plan_of):
    back = changed(
        ROOK, ('body = "mars"', 'body = "earth"'), ("[limits]", "[[leg]]\nmax_revs = 1\n\n[limits]")
    )
    assert synodic_days(plan_of(back)) == math.inf


def test_one_season_does_not_hold_several(survey, years):
    assert not holds_several(survey)
    assert holds_several(years)


def test_every_season_is_found_in_order_with_its_best_period(years):
    """Seasons 26 months apart (practice): late 2028, early 2031, spring 2033, summer 2035."""
    found = opportunities(years, 20, by="c3_km2_s2")
    assert [each.year for each in found] == [2028, 2031, 2033, 2035]
    best = launch_periods(years, 20, by="c3_km2_s2")[0]
    assert min(each.period.worst for each in found) == best.worst
    starts = [each.period.table["departure_epoch_jd_tdb"].iloc[0] for each in found]
    assert min(np.diff(starts)) > 0.6 * synodic_days(years.plan)


def test_seasons_that_the_window_cuts_are_marked(years):
    """The window opens in one season, days before its best date, and ends in another."""
    assert [each.cut for each in opportunities(years, 20, by="c3_km2_s2")] == [True, False, False, True]


def test_a_season_with_too_few_days_is_listed_with_the_longest_it_has(years):
    found = opportunities(years, 75, by="c3_km2_s2")
    short = [each for each in found if each.period is None]
    assert short
    assert len(short) < len(found)
    for each in short:
        assert 0 < each.longest_days < 75
        assert each.first < each.last

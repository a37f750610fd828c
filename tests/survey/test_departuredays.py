"""Departure days: how dates group, and what each day costs."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from survey_scenarios import ROOK, changed, limited

from porkgrid.errors import RequestError
from porkgrid.survey.departuredays import (
    closes_most,
    costs_by_arrival,
    costs_by_day,
    days_of,
    departure_days,
    refuse_closed,
    stored_measure,
)

MIDNIGHT = 2_462_000.5


@settings(deadline=None)
@given(st.integers(1, 60), st.sampled_from([0.1, 0.25, 0.4, 1 / 3, 0.999, 1.0]), st.floats(0.0, 0.99))
def test_dates_group_by_the_day_of_the_calendar_where_steps_are_a_day_or_less(count, step, hour):
    jd = MIDNIGHT + hour + step * np.arange(count)
    days = departure_days(jd)
    calendar = np.floor(jd - 0.5 + 1e-6)
    assert days.count == len(set(calendar))
    assert days.step_days == 1.0
    for day in range(days.count):
        assert len(set(calendar[days.rows(day)])) == 1
    assert sum(days.rows(day).stop - days.rows(day).start for day in range(days.count)) == count


def test_a_date_of_a_wide_grid_stands_for_its_step():
    days = departure_days(MIDNIGHT + 5.0 * np.arange(10))
    assert days.count == 10
    assert [days.needed(n) for n in (1, 5, 6, 20, 21)] == [1, 1, 2, 4, 5]
    assert [days.spared(n) for n in (0, 4, 5, 11)] == [0, 0, 1, 2]


def test_the_best_date_of_a_day_counts():
    days = departure_days(MIDNIGHT + 0.5 * np.arange(5))
    cost = np.array([[3.0, 9.0], [4.0, 1.0], [np.inf, 5.0], [2.0, 6.0], [7.0, np.inf]])
    assert days.least(cost).tolist() == [[3.0, 1.0], [2.0, 5.0], [7.0, np.inf]]


@pytest.mark.parametrize("name", ["dv_total_km_s", "arrival_sep_deg", "departure_epoch_jd_tdb"])
def test_costs_are_the_allowed_values_of_the_grid_and_infinite_elsewhere(survey, name):
    days, grid = days_of(survey), survey.grid.load()
    values = grid[name].broadcast_like(grid["blocked_by"]).transpose("departure", "arrival").values
    expected = np.where(grid["blocked_by"].values == 0, values, np.inf)
    assert np.isfinite(expected).any(axis=1).sum() not in (0, len(expected))
    by_arrival = costs_by_arrival(survey, name, days)
    assert np.array_equal(by_arrival, expected)
    assert np.array_equal(costs_by_day(survey, name, days)[:, 0], expected.min(axis=1))


def test_costs_of_what_should_be_most_are_negative(sweep_text):
    survey = sweep_text(changed(ROOK, ("[rank]", '[rank]\nby = "tof_days"\norder = "most"')))
    costs = costs_by_day(survey, "tof_days", days_of(survey))
    longest = survey.grid["tof_days"].where(survey.grid["blocked_by"] == 0).max("arrival").values
    assert np.array_equal(np.where(np.isfinite(costs[:, 0]), -costs[:, 0], np.nan), longest, equal_nan=True)


def test_a_measure_is_the_scenarios_unless_another_is_asked_for(survey):
    assert stored_measure(survey, None) == "dv_total_km_s"
    assert stored_measure(survey, "c3_km2_s2") == "c3_km2_s2"


def test_a_measure_that_is_not_stored_is_refused_with_the_nearest(survey):
    with pytest.raises(RequestError, match=r"does not store 'c3_km2'; the nearest is 'c3_km2_s2'"):
        stored_measure(survey, "c3_km2")


def test_a_survey_without_an_allowed_cell_is_refused_with_what_closes_most(sweep_text):
    survey = sweep_text(limited(ROOK, "c3_km2_s2 = { max = 2 }\ntof_days = { max = 600 }"))
    with pytest.raises(
        RequestError, match=r"no departure day is allowed; what closes most is c3_km2_s2 \(C3 at"
    ):
        refuse_closed(survey)


def test_what_closes_most_is_a_limit_or_else_why_there_is_no_flight(survey, sweep_text):
    forbidden = survey.provenance["cells_forbidden_by"]
    limits = ("c3_km2_s2", "dla_deg", "v_inf_arrival_km_s", "arrival_sep_deg")
    assert max(limits, key=lambda name: forbidden[name]) in closes_most(survey)
    assert "arrival not after departure" in closes_most(sweep_text(limited(ROOK, "")))

"""What leaving late costs, against looking it up in the grid."""

import numpy as np
import pandas as pd
import pytest
from survey_scenarios import ROOK, changed, limited

from porkgrid.errors import RequestError
from porkgrid.survey.slip import LATE_DAYS, slip

LIMITS = """
c3_km2_s2 = { max = 16 }
dla_deg = { min = -28.5, max = 28.5 }
v_inf_arrival_km_s = { max = 4 }
tof_days = { max = 350 }
"""
DAILY = changed(
    limited(ROOK, LIMITS),
    (
        "first = 2028-09-01\nlast = 2029-04-01\nstep_days = 5.0",
        "first = 2028-11-01\nlast = 2029-01-10\nstep_days = 1.0",
    ),
    ("apart_days = 5", "apart_days = 2"),
)


@pytest.fixture(scope="module")
def daily(scenario_of, tmp_path_factory):
    from porkgrid.survey.sweep import sweep

    return sweep(scenario_of(DAILY), tmp_path_factory.mktemp("daily") / "survey", workers=1)


def best_of_days(survey, name):
    grid = survey.grid.load()
    best = grid[name].where(grid["blocked_by"] == 0).min("arrival").values
    return dict(
        zip(np.datetime_as_string(grid["departure"].values.astype("datetime64[D]")), best, strict=True)
    )


@pytest.mark.parametrize("name", ["dv_total_km_s", "c3_km2_s2"])
def test_late_days_cost_what_the_best_route_of_that_day_costs(daily, name):
    best, states = best_of_days(daily, name), set()
    table = slip(daily, name)
    assert len(table) == len(daily.candidates) > 1
    for _, row in table.iterrows():
        for late in LATE_DAYS:
            day = str((pd.Timestamp(row["departure"]) + pd.Timedelta(days=late)).date())
            value, state = row[f"late_{late}_{name}"], row[f"late_{late}_state"]
            states.add(state)
            if day not in best:
                assert state == "outside the window"
                assert pd.isna(row[f"late_{late}_departure"])
            else:
                assert row[f"late_{late}_departure"] == day
                assert state == ("closed" if np.isnan(best[day]) else "open")
            if state == "open":
                assert value == best[day]
                assert row[f"late_{late}_change"] == value - row[name]
            else:
                assert np.isnan(value)
                assert np.isnan(row[f"late_{late}_change"])
    assert states == {"open", "closed", "outside the window"}


def test_the_last_day_is_the_one_before_the_first_closed_one_or_the_end(daily):
    best = best_of_days(daily, "dv_total_km_s")
    days = list(best)
    ends = set()
    for _, row in slip(daily).iterrows():
        later = days[days.index(row["departure"]) :]
        closed = [day for day in later if np.isnan(best[day])]
        last = days[days.index(closed[0]) - 1] if closed else days[-1]
        assert row["last_departure"] == last
        assert row["last_days_late"] == (pd.Timestamp(last) - pd.Timestamp(row["departure"])).days
        assert row["last_state"] == ("closed" if closed else "outside the window")
        ends.add(row["last_state"])
    assert "closed" in ends


def test_on_a_wide_grid_the_next_date_stands_for_the_days_before_it(survey):
    for _, row in slip(survey, late=(1, 5, 6)).iterrows():
        own = pd.Timestamp(row["departure"])
        steps = [pd.Timestamp(row[f"late_{late}_departure"]) - own for late in (1, 5, 6)]
        assert [step.days for step in steps] == [5, 5, 10]


def test_days_late_below_one_and_unknown_measures_are_refused(daily):
    with pytest.raises(RequestError, match="0 days late: it can be 1 or more"):
        slip(daily, late=(0, 1))
    with pytest.raises(RequestError, match="the nearest is 'tof_days'"):
        slip(daily, "tof_day")

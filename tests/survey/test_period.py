"""Launch periods of small surveys, against trying every run of days."""

from itertools import pairwise

import numpy as np
import pytest
from survey_scenarios import ROOK, changed, limited

from porkgrid.errors import RequestError
from porkgrid.sky.epochs import iso_from_jd
from porkgrid.survey.growth import growth, growth_of_all
from porkgrid.survey.period import launch_periods, local_best_starts

# A season at half a day's step; the limits leave two runs of days with closed ones between them.
LIMITS = """
c3_km2_s2 = { max = 16 }
dla_deg = { min = -28.5, max = 28.5 }
v_inf_arrival_km_s = { max = 4 }
tof_days = { max = 350 }
"""
FINE = changed(
    limited(ROOK, LIMITS),
    (
        "first = 2028-09-01\nlast = 2029-04-01\nstep_days = 5.0",
        "first = 2028-10-20\nlast = 2029-01-10\nstep_days = 0.5",
    ),
    ("step_days = 7.0", "step_days = 10.0"),
)
BY_VENUS = """
name = "Dunlin by Venus to Mars"

[[encounter]]
body = "earth"
first = 2034-07-15
last = 2034-08-20
parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200 }

[[encounter]]
body = "venus"
first = 2034-11-20
last = 2034-12-31
flyby = { min_altitude_km = 300, max_burn_km_s = 0.5 }

[[encounter]]
body = "mars"
first = 2035-06-20
last = 2035-08-10
step_days = 3.0
capture = { periapsis_altitude_km = 400, apoapsis_altitude_km = 33000 }

[limits]
c3_km2_s2 = { max = 25 }
sun_min_au = { min = 0.6 }
"""


@pytest.fixture(scope="module")
def swept(scenario_of, tmp_path_factory):
    from porkgrid.survey.sweep import sweep

    return lambda text: sweep(scenario_of(text), tmp_path_factory.mktemp("swept") / "survey", workers=1)


@pytest.fixture(scope="module")
def fine(swept):
    return swept(FINE)


@pytest.fixture(scope="module")
def by_venus(swept):
    return swept(BY_VENUS)


def allowed(survey, name):
    """(calendar days, arrivals) least allowed value, infinite where there is none, and the days' names."""
    grid = survey.grid.load()
    values = grid[name].broadcast_like(grid["blocked_by"]).transpose("departure", "arrival").values
    cost = np.where(grid["blocked_by"].values == 0, values, np.inf)
    names = np.datetime_as_string(grid["departure"].values.astype("datetime64[D]"))
    days = sorted(set(names))
    return np.array([cost[names == day].min(axis=0) for day in days]), days


def brute(cost, count, gaps):
    """Cost of the best run of `count` days with so many left out, cost (days, columns)."""
    span = min(count + gaps, len(cost))
    if count > span:
        return np.inf
    spans = [np.sort(cost[i : i + span], axis=0)[count - 1] for i in range(len(cost) - span + 1)]
    return float(np.min(spans))


@pytest.mark.parametrize("gaps", [0, 3])
@pytest.mark.parametrize("hold", ["nothing", "arrival"])
@pytest.mark.parametrize("name", ["dv_total_km_s", "c3_km2_s2"])
def test_growth_is_that_of_trying_every_run(fine, name, hold, gaps):
    cost, _ = allowed(fine, name)
    if hold == "nothing":
        cost = cost.min(axis=1, keepdims=True)
    expected = [brute(cost, count, gaps) for count in range(1, 61)]
    lengths, worst = growth(fine, name, hold, gaps)
    assert lengths.tolist() == list(range(1, 61))
    assert np.array_equal(np.where(np.isnan(worst), np.inf, worst), expected)
    assert 1 < np.isfinite(expected).sum() < 60


@pytest.mark.parametrize("hold", ["nothing", "arrival"])
def test_growth_of_all_measures_is_that_of_each(fine, hold):
    together = growth_of_all(fine, hold, 1, 30)
    assert set(together) == set(fine.plan.stored)
    for name, worst in together.items():
        assert np.array_equal(worst, growth(fine, name, hold, 1, 30)[1], equal_nan=True), name


@pytest.mark.parametrize("hold", ["nothing", "arrival"])
def test_the_best_period_is_the_run_whose_worst_day_is_best(fine, hold):
    cost, days = allowed(fine, "dv_total_km_s")
    period = launch_periods(fine, 12, hold=hold)[0]
    assert period.worst == pytest.approx(
        brute(cost if hold == "arrival" else cost.min(axis=1)[:, None], 12, 0), rel=1e-6
    )
    leaving = [day[:10] for day in period.table["departure"]]
    first = days.index(leaving[0])
    assert leaving == days[first : first + 12]
    assert (period.first, period.last) == (
        period.table["departure"].iloc[0],
        period.table["departure"].iloc[-1],
    )
    assert period.worst == period.table["dv_total_km_s"].max()
    assert period.worst_on == period.table["departure"].iloc[period.table["dv_total_km_s"].argmax()]
    arrivals = period.table["arrival"].nunique()
    assert arrivals == 1 if hold == "arrival" else arrivals > 1


def test_every_day_flies_its_best_allowed_date_at_full_precision(fine):
    grid = fine.grid.load()
    allowed_dv = grid["dv_total_km_s"].where(grid["blocked_by"] == 0)
    for _, row in launch_periods(fine, 12)[0].table.iterrows():
        of_day = allowed_dv.sel(departure=row["departure"][:10])
        assert row["dv_total_km_s"] == pytest.approx(float(of_day.min()), rel=1e-6)
        assert row["departure"] == iso_from_jd(row["departure_epoch_jd_tdb"])
        at = of_day.sel(departure=np.datetime64(row["departure"]), arrival=np.datetime64(row["arrival"]))
        assert float(at) == float(of_day.min())


def test_with_days_left_out_a_closed_day_can_be_jumped(fine):
    cost = allowed(fine, "dv_total_km_s")[0].min(axis=1)
    longest = [np.isfinite(growth(fine, gap_days=gaps, up_to=83)[1]).sum() for gaps in (0, 40)]
    assert longest[1] == np.isfinite(cost).sum() > longest[0]
    period = launch_periods(fine, int(longest[1]), gap_days=40)[0]
    assert len(period.table) == longest[1]
    assert np.array_equal(period.flown, np.flatnonzero(np.isfinite(cost)))


def test_periods_do_not_overlap_and_get_no_better(survey):
    found = launch_periods(survey, 10, by="c3_km2_s2")
    assert len(found) > 1
    assert [each.worst for each in found] == sorted(each.worst for each in found)
    spans = sorted((each.first, each.last) for each in found)
    assert all(before[1] < after[0] for before, after in pairwise(spans))


def test_on_a_wide_grid_every_date_stands_for_its_step(survey):
    period = launch_periods(survey, 21)[0]
    assert len(period.table) == 5
    assert period.step_days == 5.0
    assert np.diff(period.table["departure_epoch_jd_tdb"]).tolist() == [5.0] * 4


def test_local_bests_are_lower_than_what_surrounds_their_level():
    cost = np.array([5.0, 3.0, 3.0, 4.0, np.inf, 2.0, 2.5, 2.0, 2.0])
    assert local_best_starts(cost) == [5, 7, 8, 1, 2]
    assert local_best_starts(np.array([np.inf, np.inf])) == []
    assert local_best_starts(np.array([1.0])) == [0]


def test_held_dates_are_one_set_of_dates_that_every_day_may_fly(by_venus):
    free, arrival, held = (
        launch_periods(by_venus, 6, hold=hold)[0] for hold in ("nothing", "arrival", "all")
    )
    assert held.table[["flyby1", "arrival"]].drop_duplicates().shape[0] == 1
    assert arrival.table["arrival"].nunique() == 1
    assert arrival.table["flyby1"].nunique() > 1
    # the flyby dates of the grid are the best by the measure ranked, so holding more can only cost more
    assert free.worst <= arrival.worst * (1 + 1e-6)
    assert arrival.worst <= held.worst * (1 + 1e-6)
    for bound in by_venus.plan.bounds:
        assert not bound.forbids(held.table[bound.measure.name].to_numpy()).any()


def test_the_best_held_period_is_that_of_trying_every_days_dates(by_venus):
    """Each day's best dates flown from every day by the full-precision road of the candidates' table."""
    from porkgrid.survey.candidates import Picked, measures_at, picked_at

    grid, plan = by_venus.grid.load(), by_venus.plan
    cost = np.where(grid["blocked_by"].values == 0, grid["dv_total_km_s"].values, np.inf)
    open_days = np.flatnonzero(np.isfinite(cost).any(axis=1))
    sets = picked_at(by_venus.grid, plan, open_days, cost[open_days].argmin(axis=1))
    table = np.full((len(cost), len(sets)), np.inf)
    for column, (day, one) in enumerate(zip(open_days, sets, strict=True)):
        for row in range(max(0, day - 3), min(len(cost), day + 4)):
            measures = measures_at(
                plan, Picked((float(plan.tables[0].jd[row]), *one.epochs[1:]), one.options)
            )
            if not any(bound.forbids(np.array([measures[bound.measure.name]]))[0] for bound in plan.bounds):
                table[row, column] = measures["dv_total_km_s"]
    assert launch_periods(by_venus, 4, hold="all")[0].worst == pytest.approx(brute(table, 4, 0), rel=1e-9)


def test_on_a_direct_route_holding_all_is_holding_the_arrival(fine):
    arrival, everything = (launch_periods(fine, 9, hold=hold)[0] for hold in ("arrival", "all"))
    assert arrival.table.equals(everything.table)


def test_the_required_capability_is_the_worst_of_each_measure(fine):
    period = launch_periods(fine, 12)[0]
    needs = {need.name: need for need in period.needs}
    table = period.table
    assert needs["c3_km2_s2"].worst == table["c3_km2_s2"].max()
    assert needs["abs_dla_deg"].worst == table["dla_deg"].abs().max()
    assert needs["dv_capture_km_s"].on == table["departure"].iloc[table["dv_capture_km_s"].argmax()]
    assert period.margin == "c3_below_limit_km2_s2"
    assert np.allclose(table[period.margin], 16.0 - table["c3_km2_s2"])


def test_without_a_limit_the_margin_is_to_the_worst_day(swept):
    period = launch_periods(swept(limited(ROOK, "")), 20, by="c3_km2_s2")[0]
    assert period.margin == "c3_below_worst_km2_s2"
    assert period.table[period.margin].min() == 0.0
    assert period.table[period.margin].max() > 0.0


@pytest.mark.parametrize(
    ("asked", "message"),
    [
        ({"days": 0}, "0 days: a launch period has one day at least"),
        ({"days": 5, "gap_days": -1}, "-1 days left out"),
        ({"days": 84}, r"84 days is longer than the departure window, 2028-10-20 to 2029-01-10: 83 days"),
        ({"days": 80}, r"no run of 80 allowed departure days: the longest has \d+; what closes most is"),
        ({"days": 70, "hold": "arrival"}, r"with one arrival date: the longest has \d+"),
        ({"days": 5, "by": "dv_totl_km_s"}, "the nearest is 'dv_total_km_s'"),
        ({"days": 5, "hold": "flyby"}, "hold 'flyby': not known; it can be nothing, arrival, all"),
    ],
)
def test_what_cannot_be_is_refused_with_what_can(fine, asked, message):
    with pytest.raises(RequestError, match=message):
        launch_periods(fine, **asked)


def test_the_longest_period_named_in_the_refusal_is_the_longest(fine):
    with pytest.raises(RequestError) as refusal:
        launch_periods(fine, 80, hold="arrival")
    longest = int(str(refusal.value).split("the longest has ")[1].split(";")[0])
    assert len(launch_periods(fine, longest, hold="arrival")[0].table) == longest
    with pytest.raises(RequestError):
        launch_periods(fine, longest + 1, hold="arrival")

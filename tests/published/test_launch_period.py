"""The launch period of a handbook opportunity.

Burke, Falck and McGuire, NASA/TM-2010-216764 (memory): of the 2026 Earth-to-Mars opportunity the least C3 is
near 9.14 km²/s², leaving 2026-10-31 and arriving 2027-08-19.
"""

from __future__ import annotations

import pytest
from survey_scenarios import written

from porkgrid.survey.admit import load_scenario
from porkgrid.survey.growth import growth
from porkgrid.survey.period import launch_periods
from porkgrid.survey.sweep import sweep

OPPORTUNITY = """
name = "The season of 2026"
measures = ["c3_km2_s2", "tof_days"]

[[encounter]]
body = "earth"
first = 2026-08-01
last = 2027-01-31

[[encounter]]
body = "mars"
first = 2027-03-01
last = 2028-01-31

[rank]
by = "c3_km2_s2"
"""
LEAST_C3, LEAVING, DAYS = 9.14, "2026-10-31", 20


@pytest.fixture(scope="module")
def season(tmp_path_factory):
    folder = tmp_path_factory.mktemp("season")
    return sweep(load_scenario(written(folder, OPPORTUNITY)), folder / "survey")


def test_the_20_days_of_2026_surround_the_date_of_least_energy(season):
    """A period about a minimum leaves room on both sides of it: five days here, as the curve is lopsided."""
    period = launch_periods(season, DAYS)[0]
    before = sum(period.table["departure"] < LEAVING)
    assert LEAVING in period.table["departure"].tolist()
    assert 5 <= before <= 14


def test_the_worst_of_20_days_asks_moderately_more_than_the_best_day(season):
    """Least C3 within 1 % of the handbook's; the worst day of 20 above it, by less than a tenth (practice:
    a launch period of three weeks costs a few per cent of C3).
    """
    _, worst = growth(season, up_to=DAYS)
    assert worst[0] == pytest.approx(LEAST_C3, rel=0.01)
    assert 1.005 * worst[0] < worst[-1] < 1.10 * worst[0]
    assert all(worst[1:] >= worst[:-1])


def test_holding_one_arrival_costs_more_but_not_much(season):
    free, held = (launch_periods(season, DAYS, hold=hold)[0] for hold in ("nothing", "arrival"))
    assert free.worst < held.worst < 1.2 * free.worst
    assert LEAVING in held.table["departure"].tolist()

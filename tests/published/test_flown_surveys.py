"""Given windows of more than a year for every encounter, a survey's ten best hold the mission that flew.

Nothing in a scenario knows the dates: windows are round, limits and ranking are what an analyst would have
written down first. The encounter dates (UTC) and radii are those of the agencies' mission pages; the tables
have TDB, which is a minute ahead.
"""

import numpy as np
import pandas as pd
import pytest
from survey_scenarios import written

from porkgrid.survey.admit import load_scenario
from porkgrid.survey.folder import CANDIDATES
from porkgrid.survey.sweep import sweep

# Two and a half years of each planet, three days a step. Ranked by total Δv from a low orbit: the launch,
# and what the flyby lacks of being free. Limits bound what is hopeless rather than what is best: 40 km²/s²
# is twice what a good Venus season with its flyby asks for, a year is two and a half Hohmann flights to
# Venus. The burn is bounded at the default, 0.2 km/s. Ten days apart in every date, as by default, is
# another window.
MARINER_10 = """
name = "Earth, Venus, Mercury, 1973"
measures = ["c3_km2_s2", "v_inf_arrival_km_s"]

[[encounter]]
body = "earth"
first = 1972-07-01
last = 1974-12-31
step_days = 3.0
parking = { periapsis_altitude_km = 185, apoapsis_altitude_km = 185 }

[[encounter]]
body = "venus"
first = 1972-10-01
last = 1975-06-30
step_days = 3.0

[[encounter]]
body = "mercury"
first = 1973-01-01
last = 1975-12-31
step_days = 3.0

[limits]
c3_km2_s2 = { max = 40 }
tof_days = { max = 365 }

[rank]
by = "dv_total_km_s"
keep = 10
"""

# A year and a half or more of each planet, steps that grow outwards as the planets slow down. Ranked by
# total Δv, as above. 110 km²/s² is what a Titan IIIE-Centaur with a kick stage gave 800 kg (practice). 13
# years bound what can be hoped for of the hardware; a Hohmann flight to Neptune takes 30. Burns are bounded
# at the default, 0.2 km/s each. Twenty days apart, because windows with a dozen years of flight differ by
# weeks.
VOYAGER_2 = """
name = "Earth, Jupiter, Saturn, Uranus, Neptune, 1977"
measures = ["c3_km2_s2", "v_inf_arrival_km_s"]

[[encounter]]
body = "earth"
first = 1977-01-01
last = 1978-06-30
step_days = 2.0
parking = { periapsis_altitude_km = 185, apoapsis_altitude_km = 185 }

[[encounter]]
body = "jupiter"
first = 1978-07-01
last = 1980-06-30
step_days = 4.0

[[encounter]]
body = "saturn"
first = 1980-07-01
last = 1982-12-31
step_days = 6.0

[[encounter]]
body = "uranus"
first = 1985-01-01
last = 1987-12-31
step_days = 8.0

[[encounter]]
body = "neptune"
first = 1988-01-01
last = 1991-12-31
step_days = 12.0

[limits]
c3_km2_s2 = { max = 110 }
tof_days = { max = 4748 }

[rank]
by = "dv_total_km_s"
keep = 10
apart_days = 20
"""

# mission: scenario, dates flown, days that the encounters of the candidate may be off
FLOWN = {
    "Mariner 10": (MARINER_10, ("1973-11-03T05:45", "1974-02-05T17:01", "1974-03-29T20:47"), (10, 5, 10)),
    "Voyager 2": (
        VOYAGER_2,
        ("1977-08-20T14:29", "1979-07-09T22:29", "1981-08-26T03:24", "1986-01-24T17:59", "1989-08-25T03:56"),
        (15, 40, 40, 40, 40),
    ),
}


@pytest.fixture(scope="module")
def candidates(tmp_path_factory):
    """The table of candidates of a mission's scenario, swept once."""
    tables = {}

    def of(mission: str) -> pd.DataFrame:
        if mission not in tables:
            folder = tmp_path_factory.mktemp("flown")
            sweep(load_scenario(written(folder / "scenario", FLOWN[mission][0])), folder / "survey")
            tables[mission] = pd.read_csv(folder / "survey" / CANDIDATES)
        return tables[mission]

    return of


def days_off(table: pd.DataFrame, dates: tuple[str, ...]) -> np.ndarray:
    """(candidates, encounters) days between the dates listed and the dates flown."""
    flybys = [f"flyby{n}" for n in range(1, len(dates) - 1)]
    listed = table[["departure", *flybys, "arrival"]].apply(pd.to_datetime)
    return np.abs((listed - pd.to_datetime(list(dates)).to_numpy()) / pd.Timedelta(days=1)).to_numpy()


@pytest.mark.parametrize("mission", FLOWN)
def test_one_of_the_ten_best_is_the_flight_that_flew(candidates, mission):
    _, dates, allowed = FLOWN[mission]
    table = candidates(mission)
    assert len(table) <= 10
    assert np.any(np.all(days_off(table, dates) <= allowed, axis=1)), table.iloc[:, : len(dates) + 1]


@pytest.mark.parametrize("mission", FLOWN)
def test_no_window_is_drawn_round_the_date_that_was_flown(tmp_path, mission):
    """Else finding it would say nothing: each is over a year, and begins and ends months away."""
    text, dates, _ = FLOWN[mission]
    windows = load_scenario(written(tmp_path, text)).encounters
    for window, flown in zip(windows, pd.to_datetime(list(dates)), strict=True):
        first, last = pd.Timestamp(window.first), pd.Timestamp(window.last)
        assert last - first > pd.Timedelta(days=365)
        assert min(flown - first, last - flown) > pd.Timedelta(days=150)


def test_the_candidate_that_flew_passes_the_planets_as_the_mission_did(candidates):
    """Its flybys' radii are within a fifth of what was flown, dates on the grid being days off."""
    table = candidates("Voyager 2")
    dates = FLOWN["Voyager 2"][1]
    one = table.iloc[int(np.argmin(days_off(table, dates).max(axis=1)))]
    radii = [71_492.0, 60_268.0, 25_559.0]  # IAU WGCCRE 2015
    found = [one[f"flyby{n}_altitude_km"] + radius for n, radius in enumerate(radii, start=1)]
    assert found == pytest.approx([721_670.0, 161_000.0, 107_000.0], rel=0.2)

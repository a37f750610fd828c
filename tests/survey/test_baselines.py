"""The baselines stand on the ephemeris and on the scenario's orbits."""

import numpy as np
import pytest
from scipy.optimize import brentq
from survey_scenarios import LOOPS, PETREL, ROOK, changed

from porkgrid.physics.burns import apsis_burn
from porkgrid.physics.conics import icrf_to_ecliptic
from porkgrid.physics.constants import AU_KM, DAY_S, GM_SUN_KM3_S2
from porkgrid.physics.transfers import bielliptic, bielliptic_mid_radius, hohmann
from porkgrid.sky.bodies import BODIES
from porkgrid.sky.epochs import datetime64_from_jd
from porkgrid.survey.baselines import cheapest_bielliptic, hohmann_floor, phased_bielliptic

RADIUS_EARTH, RADIUS_MARS = BODIES["earth"].radius_km, BODIES["mars"].radius_km
GM_EARTH, GM_MARS = BODIES["earth"].gm_km3_s2, BODIES["mars"].gm_km3_s2


@pytest.fixture(scope="module")
def few_days(plan_of):
    """ROOK without a plane to turn, eight departure dates."""
    return plan_of(changed(ROOK, (", inclination_deg = 28.5", ""), ("step_days = 5.0", "step_days = 30.0")))


@pytest.fixture(scope="module")
def days(few_days):
    return phased_bielliptic(few_days)


def test_the_hohmann_floor_has_the_semi_major_axes_of_the_planets(few_days):
    """1.000 and 1.5237 au (memory, any almanac); osculating: the Moon moves Earth's by a thousandth."""
    floor = hohmann_floor(few_days)
    flight = hohmann(1.0 * AU_KM, 1.5237 * AU_KM, GM_SUN_KM3_S2)
    assert floor.measures["v_inf_departure_km_s"] == pytest.approx(float(flight.departure_km_s), abs=0.02)
    assert floor.measures["v_inf_arrival_km_s"] == pytest.approx(float(flight.arrival_km_s), abs=0.02)
    assert floor.measures["tof_days"] == pytest.approx(258.9, abs=0.5)
    assert floor.measures["c3_km2_s2"] == pytest.approx(floor.measures["v_inf_departure_km_s"] ** 2)


def test_the_floor_pays_the_burns_of_the_scenarios_orbits(few_days):
    got = hohmann_floor(few_days).measures
    parking, capture = (
        (RADIUS_EARTH + 200.0, RADIUS_EARTH + 300.0),
        (RADIUS_MARS + 400.0, RADIUS_MARS + 33000.0),
    )
    departure = float(apsis_burn(got["v_inf_departure_km_s"], *parking, GM_EARTH))
    assert got["dv_departure_km_s"] == pytest.approx(departure, rel=1e-12)
    arrival = float(apsis_burn(got["v_inf_arrival_km_s"], *capture, GM_MARS))
    assert got["dv_capture_km_s"] == pytest.approx(arrival, rel=1e-12)
    assert got["dv_total_km_s"] == pytest.approx(departure + arrival, rel=1e-12)


@pytest.mark.parametrize("text", [ROOK, PETREL])
def test_an_inclined_parking_orbit_costs_the_floor_no_turn_of_its_plane(plan_of, text):
    tilted = hohmann_floor(plan_of(text.replace(", inclination_deg = 28.5", ", inclination_deg = 0.5")))
    flat = hohmann_floor(plan_of(text.replace(", inclination_deg = 28.5", "")))
    assert tilted.measures["dv_departure_km_s"] == pytest.approx(
        flat.measures["dv_departure_km_s"], rel=1e-12
    )


def titles(plan) -> list[str]:
    found = hohmann_floor(plan), cheapest_bielliptic(plan, phased_bielliptic(plan))
    return [each.title for each in found if each is not None]


def target_longitude(plan, jd):
    position, _ = plan.ephemeris.states(BODIES["mars"], np.atleast_1d(jd))
    x, y, _ = icrf_to_ecliptic(position.T).T
    return np.arctan2(y, x)


def brute_day(plan, day):
    """The cheapest phased bi-elliptic of one day: every passage of 40 years, its date bracketed."""
    leave = plan.tables[0]
    x, y, _ = icrf_to_ecliptic(leave.position[:, day])
    at = np.arctan2(y, x)

    def off(jd):
        return np.angle(np.exp(1j * (target_longitude(plan, jd) - at)))

    dates = leave.jd[day] + np.arange(0.0, 40.0 * 365.25, 20.0)
    misses = off(dates)
    rises = np.flatnonzero((misses[:-1] < 0.0) & (misses[1:] >= 0.0) & (np.abs(misses[:-1]) < 1.0))
    best = (np.inf, np.nan, np.nan)
    for k in rises:
        jd = brentq(lambda jd: float(off(jd)[0]), dates[k], dates[k + 1], xtol=1e-6)
        r1 = np.linalg.norm(leave.position[:, day])
        r2 = np.linalg.norm(plan.ephemeris.states(BODIES["mars"], np.array([jd]))[0])
        r_mid = float(bielliptic_mid_radius((jd - leave.jd[day]) * DAY_S, r1, r2, GM_SUN_KM3_S2))
        if np.isnan(r_mid):
            continue
        flight = bielliptic(r1, r2, r_mid, GM_SUN_KM3_S2)
        departure = apsis_burn(flight.departure_km_s, RADIUS_EARTH + 200.0, RADIUS_EARTH + 300.0, GM_EARTH)
        capture = apsis_burn(flight.arrival_km_s, RADIUS_MARS + 400.0, RADIUS_MARS + 33000.0, GM_MARS)
        best = min(best, (float(departure + flight.middle_km_s + capture), jd, r_mid / AU_KM))
    return best


def test_each_days_bielliptic_is_the_cheapest_that_finds_the_target_there(few_days, days):
    assert len(days) == few_days.shape[0] == 8
    assert days["departure"].tolist()[:2] == ["2028-09-01", "2028-10-01"]
    for day in range(8):
        total, jd, r_mid_au = brute_day(few_days, day)
        row = days.iloc[day]
        assert row["dv_total_km_s"] == pytest.approx(total, abs=1e-5)
        assert few_days.tables[0].jd[day] + row["tof_days"] == pytest.approx(jd, abs=1e-3)
        assert row["mid_radius_au"] == pytest.approx(r_mid_au, abs=1e-5)


def test_the_target_stands_at_the_departures_longitude_on_arrival(few_days, days):
    leave = few_days.tables[0]
    x, y, _ = icrf_to_ecliptic(leave.position.T).T
    off = target_longitude(few_days, leave.jd + days["tof_days"].to_numpy()) - np.arctan2(y, x)
    np.testing.assert_allclose(np.angle(np.exp(1j * off)), 0.0, atol=1e-6)
    arrivals = datetime64_from_jd(leave.jd + days["tof_days"].to_numpy())
    late = np.abs(arrivals - days["arrival"].to_numpy().astype("datetime64[ms]"))
    assert late.max() <= np.timedelta64(1, "s")


def test_the_split_of_the_bielliptic_adds_up(days):
    parts = days[["dv_departure_km_s", "deep_space_burn_km_s", "dv_capture_km_s"]].sum(axis=1)
    np.testing.assert_allclose(parts, days["dv_total_km_s"], rtol=1e-12)
    np.testing.assert_allclose(days["c3_km2_s2"], days["v_inf_departure_km_s"] ** 2, rtol=1e-12)


def test_the_baseline_is_the_cheapest_day(few_days, days):
    best = cheapest_bielliptic(few_days, days)
    assert best.measures["dv_total_km_s"] == days["dv_total_km_s"].min()
    assert best.departure == days["departure"][days["dv_total_km_s"].idxmin()]
    assert "8 departure dates" in best.meaning


def test_without_a_parking_orbit_the_excess_speed_decides_and_there_is_no_total(plan_of):
    bare = plan_of(LOOPS)
    table = phased_bielliptic(bare)
    assert "dv_total_km_s" not in table
    assert table["v_inf_departure_km_s"].notna().all()
    assert titles(bare) == ["Hohmann floor", "phased bi-elliptic"]


def test_a_route_that_ends_where_it_began_has_no_baselines(plan_of):
    there_and_back = """
name = "Teal and home"
[[encounter]]
body = "earth"
first = 2028-09-01
last = 2029-01-01
step_days = 30.0
[[encounter]]
body = "earth"
first = 2030-01-01
last = 2030-06-01
step_days = 30.0
[[leg]]
max_revs = 1
"""
    assert titles(plan_of(there_and_back)) == []


COMET = """
name = "Tern to a comet"
[[encounter]]
body = "earth"
first = 2028-09-01
last = 2029-01-01
step_days = 30.0
[[encounter]]
body = "smew"
first = 2030-01-01
last = 2030-06-01
step_days = 30.0

[bodies.smew]
epoch = 2030-01-01
q_au = 0.9
e = {e}
i_deg = {i}
node_deg = 30.0
argument_deg = 40.0
perihelion = 2030-03-01
"""


@pytest.mark.parametrize(("e", "i", "there"), [
    (1.2, 10.0, []),
    (0.95, 10.0, ["Hohmann floor"]),
    (0.3, 170.0, ["Hohmann floor"]),
    (0.3, 10.0, ["Hohmann floor", "phased bi-elliptic"]),
])  # fmt: skip
def test_targets_on_open_long_or_backward_orbits_have_the_baselines_that_mean_something(plan_of, e, i, there):
    plan = plan_of(COMET.format(e=e, i=i))
    assert titles(plan) == there

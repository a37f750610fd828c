"""Every measure of the registry, against its definition worked out for one cell at a time."""

import math

import numpy as np
import pytest

from porkgrid.physics.conics import propagate
from porkgrid.physics.constants import AU_KM, DAY_S, GM_SUN_KM3_S2
from porkgrid.sky.bodies import BODIES
from porkgrid.survey.measures import (
    BOTH,
    BY_ARRIVAL,
    BY_DEPARTURE,
    FEATURES,
    ROUTE_FEATURES,
    all_entries,
    default_rank,
    features_of,
    measures_for,
    why_absent,
)

EARTH, MARS = BODIES["earth"], BODIES["mars"]
CELL = (12, 33)


@pytest.fixture(scope="module")
def at(rook, rook_cells):
    """Value of a measure in CELL of ROOK, an Earth-Mars route with parking orbit and capture."""

    def value(name: str) -> float:
        values = np.broadcast_to(rook.measures[name].compute(rook_cells), rook.shape)
        return float(values[CELL])

    return value


@pytest.fixture(scope="module")
def flight(rook, rook_cells):
    """Vectors of CELL by name, and its dates."""
    i, j = CELL
    departure, arrival = rook.tables
    leg = rook_cells.legs[0]
    return {
        "out": leg.v_inf_out[:, i, j],
        "in": leg.v_inf_in[:, i, j],
        "r1": departure.position[:, i],
        "v1": leg.v_inf_out[:, i, j] + departure.velocity[:, i],
        "r2": arrival.position[:, j],
        "earth": rook.earth_at_arrival[:, j],
        "jd1": departure.jd[i],
        "jd2": arrival.jd[j],
    }


def angle_between(a, b):
    return math.degrees(math.acos(np.dot(a, b) / (np.linalg.norm(a) * np.linalg.norm(b))))


def test_epochs_are_those_of_the_scenarios_dates(at, flight):
    # 2028-09-01 is JD 2462015.5 and 2029-02-15 JD 2462182.5 (calendar arithmetic)
    assert at("departure_epoch_jd_tdb") == 2_462_015.5 + 5.0 * CELL[0] == flight["jd1"]
    assert at("arrival_epoch_jd_tdb") == 2_462_182.5 + 7.0 * CELL[1] == flight["jd2"]
    assert at("tof_days") == at("leg1_tof_days") == flight["jd2"] - flight["jd1"]


def test_departure_energy_and_asymptote(at, flight):
    x, y, z = flight["out"]
    assert at("c3_km2_s2") == pytest.approx(x * x + y * y + z * z)
    assert at("v_inf_departure_km_s") == pytest.approx(math.hypot(x, y, z))
    assert at("dla_deg") == pytest.approx(math.degrees(math.atan2(z, math.hypot(x, y))))
    assert at("rla_deg") == pytest.approx(math.degrees(math.atan2(y, x)) % 360.0)


def test_right_ascensions_are_from_0_to_360(rook, rook_cells):
    values = rook.measures["rla_deg"].compute(rook_cells)
    flown = values[~np.isnan(values)]
    assert flown.min() >= 0.0
    assert flown.max() < 360.0
    assert np.any(flown > 180.0)


def test_at_mars_the_right_ascension_counts_from_the_node_of_its_equator(petrel, petrel_cells):
    """The node is where the equator of Mars rises through the ICRF equator: Z × pole (IAU WGCCRE)."""
    ra, dec = np.radians([317.68143 - 0.1061 * 0.33, 52.88650 - 0.0609 * 0.33])
    pole = np.array([np.cos(dec) * np.cos(ra), np.cos(dec) * np.sin(ra), np.sin(dec)])
    node = np.cross([0.0, 0.0, 1.0], pole) / math.cos(dec)
    v = petrel_cells.legs[0].v_inf_out[:, 7, 15]
    expected = math.degrees(math.atan2(np.dot(v, np.cross(pole, node)), np.dot(v, node))) % 360.0
    assert petrel.measures["rla_deg"].compute(petrel_cells)[7, 15] == pytest.approx(expected, abs=1e-3)


def test_the_departure_burn_leaves_the_parking_orbit_for_the_asymptote(at, flight):
    periapsis, apoapsis = EARTH.radius_km + 200.0, EARTH.radius_km + 300.0
    gm = EARTH.gm_km3_s2
    fast = math.sqrt(at("c3_km2_s2") + 2.0 * gm / periapsis)
    slow = math.sqrt(gm * (2.0 / periapsis - 2.0 / (periapsis + apoapsis)))
    turn = max(0.0, math.radians(abs(at("dla_deg")) - 28.5))
    burn = math.hypot(fast * math.cos(turn) - slow, fast * math.sin(turn))
    assert at("dv_departure_km_s") == pytest.approx(burn, rel=1e-12)


def test_declinations_beyond_the_inclination_cost_a_turn_of_the_plane(rook, rook_cells):
    burn = rook.measures["dv_departure_km_s"].compute(rook_cells)
    dla = np.abs(rook.measures["dla_deg"].compute(rook_cells))
    periapsis, apoapsis = rook.parking.periapsis_km, rook.parking.apoapsis_km
    gm = EARTH.gm_km3_s2
    planar = np.sqrt(rook_cells.c3 + 2.0 * gm / periapsis) - math.sqrt(
        2.0 * gm * apoapsis / (periapsis * (periapsis + apoapsis))
    )
    beyond = dla > 28.6
    assert beyond.any()
    assert np.all(burn[beyond] > planar[beyond])
    within = dla < 28.5
    np.testing.assert_allclose(burn[within], planar[within], rtol=1e-12)


def test_capture_and_entry_at_mars(at):
    gm, radius = MARS.gm_km3_s2, MARS.radius_km
    v_inf = at("v_inf_arrival_km_s")
    periapsis, apoapsis = radius + 400.0, radius + 33_000.0
    closed = math.sqrt(gm * (2.0 / periapsis - 2.0 / (periapsis + apoapsis)))
    assert at("dv_capture_km_s") == pytest.approx(math.sqrt(v_inf**2 + 2.0 * gm / periapsis) - closed)
    # 125 km: the entry interface agencies use at Mars (practice)
    assert at("entry_speed_km_s") == pytest.approx(math.sqrt(v_inf**2 + 2.0 * gm / (radius + 125.0)))


def test_the_total_is_the_sum_of_the_burns(at, petrel, petrel_cells):
    assert at("dv_total_km_s") == pytest.approx(at("dv_departure_km_s") + at("dv_capture_km_s"))
    total = petrel.measures["dv_total_km_s"].compute(petrel_cells)
    departure = petrel.measures["dv_departure_km_s"].compute(petrel_cells)
    np.testing.assert_array_equal(total, departure)  # no capture asked for


def test_arrival_asymptote(at, flight):
    assert at("v_inf_arrival_km_s") == pytest.approx(np.linalg.norm(flight["in"]))
    assert at("arrival_phase_deg") == pytest.approx(angle_between(flight["in"], -flight["r2"]))
    ra, dec = np.radians([317.68143 - 0.1061 * 0.29, 52.88650 - 0.0609 * 0.29])
    pole = [np.cos(dec) * np.cos(ra), np.cos(dec) * np.sin(ra), np.sin(dec)]
    assert at("arrival_declination_deg") == pytest.approx(90.0 - angle_between(flight["in"], pole), abs=1e-3)


def test_where_the_arrival_body_stands(at, flight):
    assert at("arrival_sun_distance_au") == pytest.approx(np.linalg.norm(flight["r2"]) / AU_KM)
    sight = flight["r2"] - flight["earth"]
    assert at("arrival_earth_distance_au") == pytest.approx(np.linalg.norm(sight) / AU_KM)
    assert at("arrival_sep_deg") == pytest.approx(angle_between(sight, -flight["earth"]))


def test_the_season_of_mars_is_its_own(rook, rook_cells):
    """Mars year 38 began on 2024-11-12 (Ls 0); two years of 686.97 days on is 2028-08-17, and autumn
    (Ls 180) comes 371.99 sols after spring: 2029-09-03 (calendar of Clancy and others; memory).
    """
    season = rook.measures["arrival_mars_ls_deg"].compute(rook_cells)
    unwrapped = np.unwrap(season, period=360.0)
    assert np.interp(2_462_382.5, rook.tables[1].jd, unwrapped) == pytest.approx(180.0, abs=1.0)
    assert np.all(np.diff(unwrapped) > 0.0)


def test_geometry_of_the_arc_is_that_of_points_propagated_along_it(at, flight):
    times = np.linspace(0.0, (flight["jd2"] - flight["jd1"]) * DAY_S, 20_001)
    points, _ = propagate(flight["r1"], flight["v1"], times, GM_SUN_KM3_S2)
    distances = np.linalg.norm(points, axis=1) / AU_KM
    assert at("leg1_sun_min_au") == at("sun_min_au") == pytest.approx(distances.min(), rel=1e-7)
    assert at("leg1_sun_max_au") == at("sun_max_au") == pytest.approx(distances.max(), rel=1e-7)
    steps = np.einsum("ij,ij->i", points[:-1], points[1:]) / (AU_KM**2 * distances[:-1] * distances[1:])
    swept = np.degrees(np.arccos(np.clip(steps, -1.0, 1.0)).sum())
    assert at("leg1_transfer_angle_deg") == pytest.approx(swept, abs=1e-3)


def test_revolutions_and_branch_are_those_of_the_option_kept(at):
    assert at("leg1_revs") == at("leg1_branch") == 0.0


# The registry


def test_measures_depend_on_the_dates_that_they_say(rook, rook_cells):
    n, m = rook.shape
    for measure in rook.measures.values():
        values = measure.compute(rook_cells)
        shapes = {BOTH: {(n, m)}, BY_DEPARTURE: {(n, 1)}, BY_ARRIVAL: {(m,), (1, m)}}
        assert values.shape in shapes[measure.dims], measure.name


def test_cells_that_are_not_flown_have_no_numbers_that_depend_on_the_flight(rook, rook_cells):
    free = {"tof_days", "leg1_tof_days", "leg1_revs", "leg1_branch"}
    not_flown = rook_cells.status != 0
    assert not_flown.any()
    for measure in rook.measures.values():
        if measure.dims == BOTH and measure.name not in free:
            assert np.array_equal(np.isnan(measure.compute(rook_cells)), not_flown), measure.name


def test_names_carry_their_unit():
    endings = {
        "km²/s²": "_km2_s2", "km/s": "_km_s", "deg": "_deg", "days": ("_days", "_jd_tdb"), "au": "_au",
        "1": ("_revs", "_branch"), "kg": "_kg", "km": "_km",
    }  # fmt: skip
    for entry in all_entries():
        assert entry.name.endswith(endings[entry.unit]), entry.name


def test_the_names_of_the_design_are_there():
    """The list of the design page, for a direct route to Mars."""
    names = set(measures_for(1, frozenset(FEATURES)))
    assert names >= {
        "c3_km2_s2", "v_inf_departure_km_s", "dla_deg", "rla_deg", "dv_departure_km_s",
        "v_inf_arrival_km_s", "dv_capture_km_s", "entry_speed_km_s", "arrival_declination_deg",
        "arrival_phase_deg", "arrival_sun_distance_au", "arrival_earth_distance_au", "arrival_sep_deg",
        "arrival_mars_ls_deg", "leg1_tof_days", "leg1_transfer_angle_deg", "leg1_revs", "leg1_sun_min_au",
        "leg1_sun_max_au", "departure_epoch_jd_tdb", "arrival_epoch_jd_tdb", "tof_days", "dv_total_km_s",
        "sun_min_au", "sun_max_au",
    }  # fmt: skip


def test_every_leg_has_measures_of_its_own():
    names = measures_for(3, frozenset())
    assert {"leg1_revs", "leg2_revs", "leg3_revs"} <= names.keys()
    assert "leg4_revs" not in names
    assert names["leg2_tof_days"].meaning == "time of flight of leg 2"


def test_a_route_has_only_the_measures_that_its_ends_allow():
    comet = EARTH.__class__("comet", None, None, None, None, None, None)
    assert features_of([EARTH, MARS], parking=True, capture=True) == set(ROUTE_FEATURES)
    assert features_of([EARTH, comet], parking=False, capture=False) == {"departure pole"}
    assert features_of([MARS, EARTH], parking=False, capture=False) == {
        "departure pole", "arrival pole", "entry",
    }  # fmt: skip
    names = measures_for(1, features_of([comet, comet], parking=False, capture=False))
    assert not {"dla_deg", "entry_speed_km_s", "arrival_mars_ls_deg", "dv_total_km_s"} & names.keys()
    assert {"c3_km2_s2", "v_inf_arrival_km_s", "tof_days", "sun_min_au"} <= names.keys()


def test_the_usual_ranking_is_by_burns_where_they_are_known():
    assert default_rank({"parking"}) == "dv_total_km_s"
    assert default_rank(set()) == "c3_km2_s2"


@pytest.mark.parametrize(
    ("name", "legs", "says"),
    [
        ("c3_km_s2", 1, "the nearest is 'c3_km2_s2'"),
        ("zzz", 1, "`porkgrid measures` lists them"),
        ("dv_capture_km_s", 1, "a capture orbit: capture = {"),
        ("arrival_mars_ls_deg", 1, "Mars as the arrival body"),
        ("leg2_revs", 1, "it has 1 leg"),
    ],
)
def test_an_absent_measure_is_explained(name, legs, says):
    assert says in why_absent(name, legs, frozenset())

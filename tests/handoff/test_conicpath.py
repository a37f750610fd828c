"""The patched-conic trajectory is the candidate's: legs meet the bodies, hyperbolas turn as its flybys do."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from handoff_flights import FLIGHTS, candidate_of, measures_of_flight, trajectory_of

from porkgrid.errors import RequestError
from porkgrid.handoff.conicpath import patched_trajectory
from porkgrid.handoff.trajectory import Segment
from porkgrid.physics.constants import AU_KM, DAY_S, G0_KM_S2, GM_SUN_KM3_S2
from porkgrid.sky.bodies import find_body, gm_of
from porkgrid.survey.candidates import Picked
from porkgrid.survey.legs import LegOption

# The tilt of IAU 1976, SPICE's ECLIPJ2000
TILT_RAD = np.radians(84381.448 / 3600.0)
ECLIPTIC_POLE = np.array([0.0, -np.sin(TILT_RAD), np.cos(TILT_RAD)])
WITH_FLYBYS = ["one flyby", "two flybys"]


def legs_of(name: str) -> list[Segment]:
    return [each for each in trajectory_of(name).segments if each.centre_name == "SUN"]


def about_bodies(name: str) -> list[Segment]:
    return [each for each in trajectory_of(name).segments if each.centre_name != "SUN"]


def energy(segment: Segment, gm: float) -> np.ndarray:
    speed2 = np.sum(segment.velocity**2, axis=1)
    return 0.5 * speed2 - gm / np.linalg.norm(segment.position, axis=1)


@pytest.mark.parametrize("name", FLIGHTS)
def test_legs_run_from_body_to_body(name: str) -> None:
    plan, picked = candidate_of(name)
    for k, leg in enumerate(legs_of(name)):
        for end, at in ((0, k), (-1, k + 1)):
            place, _ = plan.ephemeris.states(plan.tables[at].body, np.array([picked.epochs[at]]))
            assert leg.jd_tdb[end] == picked.epochs[at]
            assert np.linalg.norm(leg.position[end] - place[:, 0]) < 1e-9 * AU_KM


@pytest.mark.parametrize("name", FLIGHTS)
def test_usable_stretches_follow_each_other_without_gap_or_overlap(name: str) -> None:
    trajectory = trajectory_of(name)
    before = trajectory.segments[0].usable_jd[0]
    assert before == trajectory.encounters[0].jd_tdb
    for segment in trajectory.segments:
        first, last = segment.usable_jd
        assert first == before
        assert segment.jd_tdb[0] <= first < last <= segment.jd_tdb[-1]
        assert (np.diff(segment.jd_tdb) > 0.0).all()
        before = last
    assert before == trajectory.encounters[-1].jd_tdb


@pytest.mark.parametrize("name", FLIGHTS)
def test_energy_is_kept_along_every_segment(name: str) -> None:
    for segment in trajectory_of(name).segments:
        body = None if segment.centre_name == "SUN" else find_body(segment.centre_naif_id, {})
        kept = energy(segment, GM_SUN_KM3_S2 if body is None else gm_of(body))
        speed2 = np.sum(segment.velocity**2, axis=1).max()
        assert np.ptp(kept) < 1e-12 * speed2


@pytest.mark.parametrize("name", ["direct", "steep", "fast", *WITH_FLYBYS])
def test_hyperbolas_reach_the_sphere_of_influence_with_the_speed_of_the_leg(name: str) -> None:
    found = about_bodies(name)
    assert found
    for segment in found:
        gm = gm_of(find_body(segment.centre_naif_id, {}))
        encounter = next(e for e in trajectory_of(name).encounters if e.jd_tdb in segment.jd_tdb)
        outward = segment.jd_tdb[0] == encounter.jd_tdb
        v_inf = encounter.v_inf_out_km_s if outward else encounter.v_inf_in_km_s
        far = -1 if outward else 0
        assert np.sqrt(2.0 * energy(segment, gm)[far]) == pytest.approx(np.linalg.norm(v_inf), rel=1e-9)
        # The asymptote is met to the angle a/r that is still to turn
        angle = np.arccos(
            segment.velocity[far] @ v_inf / np.linalg.norm(segment.velocity[far]) / np.linalg.norm(v_inf)
        )
        assert angle < 2.0 * gm / (v_inf @ v_inf) / np.linalg.norm(segment.position[far])
        near = 0 if outward else -1
        assert np.linalg.norm(segment.position[near]) == pytest.approx(encounter.periapsis_km, rel=1e-12)
        assert abs(segment.position[near] @ segment.velocity[near]) < 1e-6


@pytest.mark.parametrize("name", ["direct", "fast", *WITH_FLYBYS])
def test_spheres_of_influence_have_the_textbook_radii(name: str) -> None:
    # Curtis, Orbital Mechanics for Engineering Students, table A.2 (memory): km, for mean distances
    radii = {
        "EARTH": 925_000.0,
        "VENUS": 616_000.0,
        "MARS BARYCENTER": 577_000.0,
        "JUPITER BARYCENTER": 48_200_000.0,
    }
    for segment in about_bodies(name):
        edge = np.linalg.norm(segment.position, axis=1).max()
        assert edge == pytest.approx(radii[segment.centre_name], rel=0.1)  # distances from the Sun vary so


@pytest.mark.parametrize("name", ["direct", "steep", "fast", *WITH_FLYBYS])
def test_burns_are_those_of_the_measures(name: str) -> None:
    measures, burns = measures_of_flight(name), trajectory_of(name).burns
    expected = [
        *([measures["dv_departure_km_s"]] if "dv_departure_km_s" in measures else []),
        *(value for key, value in measures.items() if key.startswith("flyby") and key.endswith("burn_km_s")),
        *([measures["dv_capture_km_s"]] if "dv_capture_km_s" in measures else []),
    ]
    assert [burn.size_km_s for burn in burns] == pytest.approx(expected, rel=1e-9)
    assert expected


def test_a_route_without_orbits_has_no_burns_and_stays_about_the_sun() -> None:
    trajectory = trajectory_of("bare")
    assert trajectory.burns == ()
    assert about_bodies("bare") == []
    assert [waypoint.centre_name for waypoint in trajectory.waypoints] == ["SUN", "SUN"]


@pytest.mark.parametrize(("name", "inclination_deg"), [("direct", 28.5), ("one flyby", 28.5)])
def test_the_departure_hyperbola_lies_in_a_plane_of_the_parking_orbits_inclination(
    name: str, inclination_deg: float
) -> None:
    first = trajectory_of(name).segments[0]
    normal = np.cross(first.position[0], first.velocity[0])
    dla_deg = abs(measures_of_flight(name)["dla_deg"])
    inclination = np.degrees(np.arccos(normal[2] / np.linalg.norm(normal)))
    assert inclination == pytest.approx(max(inclination_deg, dla_deg), abs=1e-9)


def test_a_parking_orbit_too_shallow_for_the_asymptote_is_left_in_the_plane_of_least_inclination() -> None:
    first = trajectory_of("steep").segments[0]
    normal = np.cross(first.position[0], first.velocity[0])
    inclination = np.degrees(np.arccos(normal[2] / np.linalg.norm(normal)))
    assert abs(measures_of_flight("steep")["dla_deg"]) > 6.0
    assert inclination == pytest.approx(abs(measures_of_flight("steep")["dla_deg"]), abs=1e-9)


def test_the_arrival_aims_along_t_so_that_its_plane_is_the_flattest_to_the_ecliptic() -> None:
    last = trajectory_of("direct").segments[-1]
    normal = np.cross(last.position[-1], last.velocity[-1])
    v_inf = trajectory_of("direct").encounters[-1].v_inf_in_km_s
    latitude = np.arcsin(ECLIPTIC_POLE @ v_inf / np.linalg.norm(v_inf))
    inclination = np.arccos(normal @ ECLIPTIC_POLE / np.linalg.norm(normal))
    assert inclination == pytest.approx(abs(latitude), abs=1e-9)


@pytest.mark.parametrize("name", ["direct", *WITH_FLYBYS])
def test_the_aim_point_is_where_the_asymptote_of_the_hyperbola_pierces_the_aim_plane(name: str) -> None:
    """From the states alone: B = S × h / v∞, with h the angular momentum."""
    aimed = [e for e in trajectory_of(name).encounters if e.b_t_km is not None]
    assert aimed
    for encounter in aimed:
        coming = next(s for s in about_bodies(name) if s.jd_tdb[-1] == encounter.jd_tdb)
        speed = np.linalg.norm(encounter.v_inf_in_km_s)
        s = encounter.v_inf_in_km_s / speed
        b = np.cross(s, np.cross(coming.position[-1], coming.velocity[-1])) / speed
        t = np.cross(s, ECLIPTIC_POLE) / np.linalg.norm(np.cross(s, ECLIPTIC_POLE))
        assert (b @ t, b @ np.cross(s, t)) == pytest.approx(
            (encounter.b_t_km, encounter.b_r_km), rel=1e-9, abs=1e-4
        )


@pytest.mark.parametrize("name", FLIGHTS)
def test_launch_asymptotes_are_those_of_the_measures(name: str) -> None:
    measures, first = measures_of_flight(name), trajectory_of(name).encounters[0]
    found = {"c3_km2_s2": first.c3_km2_s2, "rla_deg": first.rla_deg, "dla_deg": first.dla_deg}
    assert found == pytest.approx({key: measures[key] for key in found}, rel=1e-12)


@pytest.mark.parametrize("name", ["direct", *WITH_FLYBYS])
def test_every_burn_stands_at_the_one_waypoint_that_it_follows(name: str) -> None:
    trajectory = trajectory_of(name)
    listed = [burn.label for waypoint in trajectory.waypoints for burn in waypoint.burns]
    assert listed == [burn.label for burn in trajectory.burns]
    for waypoint in trajectory.waypoints:
        assert all(burn.jd_tdb >= waypoint.jd_tdb for burn in waypoint.burns)


def test_the_state_of_departure_and_its_burn_make_the_hyperbola() -> None:
    for name in ("direct", "steep"):
        start, first = trajectory_of(name).waypoints[0], trajectory_of(name).segments[0]
        assert np.allclose(start.position, first.position[0], atol=1e-9)
        assert np.allclose(start.velocity + start.burns[0].dv_km_s, first.velocity[0], atol=1e-12)


def test_a_waypoint_after_a_flyby_is_on_the_next_leg() -> None:
    for k, waypoint in enumerate(trajectory_of("two flybys").waypoints[1:3], start=1):
        leg = legs_of("two flybys")[k]
        after = np.searchsorted(leg.jd_tdb, waypoint.jd_tdb)
        span_s = (leg.jd_tdb[after] - waypoint.jd_tdb) * DAY_S
        ahead = waypoint.position + span_s * 0.5 * (waypoint.velocity + leg.velocity[after])
        # the trapezoid misses by span³ · (change of acceleration)/12
        assert np.linalg.norm(ahead - leg.position[after]) < 1e-3 * np.linalg.norm(ahead - waypoint.position)


def test_masses_follow_the_rocket_equation_back_from_the_dry_mass() -> None:
    burns = trajectory_of("one flyby").burns
    assert burns[-1].mass_before_kg - burns[-1].propellant_kg == pytest.approx(900.0, rel=1e-12)
    for burn, following in pairwise(burns):
        assert burn.mass_before_kg - burn.propellant_kg == pytest.approx(following.mass_before_kg, rel=1e-12)
    for burn in burns:
        ratio = np.exp(burn.size_km_s / (320.0 * G0_KM_S2))
        assert burn.mass_before_kg / (burn.mass_before_kg - burn.propellant_kg) == pytest.approx(
            ratio, rel=1e-12
        )
    measures = measures_of_flight("one flyby")
    assert sum(burn.propellant_kg for burn in burns) == pytest.approx(measures["propellant_kg"], rel=1e-9)
    assert burns[0].mass_before_kg == pytest.approx(measures["low_orbit_mass_kg"], rel=1e-9)


def test_without_a_spacecraft_no_mass_is_invented() -> None:
    assert all(
        burn.mass_before_kg is None and burn.propellant_kg is None for burn in trajectory_of("direct").burns
    )


def test_dates_that_no_leg_can_fly_are_refused_with_the_leg() -> None:
    plan, picked = candidate_of("direct")
    with pytest.raises(RequestError, match=r"leg 1, 2028-11-30 to 2028-11-20: cannot be flown"):
        patched_trajectory(plan, Picked((picked.epochs[0], picked.epochs[0] - 10.0), (LegOption(),)), (), ())

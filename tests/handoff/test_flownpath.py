"""What the full-force check flew is what the writers write."""

from __future__ import annotations

from dataclasses import replace
from functools import cache
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from handoff_flights import CHECKSUMS, CREATED, candidate_of
from jplephem.spk import SPK
from oem import OrbitEphemerisMessage

from porkgrid.handoff.ccsds import centre_name
from porkgrid.handoff.flownpath import flown_trajectory
from porkgrid.handoff.fullforce import full_force_check
from porkgrid.handoff.oem import write_oem
from porkgrid.handoff.report import FullForceReport
from porkgrid.handoff.sampling import interpolate
from porkgrid.handoff.spk import spk_segments, write_spk
from porkgrid.handoff.sunpath import sun_path
from porkgrid.handoff.trajectory import Segment, Trajectory
from porkgrid.physics.constants import DAY_S
from porkgrid.sky.bodies import find_body, gm_of

CHECKED = ["one flyby", pytest.param("bare", marks=pytest.mark.slow)]


@cache
def report_of(name: str) -> FullForceReport:
    return full_force_check(*candidate_of(name))


@cache
def flown_of(name: str) -> Trajectory:
    return flown_trajectory(candidate_of(name)[0], report_of(name), CHECKSUMS)


def integrated(name: str, segment: Segment) -> tuple[np.ndarray, np.ndarray]:
    """The integrator's own states within a segment: seconds from its start, states (k, 6) from its centre."""
    number = int(segment.label.split(",")[0].removeprefix("Leg "))
    leg = report_of(name).legs[number - 1]
    inside = (leg.jd > segment.jd_tdb[0]) & (leg.jd < segment.jd_tdb[-1])
    states = np.concatenate([leg.position, leg.velocity])[:, inside]
    if segment.centre_name != "SUN":
        plan, _ = candidate_of(name)
        body = next(t.body for t in plan.tables if centre_name(t.body) == segment.centre_name)
        place, velocity = plan.ephemeris.states(body, leg.jd[inside])
        rounded_s = leg.seconds[inside] - (leg.jd[inside] - leg.reference_jd) * DAY_S
        states = states - np.concatenate([place + velocity * rounded_s, velocity])
    seconds = leg.seconds[inside] - (segment.jd_tdb[0] - leg.reference_jd) * DAY_S
    return seconds, states.T


@pytest.mark.parametrize("name", CHECKED)
def test_interpolation_gives_the_integrators_states_back(name: str) -> None:
    for segment in flown_of(name).segments:
        seconds, states = integrated(name, segment)
        assert len(seconds) > 20
        found = interpolate(segment.seconds, segment.position, segment.velocity, seconds)
        # The promise is 1 km and 1 mm/s. Beside the integrator's steps the tracks of the planets differ from
        # the kernel by up to a metre (handoff.forces)
        assert np.linalg.norm(found[0] - states[:, :3], axis=1).max() < 1e-2
        assert np.linalg.norm(found[1] - states[:, 3:], axis=1).max() < 1e-7


@pytest.mark.parametrize("name", CHECKED)
def test_segments_follow_each_other_and_are_one_trajectory(name: str) -> None:
    plan, _ = candidate_of(name)
    found = flown_of(name).segments

    def from_sun(segment: Segment, k: int) -> np.ndarray:
        if segment.centre_name == "SUN":
            return segment.position[k]
        body = next(t.body for t in plan.tables if centre_name(t.body) == segment.centre_name)
        return segment.position[k] + plan.ephemeris.states(body, segment.jd_tdb[[k]])[0][:, 0]

    for before, after in pairwise(found):
        assert before.usable_jd[1] == after.usable_jd[0]
        assert np.linalg.norm(from_sun(before, -1) - from_sun(after, 0)) < 1e-2
    ends = found[0].usable_jd[0], found[-1].usable_jd[1]
    assert ends == (flown_of(name).encounters[0].jd_tdb, flown_of(name).encounters[-1].jd_tdb)


def test_planets_are_the_centres_within_their_spheres_of_influence() -> None:
    centres = [segment.centre_name for segment in flown_of("one flyby").segments]
    assert centres == ["EARTH", "SUN", "VENUS", "VENUS", "SUN", "MARS BARYCENTER"]


def test_encounters_are_at_the_periapses_that_were_flown() -> None:
    trajectory = flown_of("one flyby")
    for encounter in trajectory.encounters:
        near = [each for each in trajectory.segments if encounter.jd_tdb in each.jd_tdb[[0, -1]]]
        assert near
        for segment in near:
            k = 0 if segment.jd_tdb[0] == encounter.jd_tdb else -1
            r, v = segment.position[k], segment.velocity[k]
            assert np.linalg.norm(r) == pytest.approx(encounter.periapsis_km, abs=1e-3)
            radius_km = find_body(segment.centre_naif_id, {}).radius_km
            assert encounter.altitude_km == pytest.approx(encounter.periapsis_km - radius_km)
            assert abs(r @ v) < 1e-3 * np.linalg.norm(r) * np.linalg.norm(v)
            speed2 = v @ v - 2.0 * gm_of(find_body(segment.centre_naif_id, {})) / np.linalg.norm(r)
            v_inf = encounter.v_inf_out_km_s if k == 0 else encounter.v_inf_in_km_s
            assert np.sqrt(speed2) == pytest.approx(np.linalg.norm(v_inf), rel=1e-6)


def test_aim_points_are_those_of_the_states() -> None:
    pole = find_pole()
    trajectory = flown_of("one flyby")
    for encounter in trajectory.encounters[1:]:
        coming = next(each for each in trajectory.segments if each.jd_tdb[-1] == encounter.jd_tdb)
        speed = np.linalg.norm(encounter.v_inf_in_km_s)
        s = encounter.v_inf_in_km_s / speed
        b = np.cross(s, np.cross(coming.position[-1], coming.velocity[-1])) / speed
        t = np.cross(s, pole) / np.linalg.norm(np.cross(s, pole))
        assert (b @ t, b @ np.cross(s, t)) == pytest.approx((encounter.b_t_km, encounter.b_r_km), abs=0.1)


def find_pole() -> np.ndarray:
    """The pole of the ecliptic, IAU 1976."""
    tilt = np.radians(84381.448 / 3600.0)
    return np.array([0.0, -np.sin(tilt), np.cos(tilt)])


def test_burns_are_those_of_the_report_and_make_the_trajectory() -> None:
    trajectory, report = flown_of("one flyby"), report_of("one flyby")
    names = ("dv_departure_km_s", "flyby1_burn_km_s", "dv_capture_km_s")
    expected = [abs(report.line(name).full_force) for name in names]
    assert [burn.size_km_s for burn in trajectory.burns] == pytest.approx(expected, abs=1e-6)
    start, first = trajectory.waypoints[0], trajectory.segments[0]
    assert np.allclose(start.velocity + start.burns[0].dv_km_s, first.velocity[0], atol=1e-8)
    before, after = trajectory.segments[2], trajectory.segments[3]
    assert np.allclose(before.velocity[-1] + trajectory.burns[1].dv_km_s, after.velocity[0], atol=1e-8)


def test_numbers_are_the_full_force_ones() -> None:
    trajectory, report = flown_of("one flyby"), report_of("one flyby")
    first = trajectory.encounters[0]
    assert first.c3_km2_s2 == report.line("c3_km2_s2").full_force != report.line("c3_km2_s2").patched
    held = {each.name: each.value for each in trajectory.quantities}
    assert held["dv_total_km_s"] == report.line("dv_total_km_s").full_force


def test_waypoints_have_every_burn_once() -> None:
    trajectory = flown_of("one flyby")
    assert [each.label for each in trajectory.waypoints] == ["Departure", "After flyby 1", "After arrival"]
    listed = [burn.label for waypoint in trajectory.waypoints for burn in waypoint.burns]
    assert listed == [burn.label for burn in trajectory.burns]


@pytest.mark.slow
def test_a_route_without_orbits_starts_and_ends_about_the_sun() -> None:
    trajectory = flown_of("bare")
    assert trajectory.burns == ()
    assert [each.centre_name for each in trajectory.waypoints] == ["SUN", "SUN"]


def test_the_model_and_the_caution_say_what_was_flown() -> None:
    trajectory = flown_of("one flyby")
    assert trajectory.model.startswith("full force: Sun, Mercury, Venus, Earth, Moon, Mars")
    assert "patched conics" not in trajectory.caution
    assert "not for flight operations" in trajectory.caution
    said = " ".join(trajectory.notes)
    assert all(each[1:] in said for each in report_of("one flyby").assumptions)


def test_readers_find_the_states(tmp_path: Path) -> None:
    trajectory = flown_of("one flyby")
    write_oem(tmp_path / "t.oem", trajectory, CREATED)
    write_spk(tmp_path / "t.bsp", trajectory)
    for ours, read in zip(trajectory.segments, OrbitEphemerisMessage.open(tmp_path / "t.oem"), strict=True):
        position = np.array([state.position for state in read.states])
        assert np.abs(position - ours.position).max() <= 0.5e-6 + 1e-15 * np.abs(ours.position).max()
    with SPK.open(tmp_path / "t.bsp") as kernel:
        for ours, read in zip(spk_segments(trajectory), kernel.segments, strict=True):
            state = read.compute(ours.jd_tdb[1:-1]).T
            assert np.linalg.norm(state[:, :3] - ours.position[1:-1], axis=1).max() < 1e-2
            assert np.linalg.norm(state[:, 3:] - ours.velocity[1:-1], axis=1).max() < 1e-7
    assert (tmp_path / "t.bsp").stat().st_size < 2e6


def test_figures_over_time_have_it_but_for_the_days_about_encounters() -> None:
    jd, _ = sun_path(flown_of("one flyby"))
    trajectory = flown_of("one flyby")
    gaps = np.diff(jd)
    assert (gaps > 0.0).all()
    (wide,) = np.flatnonzero(gaps > 1.0)
    assert jd[wide] < trajectory.encounters[1].jd_tdb < jd[wide + 1]
    assert gaps[wide] < 5.0
    assert jd[0] - trajectory.encounters[0].jd_tdb < 5.0


def test_a_check_that_lost_a_leg_is_refused() -> None:
    plan, _ = candidate_of("one flyby")
    report = report_of("one flyby")
    with pytest.raises(ValueError, match="did not fly every leg"):
        flown_trajectory(plan, replace(report, legs=report.legs[:1]), CHECKSUMS)

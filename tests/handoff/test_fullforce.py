"""The full-force check of candidates: what it keeps, what it reports, and how it judges."""

import numpy as np
import pytest
from survey_scenarios import written

from porkgrid.errors import RequestError
from porkgrid.handoff import shooting, verdict
from porkgrid.handoff.forces import forces_over
from porkgrid.handoff.fullforce import full_force_check
from porkgrid.handoff.report import CHANGED, CONFIRMED, FAILED
from porkgrid.physics.conics import propagate
from porkgrid.physics.nbody import CENTRE, fly
from porkgrid.sky.bodies import BODIES
from porkgrid.sky.kernel import open_ephemeris
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.candidates import Picked, measures_at
from porkgrid.survey.legs import LegOption
from porkgrid.survey.plan import make_plan

TERN = """
name = "Tern to Mars"

[[encounter]]
body = "earth"
first = 2028-11-23
last = 2028-11-23
parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200, inclination_deg = 28.5 }

[[encounter]]
body = "mars"
first = 2029-09-19
last = 2029-09-19
capture = { periapsis_altitude_km = 400, apoapsis_altitude_km = 33000 }
"""
CURLEW = """
name = "Curlew by Venus to Mars"

[[encounter]]
body = "earth"
first = 2034-07-28
last = 2034-07-28
parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200 }

[[encounter]]
body = "venus"
first = 2034-12-10
last = 2034-12-10
flyby = { min_altitude_km = 300, max_burn_km_s = 0.2 }

[[encounter]]
body = "mars"
first = 2035-07-13
last = 2035-07-13
capture = { periapsis_altitude_km = 400, apoapsis_altitude_km = 33000 }
"""
TERN_DAYS, CURLEW_DAYS = (2462098.5, 2462398.5), (2464171.5, 2464306.5, 2464521.5)


@pytest.fixture(scope="module")
def plan_for(tmp_path_factory):
    return lambda text: make_plan(load_scenario(written(tmp_path_factory.mktemp("scenario"), text)))


def flown(*epochs):
    return Picked(epochs, (LegOption(),) * (len(epochs) - 1))


@pytest.fixture(scope="module")
def tern(plan_for):
    return full_force_check(plan_for(TERN), flown(*TERN_DAYS))


@pytest.fixture(scope="module")
def curlew(plan_for):
    return full_force_check(plan_for(CURLEW), flown(*CURLEW_DAYS))


@pytest.mark.parametrize("name", ["tern", "curlew"])
def test_a_sound_candidate_is_confirmed_and_misses_no_target_by_a_kilometre(name, request):
    report = request.getfixturevalue(name)
    assert (report.converged, report.verdict, report.reasons) == (True, CONFIRMED, ())
    assert len(report.miss_km) == len(report.legs) == len(report.encounters) - 1
    assert max(report.miss_km) < 1.0
    assert report.joint_km < 0.1
    assert report.joint_km_s < 1e-8


def test_patched_numbers_are_those_of_the_candidates_table(plan_for, curlew):
    measures = measures_at(plan_for(CURLEW), flown(*CURLEW_DAYS))
    shared = [line for line in curlew.lines if line.name in measures]
    assert len(shared) >= 14
    for line in shared:
        assert line.patched == pytest.approx(measures[line.name], rel=1e-12), line.name


def test_every_number_that_is_asked_for_has_its_line(curlew):
    wanted = {"c3_km2_s2", "rla_deg", "dla_deg", "v_inf_arrival_km_s", "arrival_b_t_km", "arrival_b_r_km"}
    wanted |= {"departure_epoch_jd_tdb", "flyby1_epoch_jd_tdb", "arrival_epoch_jd_tdb"}
    wanted |= {f"flyby1_{name}" for name in ("altitude_km", "b_t_km", "b_r_km", "burn_km_s")}
    assert wanted <= {line.name for line in curlew.lines}
    for line in curlew.lines:
        assert np.isfinite([line.patched, line.full_force]).all(), line.name


def test_departure_and_arrival_keep_their_epochs_radii_and_inclination(tern):
    leave, arrive = tern.encounters
    assert (leave.jd, arrive.jd) == TERN_DAYS
    assert leave.periapsis_km == pytest.approx(BODIES["earth"].radius_km + 200.0, rel=1e-12)
    assert arrive.periapsis_km == pytest.approx(BODIES["mars"].radius_km + 400.0, rel=1e-12)
    for vector, velocity in (
        (leave.position, leave.velocity_after),
        (arrive.position, arrive.velocity_before),
    ):
        assert vector @ velocity == pytest.approx(0.0, abs=1e-8)
    normal = np.cross(leave.position, leave.velocity_after)
    inclination = np.degrees(np.arccos(normal[2] / np.linalg.norm(normal)))
    assert inclination == pytest.approx(28.5, abs=1.0)  # the tilt about the asymptote is kept, and DLA moves


def test_the_lines_are_the_encounters_numbers(curlew):
    leave, passed, arrive = curlew.encounters
    assert curlew.line("c3_km2_s2").full_force == pytest.approx(leave.v_inf_out @ leave.v_inf_out, rel=1e-12)
    assert curlew.line("v_inf_arrival_km_s").full_force == pytest.approx(np.linalg.norm(arrive.v_inf_in))
    assert curlew.line("flyby1_epoch_jd_tdb").full_force == passed.jd
    altitude = curlew.line("flyby1_altitude_km").full_force
    assert altitude + BODIES["venus"].radius_km == pytest.approx(np.linalg.norm(passed.position), rel=1e-12)
    burn = np.linalg.norm(passed.velocity_after) - np.linalg.norm(passed.velocity_before)
    assert burn == pytest.approx(passed.burn_km_s, abs=1e-9)
    assert curlew.line("flyby1_burn_km_s").full_force == pytest.approx(abs(burn), abs=1e-9)


def test_the_aim_point_is_where_the_asymptote_of_the_periapsis_state_goes(curlew):
    """|B| = h/v∞, from the angular momentum of the state itself."""
    _, passed, arrive = curlew.encounters
    for state, stop in ((passed, "flyby1"), (arrive, "arrival")):
        momentum = np.linalg.norm(np.cross(state.position, state.velocity_before))
        b_t, b_r = (curlew.line(f"{stop}_{name}").full_force for name in ("b_t_km", "b_r_km"))
        assert np.hypot(b_t, b_r) == pytest.approx(momentum / np.linalg.norm(state.v_inf_in), rel=1e-9)


def test_a_flyby_keeps_its_burn_and_moves_in_time(curlew):
    passed = curlew.encounters[1]
    assert passed.held == "burn"
    assert passed.burn_left_m_s == pytest.approx(0.0, abs=1e-3)
    assert 0.01 < abs(curlew.line("flyby1_epoch_jd_tdb").difference) < 1.0
    assert [attempt.held for attempt in curlew.attempts] == [("epoch",), ("burn",)]


def test_without_slack_epochs_are_kept_and_the_burn_is_what_it_takes(plan_for):
    report = full_force_check(plan_for(CURLEW), flown(*CURLEW_DAYS), slack_days=0.0)
    passed = report.encounters[1]
    assert (passed.held, passed.jd) == ("epoch", CURLEW_DAYS[1])
    assert report.line("flyby1_epoch_jd_tdb").difference == 0.0
    left = 1000.0 * report.line("flyby1_burn_km_s").difference
    assert passed.burn_left_m_s == pytest.approx(left, abs=1e-6)
    assert abs(left) > 0.1
    assert max(report.miss_km) < 1.0


@pytest.mark.parametrize("name", ["tern", "curlew"])
def test_legs_run_from_periapsis_to_periapsis(name, request):
    report = request.getfixturevalue(name)
    ephemeris = open_ephemeris()
    for leg, start, end in zip(report.legs, report.encounters[:-1], report.encounters[1:], strict=True):
        assert leg.position.shape == leg.velocity.shape == (3, len(leg.seconds))
        assert np.all(np.diff(leg.seconds) > 0.0)
        assert leg.jd[0] == pytest.approx(start.jd, abs=1e-9)
        assert leg.jd[-1] == pytest.approx(end.jd, abs=1e-9)
        for k, stop, velocity in ((0, start, start.velocity_after), (-1, end, end.velocity_before)):
            place, speed = ephemeris.states(BODIES[stop.body], [stop.jd])
            # a date rounds to 40 microseconds, in which planets move a metre
            assert np.linalg.norm(leg.position[:, k] - place[:, 0] - stop.position) <= 2e-3
            assert np.linalg.norm(leg.velocity[:, k] - speed[:, 0] - velocity) <= 1e-8


@pytest.mark.parametrize("name", ["tern", "curlew"])
def test_a_leg_gives_its_states_at_any_time(name, request):
    report = request.getfixturevalue(name)
    for leg in report.legs:
        position, velocity = leg.at(leg.seconds)
        assert np.abs(position - leg.position).max() <= 1e-4  # km; the joint is somewhere between
        assert np.abs(velocity - leg.velocity).max() <= 1e-9
        with pytest.raises(ValueError, match="is flown from"):
            leg.at(np.array([leg.seconds[-1] + 1.0]))


def test_between_steps_a_leg_is_where_an_integration_from_the_last_step_comes_to(tern):
    leg = tern.legs[0]
    forces = forces_over(open_ephemeris(), [], *TERN_DAYS)
    for k in range(0, len(leg.seconds) - 1, 20):
        then = 0.6 * leg.seconds[k] + 0.4 * leg.seconds[k + 1]
        start = np.concatenate([leg.position[:, k], leg.velocity[:, k]])
        expected = fly(forces.field, leg.seconds[k], then, start, CENTRE).states[:, -1]
        position, velocity = leg.at(np.array([then]))
        assert np.linalg.norm(position[:, 0] - expected[:3]) <= 1e-4
        assert np.linalg.norm(velocity[:, 0] - expected[3:]) <= 1e-8


def test_between_encounters_the_path_is_nearly_a_conic_and_not_quite(tern):
    """In mid-flight planets bend the path by kilometres a day or less."""
    leg = tern.legs[0]
    a = int(np.argmax(leg.seconds > 100 * 86_400.0))
    b = int(np.argmax(leg.seconds > 130 * 86_400.0))
    expected, _ = propagate(
        leg.position[:, a], leg.velocity[:, a], leg.seconds[b] - leg.seconds[a], 132_712_440_041.279_419
    )
    assert 1.0 < np.linalg.norm(leg.position[:, b] - expected) < 3000.0


def test_convergence_forces_and_tolerances_are_told(curlew):
    assert curlew.attempts[0].history[0].misses[0] > 1e4  # patched conics
    for attempt in curlew.attempts:
        assert attempt.history[-1].misses[0] < 0.1
        assert attempt.ended == "converged"
    assert curlew.forces[:4] == ("Sun", "Mercury", "Venus", "Earth")
    assert {"Moon", "Pluto"} < set(curlew.forces)
    assert "DOP853" in curlew.integrator
    assert "km" in curlew.tolerances
    assert curlew.ephemeris == "DE440"
    assert 0.0 < curlew.wall_s < 60.0
    for threshold in ("1 km", "2 %", "50 m/s", "1 day"):
        assert threshold in curlew.thresholds
    assert any("parking" in text for text in curlew.assumptions)


def test_the_extra_burn_is_the_change_of_all_burns(curlew):
    changes = [curlew.line(name).difference for name in ("dv_departure_km_s", "flyby1_burn_km_s")]
    changes.append(curlew.line("dv_capture_km_s").difference)
    assert curlew.extra_dv_m_s == pytest.approx(1000.0 * sum(changes), abs=1e-6)
    assert curlew.extra_dv_m_s == pytest.approx(1000.0 * curlew.line("dv_total_km_s").difference, abs=1e-6)


def test_without_orbits_the_altitudes_taken_are_said(plan_for):
    bare = "\n".join(line for line in TERN.splitlines() if not line.startswith(("parking", "capture")))
    report = full_force_check(plan_for(bare), flown(*TERN_DAYS))
    leave, arrive = report.encounters
    assert leave.periapsis_km == pytest.approx(BODIES["earth"].radius_km + 200.0)
    assert arrive.periapsis_km == pytest.approx(BODIES["mars"].radius_km + 125.0)
    assert "no parking orbit in the scenario: periapsis at 200 km altitude" in report.assumptions[0]
    assert (
        "no capture orbit in the scenario: periapsis at 125 km altitude, on the side" in report.assumptions[1]
    )
    assert report.verdict == CONFIRMED


def test_a_flyby_that_can_only_pass_too_low_is_not_confirmed(plan_for):
    """Patched conics pass Venus at 361 km; full force at no more than 200, whatever the flyby's epoch."""
    low = Picked((2464198.5, 2464316.5, 2464492.5), (LegOption(),) * 2)
    report = full_force_check(plan_for(CURLEW), low)
    assert report.line("flyby1_altitude_km").patched > 300.0
    assert report.line("flyby1_altitude_km").full_force < 300.0
    assert (report.converged, report.verdict) == (True, FAILED)
    assert "flyby 1 would pass at 199 km altitude, under the least allowed" in report.reasons[0]
    assert [attempt.held for attempt in report.attempts] == [("epoch",), ("burn",), ("radius",)]


def test_a_flyby_that_would_pass_too_low_is_put_at_the_least_altitude(plan_for):
    """Held to its burn it passes at 5363 km; patched conics have 5679."""
    strict = CURLEW.replace("min_altitude_km = 300", "min_altitude_km = 5640")
    report = full_force_check(plan_for(strict), flown(*CURLEW_DAYS))
    assert report.verdict == CONFIRMED
    assert report.encounters[1].held == "radius"
    assert report.line("flyby1_altitude_km").full_force == pytest.approx(5640.0, abs=0.01)
    assert 1.0 < report.encounters[1].burn_left_m_s < 100.0


def test_a_newly_broken_limit_is_a_change(plan_for):
    limited = CURLEW + "\n[limits]\nc3_km2_s2 = { max = 14.05 }\n"
    report = full_force_check(plan_for(limited), flown(*CURLEW_DAYS))
    assert report.verdict == CHANGED
    assert len(report.reasons) == 1
    assert "limit broken: C3 at most 14.05" in report.reasons[0]


@pytest.mark.parametrize(
    ("threshold", "value", "reason"),
    [
        ("LARGEST_C3_CHANGE_PERCENT", 0.1, "C3 grows"),
        ("LARGEST_EXTRA_DV_M_S", 1.0, "the burns grow"),
        ("LARGEST_SHIFT_DAYS", 0.01, "flyby 1 moves"),
    ],
)
def test_each_threshold_can_withhold_the_confirmation(plan_for, monkeypatch, threshold, value, reason):
    monkeypatch.setattr(verdict, threshold, value)
    report = full_force_check(plan_for(CURLEW), flown(*CURLEW_DAYS))
    assert report.verdict == CHANGED
    assert len(report.reasons) == 1
    assert reason in report.reasons[0]


def test_what_cannot_be_joined_is_reported_with_what_was_reached(plan_for, monkeypatch):
    monkeypatch.setattr(shooting, "MOST_ITERATIONS", 1)
    report = full_force_check(plan_for(TERN), flown(*TERN_DAYS))
    assert (report.converged, report.verdict) == (False, FAILED)
    assert "could not be joined: not converged in 1 iterations" in report.reasons[0]
    assert any("misses its target by" in reason for reason in report.reasons)
    assert 1.0 < report.miss_km[0] < 1e5
    assert report.attempts[0].history[-1].misses[0] > 1.0
    assert report.line("c3_km2_s2").full_force == pytest.approx(9.1, abs=0.2)


def test_dates_that_no_leg_can_join_are_refused(plan_for):
    with pytest.raises(RequestError, match="leg 1, 2029-09-19 to 2028-11-23: no such flight"):
        full_force_check(plan_for(TERN), flown(*TERN_DAYS[::-1]))

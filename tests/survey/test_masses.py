"""Masses of cells, against the rocket equation worked out for one cell at a time."""

import math

import numpy as np
import pytest
from survey_scenarios import ROOK, changed

from porkgrid.errors import RequestError
from porkgrid.physics.lambert import FLOWN
from porkgrid.survey.closed import stages_out_of_reach
from porkgrid.survey.routes import route_cells
from porkgrid.survey.surveys import open_survey
from porkgrid.survey.sweep import sweep

G0_KM_S2 = 9.80665e-3  # standard gravity, exact by definition (CGPM 1901)
CELL = (16, 28)

LAUNCHER = "c3_km2_s2,injected_mass_kg\n0,4000\n10,3200\n20,2500\n30,1900\n"
PENALTY = "dla_deg,mass_factor\n0,1\n20,1\n30,0.9\n"
LAUNCHED = '\n[launcher]\ntable = "launcher.csv"\n'
CRAFT = "\n[spacecraft]\nisp_s = 320\ndry_mass_kg = 900\n"
STACK = """
[stack]
payload_kg = 2000

[[stack.stage]]
isp_s = 450
structural_fraction = 0.1
ascent_dv_km_s = 1.5
flies = ["departure"]

[[stack.stage]]
isp_s = 320
structural_fraction = 0.12
flies = ["capture"]
"""


@pytest.fixture(scope="module")
def flown(tmp_path_factory):
    """Plan a scenario beside the launcher's tables; return a reader of its measures at CELL, and the plan."""
    from porkgrid.survey.admit import load_scenario
    from porkgrid.survey.plan import make_plan

    def fly(text: str):
        folder = tmp_path_factory.mktemp("masses")
        (folder / "launcher.csv").write_text(LAUNCHER)
        (folder / "penalty.csv").write_text(PENALTY)
        (folder / "scenario.toml").write_text(text)
        plan = make_plan(load_scenario(folder / "scenario.toml"))
        n, m = plan.shape
        cells, blocked = route_cells(plan, slice(0, n), slice(0, m))
        assert cells.status[CELL] == FLOWN

        def at(name: str) -> float:
            return float(np.broadcast_to(plan.measures[name].compute(cells), plan.shape)[CELL])

        return at, plan, blocked

    return fly


def test_a_launcher_injects_what_its_table_says_at_the_cells_c3(flown):
    at, plan, _ = flown(ROOK + LAUNCHED)
    below, above = (0, 4000), (10, 3200)
    c3 = at("c3_km2_s2")
    assert 9.0 < c3 < 10.0  # near the row at 10, where any monotone curve must pass
    assert 3200.0 < at("injected_mass_kg") < 4000.0 + (c3 - below[0]) * (above[1] - below[1]) / 10 + 60.0
    assert "delivered_mass_kg" not in plan.measures


def test_a_steep_departure_loses_what_the_penalty_takes(flown):
    plain, _, _ = flown(ROOK + LAUNCHED)
    steep, _, _ = flown(ROOK + LAUNCHED + 'dla_table = "penalty.csv"\n')
    dla = abs(plain("dla_deg"))
    assert 20.0 < dla < 30.0
    factor = steep("injected_mass_kg") / plain("injected_mass_kg")
    assert 0.9 < factor < 1.0


def test_the_spacecraft_of_a_launcher_burns_at_capture_only(flown):
    at, _, _ = flown(ROOK + LAUNCHED + CRAFT)
    ratio = math.exp(at("dv_capture_km_s") / (320 * G0_KM_S2))
    assert at("dv_spacecraft_km_s") == pytest.approx(at("dv_capture_km_s"))
    assert at("delivered_mass_kg") == pytest.approx(at("injected_mass_kg") / ratio)
    assert at("mass_margin_kg") == pytest.approx(at("delivered_mass_kg") - 900.0)
    assert at("propellant_kg") == pytest.approx(900.0 * (ratio - 1.0))


def test_a_spacecraft_without_a_launcher_makes_every_burn_from_low_orbit(flown):
    at, _, _ = flown(ROOK + CRAFT)
    ratio = math.exp(at("dv_total_km_s") / (320 * G0_KM_S2))
    assert at("low_orbit_mass_kg") == pytest.approx(900.0 * ratio)
    assert at("propellant_kg") == pytest.approx(900.0 * (ratio - 1.0))


def test_a_tank_caps_what_can_be_delivered(flown):
    tank = changed(CRAFT, ("dry_mass_kg = 900", "tank_kg = 300"))
    at, _, _ = flown(ROOK + LAUNCHED + tank)
    ratio = math.exp(at("dv_capture_km_s") / (320 * G0_KM_S2))
    assert at("injected_mass_kg") * (1.0 - 1.0 / ratio) > 300.0  # the launcher could lift more propellant
    assert at("propellant_kg") == pytest.approx(300.0)
    assert at("delivered_mass_kg") == pytest.approx(300.0 / (ratio - 1.0))


def test_without_a_dry_mass_the_propellant_is_what_the_delivered_mass_has_cost(flown):
    at, _, _ = flown(ROOK + LAUNCHED + changed(CRAFT, ("dry_mass_kg = 900", "")))
    assert at("propellant_kg") == pytest.approx(at("injected_mass_kg") - at("delivered_mass_kg"))


def test_a_stack_is_sized_from_the_payload_down(flown):
    """Every stage obeys the rocket equation with its own structure; low orbit is where the ascent ends."""
    at, _, _ = flown(ROOK + STACK)
    upper, lower = at("stage2_propellant_kg"), at("stage1_propellant_kg")
    assert at("stage2_dv_km_s") == pytest.approx(at("dv_capture_km_s"))
    assert at("stage1_dv_km_s") == pytest.approx(1.5 + at("dv_departure_km_s"))
    upper_structure, lower_structure = upper * 0.12 / 0.88, lower * 0.1 / 0.9
    burnt = 2000.0 + upper_structure
    given = 320 * G0_KM_S2 * math.log((burnt + upper) / burnt)
    assert given == pytest.approx(at("dv_capture_km_s"))
    above = burnt + upper
    burnt = above + lower_structure
    given = 450 * G0_KM_S2 * math.log((burnt + lower) / burnt)
    assert given == pytest.approx(1.5 + at("dv_departure_km_s"))
    assert at("liftoff_mass_kg") == pytest.approx(burnt + lower)
    in_orbit = (burnt + lower) * math.exp(-1.5 / (450 * G0_KM_S2))
    assert at("low_orbit_mass_kg") == pytest.approx(in_orbit)
    assert at("propellant_kg") == pytest.approx(upper + lower)


def test_outside_the_launchers_table_a_cell_is_forbidden_by_its_name(flown):
    _, plan, blocked = flown(ROOK + LAUNCHED)
    names = [bound.name for bound in plan.bounds]
    assert "Kittiwake" not in names
    bit = np.uint32(1 << (3 + names.index("launcher_c3")))
    n, m = plan.shape
    cells, _ = route_cells(plan, slice(0, n), slice(0, m))
    outside = (cells.c3 < 0.0) | (cells.c3 > 30.0)
    assert np.array_equal((blocked & bit) != 0, outside & (cells.status == FLOWN))
    assert np.isnan(cells.budget.injected_kg[outside]).all()
    title = next(bound.title for bound in plan.bounds if bound.name == "launcher_c3")
    assert title == "launcher's table, C3 0 to 30 km²/s²"


def test_a_tank_too_small_for_the_dry_mass_forbids(flown):
    _, plan, blocked = flown(ROOK + LAUNCHED + CRAFT + "tank_kg = 330\n")
    bit = np.uint32(1 << (3 + [bound.name for bound in plan.bounds].index("spacecraft_tank")))
    n, m = plan.shape
    cells, _ = route_cells(plan, slice(0, n), slice(0, m))
    too_much = cells.budget.propellant_kg > 330.0
    assert 0 < too_much.sum() < too_much.size
    unknown = np.isnan(cells.budget.propellant_kg)
    over = (too_much | unknown) & (cells.status == FLOWN)
    assert np.array_equal((blocked & bit) != 0, over)


def test_a_stage_forbids_what_no_size_of_it_reaches(flown):
    small = changed(STACK, ("structural_fraction = 0.12", "structural_fraction = 0.55"))
    _, plan, blocked = flown(ROOK + small)
    reach = 320 * G0_KM_S2 * math.log(1 / 0.55)
    n, m = plan.shape
    cells, _ = route_cells(plan, slice(0, n), slice(0, m))
    bit = np.uint32(1 << (3 + [bound.name for bound in plan.bounds].index("stage2_reach")))
    beyond = (cells.dv_capture >= reach) & (cells.status == FLOWN)
    assert 0 < beyond.sum() < beyond.size
    assert np.array_equal((blocked & bit) != 0, beyond)
    assert np.isnan(cells.budget.stage_propellant_kg(2)[beyond]).all()


def test_more_is_better_of_delivered_mass_unless_told_otherwise(flown):
    ranked = changed(ROOK, ("apart_days = 5", 'apart_days = 5\nby = "delivered_mass_kg"'))
    _, plan, _ = flown(ranked + LAUNCHED + CRAFT)
    assert plan.rank_sign == -1.0
    _, plan, _ = flown(changed(ranked, ("apart_days", 'order = "least"\napart_days')) + LAUNCHED + CRAFT)
    assert plan.rank_sign == 1.0


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("ascent_dv_km_s = 1.5", "ascent_dv_km_s = 7.5"),
        ("structural_fraction = 0.1\n", "structural_fraction = 0.4\n"),
    ],
)
def test_a_stage_that_no_date_can_do_with_is_refused_before_the_sweep(flown, old, new):
    with pytest.raises(RequestError, match=r"stack.stage 1: must give .* \(short by \d+\.\d+ km/s\)"):
        flown(ROOK + changed(STACK, (old, new)))


def test_a_stage_that_no_swept_date_can_do_with_is_told_with_what_is_missing(flown, tmp_path):
    _, plan, _ = flown(ROOK + changed(STACK, ("structural_fraction = 0.12", "structural_fraction = 0.8")))
    survey = sweep(plan.scenario, tmp_path / "survey")
    (line,) = stages_out_of_reach(survey)
    reach = 320 * G0_KM_S2 * math.log(1 / 0.8)
    least = float(survey.grid["stage2_dv_km_s"].min())
    assert line.startswith(f"stage 2, which reaches {reach:.2f} km/s: the least that any date asks")
    assert f"{least - reach:.3f} km/s more" in line


def test_a_table_changed_since_the_sweep_is_not_taken_for_the_one_swept(flown, tmp_path):
    _, plan, _ = flown(ROOK + LAUNCHED + CRAFT)
    survey = sweep(plan.scenario, tmp_path / "survey")
    (plan.scenario.path.parent / "launcher.csv").write_text(LAUNCHER.replace("3200", "3201"))
    with pytest.raises(RequestError, match="is not what was swept: launcher; sweep it anew"):
        _ = open_survey(survey.path).scenario

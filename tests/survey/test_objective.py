"""What flyby dates are searched by: of every way to fly a cell the best by the ranked measure, masses too."""

import numpy as np
import pytest
from flyby_ways import every_way

from porkgrid.physics.lambert import FLOWN
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.measures import MASS
from porkgrid.survey.plan import make_plan
from porkgrid.survey.routes import route_cells

ROUTE = """
name = "Garganey by Venus"

[[encounter]]
body = "earth"
first = 2034-06-01
last = 2034-09-30
step_days = 15.0
parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200 }

[[encounter]]
body = "venus"
first = 2034-10-15
last = 2035-02-15
step_days = 4.0
flyby = { min_altitude_km = 300, max_burn_km_s = 2.5 }

[[encounter]]
body = "mars"
first = 2035-05-01
last = 2035-10-31
step_days = 30.0
capture = { periapsis_altitude_km = 400, apoapsis_altitude_km = 33000 }
"""
LAUNCHER = """
[launcher]
table = "launcher.csv"
"""
CRAFT = """
[spacecraft]
isp_s = 320
"""


def planned(folder, by: str, vehicle: str):
    (folder / "launcher.csv").write_text("c3_km2_s2,injected_mass_kg\n0,4000\n20,2600\n40,1500\n80,300\n")
    (folder / "scenario.toml").write_text(f'{ROUTE}{vehicle}\n[rank]\nby = "{by}"\n')
    return make_plan(load_scenario(folder / "scenario.toml"))


def best_of_every_way(plan) -> np.ndarray:
    """The best allowed value of the ranked measure in each cell, over all flyby dates; NaN for none."""
    measure, best = plan.measures[plan.rank_by], np.full(plan.shape, np.inf)
    for cells in every_way(plan):
        allowed = cells.status == FLOWN
        for bound in plan.bounds:
            allowed &= ~bound.forbids(np.broadcast_to(bound.measure.compute(cells), plan.shape))
        cost = np.where(allowed, plan.rank_sign * np.broadcast_to(measure.compute(cells), plan.shape), np.inf)
        best = np.minimum(best, np.where(np.isnan(cost), np.inf, cost))
    return np.where(np.isfinite(best), plan.rank_sign * best, np.nan)


@pytest.mark.parametrize(
    ("by", "vehicle"),
    [
        ("delivered_mass_kg", LAUNCHER + CRAFT),
        ("mass_margin_kg", LAUNCHER + CRAFT + "dry_mass_kg = 700\n"),
        ("propellant_kg", LAUNCHER + CRAFT + "dry_mass_kg = 700\n"),
        ("propellant_kg", CRAFT + "dry_mass_kg = 700\n"),
        ("low_orbit_mass_kg", CRAFT + "dry_mass_kg = 700\n"),
        ("dv_spacecraft_km_s", LAUNCHER + CRAFT),
    ],
)
def test_each_cell_has_the_flyby_date_that_is_best_by_mass(tmp_path, by, vehicle):
    plan = planned(tmp_path, by, vehicle)
    cells, blocked = route_cells(plan, slice(None), slice(None))
    found = np.where(blocked == 0, np.broadcast_to(plan.measures[by].compute(cells), plan.shape), np.nan)
    expected = best_of_every_way(plan)
    assert np.isfinite(expected).sum() > 10
    np.testing.assert_allclose(found, expected, rtol=1e-9)


def test_delivered_mass_and_total_dv_choose_different_flyby_dates(tmp_path):
    """Else the test above would pass by any search."""
    dates = []
    for by in ("delivered_mass_kg", "dv_total_km_s"):
        cells, blocked = route_cells(planned(tmp_path, by, LAUNCHER + CRAFT), slice(None), slice(None))
        dates.append(np.where(blocked == 0, cells.legs[0].jd2, np.nan))
    both = np.isfinite(dates[0]) & np.isfinite(dates[1])
    assert (dates[0] != dates[1])[both].any()


def test_the_dates_of_a_stack_are_those_of_least_total_dv(tmp_path):
    stack = """
[stack]
payload_kg = 1000
[[stack.stage]]
isp_s = 450
structural_fraction = 0.1
flies = ["departure", "flyby1", "capture"]
"""
    plan = planned(tmp_path, "low_orbit_mass_kg", stack)
    assert plan.measures[plan.rank_by].scope == MASS
    assert plan.objective.name == "dv_total_km_s"


def test_limits_on_masses_hold_for_the_routes_that_were_found(tmp_path):
    plan = planned(tmp_path, "dv_total_km_s", LAUNCHER + CRAFT + "dry_mass_kg = 700\ntank_kg = 1200\n")
    cells, blocked = route_cells(plan, slice(None), slice(None))
    propellant = np.broadcast_to(plan.measures["propellant_kg"].compute(cells), plan.shape)
    allowed = blocked == 0
    assert allowed.any()
    assert (propellant[allowed] <= 1200.0).all()
    full = np.isfinite(propellant) & (propellant > 1200.0)
    assert full.any()
    bit = 3 + [bound.name for bound in plan.bounds].index("spacecraft_tank")
    assert (blocked[full] == 1 << bit).all()

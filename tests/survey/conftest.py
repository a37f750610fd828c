"""Plans and surveys that the tests of the engine share; swept once a session."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from survey_scenarios import LOOPS, PETREL, ROOK, shrink_tiles, written

from porkgrid.scenario import Scenario
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.cells import Cells
from porkgrid.survey.plan import Plan, make_plan
from porkgrid.survey.routes import route_cells
from porkgrid.survey.surveys import Survey
from porkgrid.survey.sweep import sweep


@pytest.fixture(scope="session")
def scenario_of(tmp_path_factory) -> Callable[[str], Scenario]:
    """Load a scenario's text."""
    return lambda text: load_scenario(written(tmp_path_factory.mktemp("scenario"), text))


@pytest.fixture(scope="session")
def plan_of(scenario_of) -> Callable[[str], Plan]:
    """Plan a scenario's text."""
    return lambda text: make_plan(scenario_of(text))


@pytest.fixture(scope="session")
def rook(plan_of) -> Plan:
    return plan_of(ROOK)


@pytest.fixture(scope="session")
def loops(plan_of) -> Plan:
    return plan_of(LOOPS)


@pytest.fixture(scope="session")
def petrel(plan_of) -> Plan:
    return plan_of(PETREL)


def all_cells(plan: Plan) -> Cells:
    return route_cells(plan, slice(None), slice(None))[0]


@pytest.fixture(scope="session")
def rook_cells(rook) -> Cells:
    return all_cells(rook)


@pytest.fixture(scope="session")
def petrel_cells(petrel) -> Cells:
    return all_cells(petrel)


@pytest.fixture
def small_tiles(monkeypatch) -> None:
    """Tiles of 8 × 32 cells: many even in a small grid."""
    shrink_tiles(monkeypatch)


@pytest.fixture(scope="session")
def survey(scenario_of, tmp_path_factory) -> Survey:
    """ROOK, swept in 12 tiles. Do not write to it."""
    with pytest.MonkeyPatch.context() as patch:
        shrink_tiles(patch)
        swept = sweep(scenario_of(ROOK), tmp_path_factory.mktemp("survey") / "rook", workers=2)
    return swept


@pytest.fixture
def sweep_text(scenario_of, tmp_path) -> Callable[[str], Survey]:
    """Sweep a scenario's text into a folder of the test's own."""
    folder: Path = tmp_path / "survey"
    return lambda text: sweep(scenario_of(text), folder, workers=1)

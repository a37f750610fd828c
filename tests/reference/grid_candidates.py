"""Candidates straight from a plan's grid, computed in memory: what a sweep would pick, without a folder."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from porkgrid.survey.admit import load_scenario
from porkgrid.survey.candidates import Picked, epoch_names
from porkgrid.survey.plan import Plan, make_plan
from porkgrid.survey.rank import distinct, local_bests
from porkgrid.survey.routes import route_cells

SCENARIOS = Path(__file__).parents[2] / "scenarios"


def changed_plan(folder: Path, scenario: str, *changes: tuple[str, str]) -> Plan:
    """Plan of one of the scenarios in the repository with words, which must be there, replaced."""
    text = (SCENARIOS / scenario).read_text(encoding="utf-8")
    for old, new in changes:
        assert old in text, old
        text = text.replace(old, new)
    path = folder / scenario
    path.write_text(text, encoding="utf-8")
    return make_plan(load_scenario(path, SCENARIOS))


def grid_candidates(plan: Plan) -> list[Picked]:
    """The distinct local bests of the whole grid, best first."""
    rank = plan.scenario.rank
    cells, blocked = route_cells(plan, slice(None), slice(None))
    values = np.broadcast_to(plan.measures[plan.rank_by].compute(cells), blocked.shape)
    i, j, _ = local_bests(lambda rows: (values[rows], blocked[rows]), len(blocked), plan.rank_sign)
    epochs = np.column_stack([_at(plan, name, cells, blocked.shape, i, j) for name in epoch_names(plan)])
    flown = [
        np.column_stack(
            [_at(plan, f"leg{n}_{what}", cells, blocked.shape, i, j) for what in ("revs", "branch")]
        )
        for n in range(1, len(plan.options) + 1)
    ]
    return [
        Picked(
            tuple(map(float, epochs[row])),
            tuple(
                next(each for each in options if (each.revs, each.branch) == tuple(leg[row]))
                for options, leg in zip(plan.options, flown, strict=True)
            ),
        )
        for row in distinct(epochs, rank.apart_days, rank.keep)
    ]


def _at(plan: Plan, name: str, cells, shape: tuple[int, int], i: np.ndarray, j: np.ndarray) -> np.ndarray:
    return np.broadcast_to(plan.measures[name].compute(cells), shape)[i, j]

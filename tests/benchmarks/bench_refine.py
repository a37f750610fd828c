"""How long does refining candidates take, against scipy's Nelder-Mead on the same measures?

    python tests/benchmarks/bench_refine.py [rounds]

Twenty candidates each of a direct route, of one with a flyby and of one with three. The baseline is the
simplex method from the grid's dates over `measures_at`, with a penalty where a limit is broken, on a few of
the same candidates; the ratio is of seconds per candidate. Beside them, how much better than on the grid the
ranked measure has become: the simplex walks as far as it likes, a refined candidate stays in its window.
"""

from __future__ import annotations

import sys
import tempfile
from functools import partial
from pathlib import Path

import numpy as np
from bench_routes import LONG_WAY, SCENARIOS, scenario_text
from child import verdict
from interleaved import best_seconds
from scipy.optimize import minimize

from porkgrid.survey.admit import load_scenario
from porkgrid.survey.candidates import Picked, measures_at
from porkgrid.survey.plan import Plan, make_plan
from porkgrid.survey.refine import refine

sys.path.insert(0, str(Path(__file__).parents[1] / "reference"))

from grid_candidates import grid_candidates

CANDIDATES, BASELINE_CANDIDATES, LEAST_RATIO = 20, 1, 10.0
FORBIDDEN = 1e6  # in the unit of the ranked measure


def direct() -> tuple[str, Path]:
    """Earth to Mars over fifteen years, on a coarser grid and with more than one candidate a season."""
    path = SCENARIOS / "earth-mars-2030-2044.toml"
    return _changed(path, ("step_days = 1.0", "step_days = 4.0"), ("apart_days = 30", "apart_days = 8")), path


def one_flyby() -> tuple[str, Path]:
    """Earth to Mars by way of Venus."""
    path = SCENARIOS / "earth-venus-mars-2034.toml"
    return _changed(path, ("apart_days = 10", "apart_days = 3")), path  # so that there are twenty


def three_flybys() -> tuple[str, Path]:
    """Earth to Jupiter by Venus twice and the Earth, on coarse grids."""
    coarse = [(body, first, last, 2 * step) for body, first, last, step in LONG_WAY]
    limits = "c3_km2_s2 = { max = 30 }\ntof_days = { max = 2900 }"
    return scenario_text(coarse, 1.0, limits, {2: 1}), Path("long-way.toml")


def _changed(path: Path, *changes: tuple[str, str]) -> str:
    text = path.read_text(encoding="utf-8")
    for old, new in changes:
        assert old in text, old
        text = text.replace(old, new)
    return text


CASES = {"direct": (direct, 0.5), "one flyby": (one_flyby, 2.0), "three flybys": (three_flybys, 10.0)}


def simplex(plan: Plan, one: Picked) -> float:
    """The ranked measure that Nelder-Mead comes to."""

    def cost(shift: np.ndarray) -> float:
        there = measures_at(plan, Picked(tuple(one.epochs + shift), one.options))
        value = plan.rank_sign * there[plan.rank_by]
        broken = any(bound.forbids(np.array(there[bound.measure.name])).any() for bound in plan.bounds)
        return FORBIDDEN if broken or not np.isfinite(value) else value

    n = len(one.epochs)
    start = np.vstack([np.zeros(n), np.eye(n)])
    options = {"initial_simplex": start, "xatol": 1e-3, "fatol": 1e-7, "maxiter": 2000}
    return float(minimize(cost, np.zeros(n), method="Nelder-Mead", options=options).fun)


def main(rounds: int = 2) -> None:
    """Time the cases in turns with the baseline and print."""
    with tempfile.TemporaryDirectory() as name:
        for case, (scenario, most_seconds) in CASES.items():
            text, origin = scenario()
            path = Path(name) / origin.name
            path.write_text(text, encoding="utf-8")
            plan = make_plan(load_scenario(path, SCENARIOS))
            picked = grid_candidates(plan)[:CANDIDATES]
            few = picked[:BASELINE_CANDIDATES]
            rivals = {
                "refine": partial(refine, plan, picked),
                "simplex": partial(lambda plan, few: [simplex(plan, one) for one in few], plan, few),
            }
            report(case, plan, picked, best_seconds(rivals, rounds), most_seconds)


def report(
    case: str, plan: Plan, picked: list[Picked], seconds: dict[str, float], most_seconds: float
) -> None:
    """Print one case."""
    each = seconds["refine"] / len(picked)
    baseline = seconds["simplex"] / BASELINE_CANDIDATES
    refined = refine(plan, picked)
    gains = [plan.rank_sign * (one.grid_value - one.value) for one in refined]
    unit = plan.measures[plan.rank_by].unit
    print(f"{case}: {len(picked)} candidates, {len(refined)} after merging")
    few = picked[:BASELINE_CANDIDATES]
    ours = [_gain(plan, one, refine(plan, [one])[0].value) for one in few]
    theirs = [_gain(plan, one, plan.rank_sign * simplex(plan, one)) for one in few]
    print(
        f"  refine   {seconds['refine']:7.3f} s, {1e3 * each:.1f} ms each, {np.mean(gains):.4f} {unit} gained"
    )
    print(
        f"  simplex  {baseline * len(picked):7.1f} s, {1e3 * baseline:7.1f} ms each, from {len(few)} of them"
    )
    print(f"  gained on those: refine {_listed(ours)}, simplex {_listed(theirs)} {unit}")
    print(f"  under {most_seconds:g} s: {verdict(seconds['refine'] < most_seconds)}")
    ratio = baseline / each
    print(f"  ratio {ratio:.0f}×, at least {LEAST_RATIO:.0f}×: {verdict(ratio >= LEAST_RATIO)}")


def _gain(plan: Plan, one: Picked, value: float) -> float:
    return plan.rank_sign * (measures_at(plan, one)[plan.rank_by] - value)


def _listed(values: list[float]) -> str:
    return ", ".join(f"{value:.6f}" for value in values)


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))

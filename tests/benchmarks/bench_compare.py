"""How long does a warm `porkgrid compare` of four surveys take, figure included, against bare imports?

    python tests/benchmarks/bench_compare.py [dates a side] [rounds]

Four Earth–Mars surveys of one season, all measures stored, each with a limit of its own: best candidates,
launch periods of 21 days, both baselines, table, CSV and figure. The baseline is a process that imports
numba, matplotlib and xarray and saves one empty figure. Then the trade fronts of the widest survey, of two
and of three measures, against sorting its allowed cells by the same columns.
"""

from __future__ import annotations

import sys
import tempfile
from pathlib import Path

import numpy as np
from bench_sweep import BARE, scenario_text
from child import PORKGRID, Spent, run, verdict
from interleaved import best_seconds

MOST_SECONDS, MOST_RATIO, MOST_SORTS = 5.0, 4.0, 4.0
C3_LIMITS = (16, 20, 25, 30)


def sweep_all(folder: Path, dates: int) -> list[Path]:
    """Sweep the surveys to compare; their folders."""
    swept = []
    for most in C3_LIMITS:
        text = scenario_text(dates).replace("c3_km2_s2 = { max = 25 }", f"c3_km2_s2 = {{ max = {most} }}")
        scenario = folder / f"c3-{most}.toml"
        scenario.write_text(text.replace("Benchmark, a million cells", f"Benchmark to {most} km²/s²"))
        swept.append(folder / f"c3-{most}")
        run([*PORKGRID, "sweep", str(scenario), "--out", str(swept[-1])])
    return swept


def time_fronts(survey_folder: Path, rounds: int) -> None:
    """Time trade fronts against sorts of what they are found in, and print."""
    from porkgrid.survey.surveys import open_survey
    from porkgrid.survey.trade import allowed_bands, non_dominated

    survey = open_survey(survey_folder)
    names = ("dv_total_km_s", "tof_days", "v_inf_arrival_km_s")
    costs = np.concatenate([values for _, _, values in allowed_bands(survey, names)])
    rivals = {
        "two": lambda: non_dominated(costs[:, :2]),
        "three": lambda: non_dominated(costs),
        "sort of two": lambda: np.lexsort(costs[:, :2].T[::-1]),
        "sort of three": lambda: np.lexsort(costs.T[::-1]),
    }
    seconds = best_seconds(rivals, rounds)
    for count in ("two", "three"):
        spent, sort = seconds[count], seconds[f"sort of {count}"]
        print(
            f"  front of {count} measures of {len(costs):,} cells {spent:.3f} s, a sort of them {sort:.3f} s"
        )
        print(
            f"  ratio {spent / sort:.2f}×, at most {MOST_SORTS:.0f}×: {verdict(spent <= MOST_SORTS * sort)}"
        )


def main(dates: int = 1000, rounds: int = 5) -> None:
    """Time in turns and print."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        swept = sweep_all(folder, dates)
        compare = [*PORKGRID, "compare", *map(str, swept), "--out", str(folder / "comparison")]
        bare = [sys.executable, "-c", BARE, str(folder / "empty.png")]
        runs: list[Spent] = []
        rivals = {"porkgrid compare": lambda: runs.append(run(compare)), "bare imports": lambda: run(bare)}
        seconds = best_seconds(rivals, rounds)
        spent, ratio = seconds["porkgrid compare"], seconds["porkgrid compare"] / seconds["bare imports"]
        processor = min(each.cpu_seconds for each in runs)
        print(f"four surveys of {dates} × {dates} cells, compared with figure and tables; best of {rounds}")
        print(f"  compare {spent:5.2f} s, {processor:.2f} s of processor time")
        print(f"  bare    {seconds['bare imports']:5.2f} s for numba, matplotlib, xarray and an empty figure")
        print(f"  under {MOST_SECONDS:.0f} s: {verdict(spent < MOST_SECONDS)}")
        print(f"  ratio {ratio:.2f}×, at most {MOST_RATIO:.0f}×: {verdict(ratio <= MOST_RATIO)}")
        time_fronts(swept[-1], rounds)


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))

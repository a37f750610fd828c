"""What does a survey of fifteen years cost, in time and memory, against the bare Lambert kernel?

    python tests/benchmarks/bench_long_survey.py [rounds]

scenarios/earth-mars-2030-2044.toml, 32 million cells, swept, ranked and drawn by a command of its own. The
baseline fills C3 and arrival speed of the same grid, a band of rows at a time, with as many threads, and
keeps nothing.
"""

from __future__ import annotations

import os
import sys
import tempfile
import time
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import numpy as np
from child import PORKGRID, Spent, run, verdict
from interleaved import best_seconds

from porkgrid.physics.constants import GM_SUN_KM3_S2
from porkgrid.physics.lambert import ECLIPTIC_POLE_ICRF
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.legs import energy_and_arrival_speed
from porkgrid.survey.plan import Plan, make_plan

SCENARIO = Path(__file__).parents[2] / "scenarios" / "earth-mars-2030-2044.toml"
MOST_BYTES = 1.5e9
BAND_ROWS = 64
POLE = np.array(ECLIPTIC_POLE_ICRF)


def fly_bare(plan: Plan) -> float:
    """Solve every cell of the plan's grid and throw the answers away; processor seconds of all threads."""
    started = time.process_time()
    leave, arrive = plan.tables
    columns = len(arrive.jd)

    def band(top: int) -> None:
        rows = slice(top, top + BAND_ROWS)
        count = len(leave.jd[rows])
        energy_and_arrival_speed(
            leave.jd[rows], leave.position[:, rows].copy(), leave.velocity[:, rows].copy(),
            arrive.jd, arrive.position, arrive.velocity, GM_SUN_KM3_S2, POLE, 1.0,
            np.empty((count, columns)), np.empty((count, columns)),
        )  # fmt: skip

    with ThreadPoolExecutor(os.cpu_count()) as pool:
        list(pool.map(band, range(0, len(leave.jd), BAND_ROWS)))
    return time.process_time() - started


def main(rounds: int = 2) -> None:
    """Time both in turns and print."""
    plan = make_plan(load_scenario(SCENARIO))
    runs: list[Spent] = []
    bare: list[float] = []
    with tempfile.TemporaryDirectory() as name:
        survey = Path(name) / "survey"
        sweep = [*PORKGRID, "sweep", str(SCENARIO), "--out", str(survey), "--fresh"]
        rivals = {"sweep": lambda: runs.append(run(sweep)), "bare": lambda: bare.append(fly_bare(plan))}
        seconds = best_seconds(rivals, rounds)
        disk = sum(path.stat().st_size for path in survey.rglob("*") if path.is_file())
    n, m = plan.shape
    peak = max(spent.peak_bytes for spent in runs)
    print(f"{n} × {m} = {n * m / 1e6:.1f} million Earth–Mars cells, best of {rounds} alternating runs")
    processor = min(each.cpu_seconds for each in runs)
    print(f"  sweep  {seconds['sweep']:6.1f} s, {n * m / seconds['sweep'] / 1e6:.2f} million cells a second")
    print(f"  bare   {seconds['bare']:6.1f} s for the Lambert solves alone, {os.cpu_count()} threads")
    print(
        f"  ratio {seconds['sweep'] / seconds['bare']:.1f}×, of processor time {processor / min(bare):.1f}×"
    )
    print(f"  {disk / 1e6:.0f} MB on disk")
    print(f"  peak memory {peak / 1e9:.2f} GB, under {MOST_BYTES / 1e9} GB: {verdict(peak < MOST_BYTES)}")


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))

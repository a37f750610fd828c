"""What does an overnight survey cost, 400 million cells, in time and memory, against the bare Lambert kernel?

    python tests/benchmarks/bench_overnight.py [dates a side] [rounds]

27 years of half-day steps, Earth to Mars: C3, arrival speed and what the limits need, swept, written, ranked
and drawn by a command of its own with --memory 1.4GB. The baseline fills C3 and arrival speed of the same
grid with as many threads and keeps nothing. Then a sixteenth of it with one worker and with two.
"""

from __future__ import annotations

import os
import sys
import tempfile
from pathlib import Path

from bench_long_survey import fly_bare
from child import PORKGRID, Spent, run, verdict
from interleaved import best_seconds

from porkgrid.survey.admit import load_scenario
from porkgrid.survey.plan import make_plan

MOST_BYTES, MOST_RATIO, LEAST_SPEEDUP = 1.5e9, 5.0, 1.8
SCENARIO = """
name = "Benchmark, overnight"
measures = ["c3_km2_s2", "v_inf_arrival_km_s"]

[[encounter]]
body = "earth"
first = 2030-01-01
last = {last}
step_days = {step_days}

[[encounter]]
body = "mars"
first = 2030-06-01
last = {last_arrival}
step_days = {step_days}

[limits]
c3_km2_s2 = {{ max = 25 }}
v_inf_arrival_km_s = {{ max = 5 }}
tof_days = {{ max = 450 }}
"""


def scenario_text(dates: int) -> str:
    """A scenario of dates × dates cells over 27 years."""
    return SCENARIO.format(
        last="2057-05-18", last_arrival="2057-10-16", step_days=round(9999.5 / (dates - 1), 6)
    )


def main(dates: int = 20_000, rounds: int = 1) -> None:
    """Time both in turns, then one worker against two, and print."""
    with tempfile.TemporaryDirectory() as name:
        path, survey = Path(name) / "scenario.toml", Path(name) / "survey"
        path.write_text(scenario_text(dates))
        plan = make_plan(load_scenario(path))
        runs: list[Spent] = []
        sweep = [*PORKGRID, "sweep", str(path), "--out", str(survey), "--fresh", "--memory", "1.4GB"]
        rivals = {"sweep": lambda: runs.append(run(sweep)), "bare": lambda: fly_bare(plan)}
        seconds = best_seconds(rivals, rounds)
        disk = sum(file.stat().st_size for file in survey.rglob("*") if file.is_file())
        small = Path(name) / "small.toml"
        small.write_text(scenario_text(dates // 4))
        one, two = (
            [*PORKGRID, "sweep", str(small), "--out", str(survey), "--fresh", "--workers", str(workers)]
            for workers in (1, 2)
        )
        by_workers = best_seconds({"one": lambda: run(one), "two": lambda: run(two)}, max(rounds, 2))
    n, m = plan.shape
    peak = max(spent.peak_bytes for spent in runs)
    ratio, speedup = seconds["sweep"] / seconds["bare"], by_workers["one"] / by_workers["two"]
    print(f"{n} × {m} = {n * m / 1e6:.0f} million Earth–Mars cells, best of {rounds} alternating runs")
    print(f"  sweep  {seconds['sweep']:6.1f} s, {n * m / seconds['sweep'] / 1e6:.1f} million cells a second")
    print(f"  bare   {seconds['bare']:6.1f} s for the Lambert solves alone, {os.cpu_count()} threads")
    print(f"  ratio {ratio:.2f}×, at most {MOST_RATIO:.0f}×: {verdict(ratio <= MOST_RATIO)}")
    print(f"  {disk / 1e9:.2f} GB on disk")
    print(f"  peak memory {peak / 1e9:.2f} GB, under {MOST_BYTES / 1e9} GB: {verdict(peak < MOST_BYTES)}")
    print(
        f"  a sixteenth of it: one worker {by_workers['one']:.1f} s, two {by_workers['two']:.1f} s, "
        f"{speedup:.2f}×, at least {LEAST_SPEEDUP}×: {verdict(speedup >= LEAST_SPEEDUP)}"
    )


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))

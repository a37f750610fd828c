"""How long does a warm `porkgrid sweep` of a million cells take, against merely importing what it uses?

    python tests/benchmarks/bench_sweep.py [dates a side] [rounds]

Earth to Mars, every measure stored, four limits, ranking, chart and limit map, as a command of its own. The
baseline is a process that imports numba, matplotlib and xarray and saves one empty figure.
"""

from __future__ import annotations

import sys
import tempfile
from datetime import datetime, timedelta
from pathlib import Path

from child import PORKGRID, Spent, run, verdict
from interleaved import best_seconds

MOST_SECONDS, MOST_RATIO = 6.0, 4.0

BARE = """
import sys
import numba, xarray
import matplotlib
matplotlib.use("agg")
from matplotlib import pyplot
pyplot.figure().savefig(sys.argv[1])
"""

SCENARIO = """
name = "Benchmark, a million cells"

[[encounter]]
body = "earth"
first = {first_departure}
last = {last_departure}
step_days = {step_days}
parking = {{ periapsis_altitude_km = 200, apoapsis_altitude_km = 200, inclination_deg = 28.5 }}

[[encounter]]
body = "mars"
first = {first_arrival}
last = {last_arrival}
step_days = {step_days}
capture = {{ periapsis_altitude_km = 400, apoapsis_altitude_km = 33000 }}

[limits]
c3_km2_s2 = {{ max = 25 }}
dla_deg = {{ min = -40, max = 40 }}
v_inf_arrival_km_s = {{ max = 5.0 }}
tof_days = {{ max = 450 }}

[rank]
by = "dv_total_km_s"
"""
DEPARTURE, ARRIVAL, SPAN_DAYS = datetime(2028, 6, 1), datetime(2029, 4, 1), 400.0


def scenario_text(dates: int) -> str:
    """A scenario of dates × dates cells over the season of 2028/29, every cell a flight forward in time."""
    step_days = round(SPAN_DAYS / dates, 6)
    span = timedelta(days=step_days * (dates - 1))
    return SCENARIO.format(
        first_departure=DEPARTURE.isoformat(),
        last_departure=(DEPARTURE + span).isoformat(),
        first_arrival=ARRIVAL.isoformat(),
        last_arrival=(ARRIVAL + span).isoformat(),
        step_days=step_days,
    )


def main(dates: int = 1000, rounds: int = 5) -> None:
    """Time both in turns and print."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        scenario = folder / "scenario.toml"
        scenario.write_text(scenario_text(dates))
        sweep = [*PORKGRID, "sweep", str(scenario), "--out", str(folder / "survey"), "--fresh"]
        bare = [sys.executable, "-c", BARE, str(folder / "empty.png")]
        runs: list[Spent] = []
        rivals = {"porkgrid sweep": lambda: runs.append(run(sweep)), "bare imports": lambda: run(bare)}
        seconds = best_seconds(rivals, rounds)
        figures = sum(1 for _ in (folder / "survey" / "figures").glob("*.png"))
    spent, ratio = seconds["porkgrid sweep"], seconds["porkgrid sweep"] / seconds["bare imports"]
    print(f"{dates} × {dates} Earth–Mars cells, all measures, ranked, {figures} figures; best of {rounds}")
    processor = min(each.cpu_seconds for each in runs)
    peak_mb = max(each.peak_bytes for each in runs) / 1e6
    print(f"  sweep  {spent:6.2f} s, {processor:.2f} s of processor time, peak memory {peak_mb:.0f} MB")
    print(f"  bare   {seconds['bare imports']:6.2f} s for numba, matplotlib, xarray and an empty figure")
    print(f"  under {MOST_SECONDS:.0f} s: {verdict(spent < MOST_SECONDS)}")
    print(f"  ratio {ratio:.2f}×, at most {MOST_RATIO:.0f}×: {verdict(ratio <= MOST_RATIO)}")


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))

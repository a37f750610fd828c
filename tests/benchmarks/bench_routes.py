"""What do routes with flybys cost, from one to four, and how does the cost grow?

    python tests/benchmarks/bench_routes.py

Whole sweeps, warm, each a process of its own with all measures, ranking and charts: Earth–Venus–Mars on
400 × 300 × 500 dates at one day, and Earth–Venus–Venus–Earth–Jupiter over two years of departures with burns
up to 1 km/s; each as a ratio to a process that only imports numba, matplotlib and xarray and saves one empty
figure. Then a table of the search alone: dates per encounter doubled, flybys one to four.
"""

from __future__ import annotations

import sys
import tempfile
import time
from pathlib import Path

import numpy as np
from child import PORKGRID, Spent, run

from porkgrid.survey.admit import load_scenario
from porkgrid.survey.chains import prepare, search_block
from porkgrid.survey.legtables import leg_table
from porkgrid.survey.plan import make_plan

SCENARIOS = Path(__file__).parents[2] / "scenarios"
PARKING = "parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200 }"
# body, first and last date, step in days
LONG_WAY = (
    ("earth", "2031-01-01", "2033-01-01", 4),
    ("venus", "2031-03-01", "2033-09-01", 4),
    ("venus", "2032-01-01", "2035-03-01", 4),
    ("earth", "2032-06-01", "2036-06-01", 4),
    ("jupiter", "2034-06-01", "2040-06-01", 8),
)
# first and last date of each body, from which as many dates as wanted are taken evenly
STOPS = (
    ("earth", 0, 600), ("venus", 100, 800), ("earth", 400, 1300), ("venus", 700, 1800), ("earth", 1000, 2300),
    ("jupiter", 1600, 4000),
)  # fmt: skip
BARE = (
    "import numba, xarray; from matplotlib.figure import Figure; "
    "Figure().savefig(__import__('sys').argv[1], format='png')"
)


def scenario_text(stops, burn: float, limits: str, revs: dict[int, int] | None = None) -> str:
    """A scenario of encounters (body, first, last, step_days)."""
    parts = ['name = "benchmark"']
    for n, (body, first, last, step) in enumerate(stops):
        part = f'[[encounter]]\nbody = "{body}"\nfirst = {first}\nlast = {last}\nstep_days = {step}'
        if n == 0:
            part += f"\n{PARKING}"
        elif n < len(stops) - 1:
            part += f"\nflyby = {{ min_altitude_km = 300, max_burn_km_s = {burn} }}"
        parts.append(part)
    parts += [f"[[leg]]\nmax_revs = {(revs or {}).get(n, 0)}" for n in range(1, len(stops))]
    return "\n".join([*parts, "[limits]", limits]) + "\n"


def whole_sweeps(folder: Path, rounds: int = 3) -> None:
    """Time both sweeps against the bare process, alternating."""
    long_way = folder / "long-way.toml"
    limits = "c3_km2_s2 = { max = 30 }\ntof_days = { max = 2900 }"
    long_way.write_text(scenario_text(LONG_WAY, 1.0, limits, {2: 1}))
    jobs = {
        "bare imports and an empty figure": [sys.executable, "-c", BARE, str(folder / "empty.png")],
        "Earth–Venus–Mars": _sweep(SCENARIOS / "earth-venus-mars-2034.toml", folder / "a"),
        "Earth–Venus–Venus–Earth–Jupiter": _sweep(long_way, folder / "b"),
    }
    for job in jobs.values():
        run(job)  # compiles, warms the file cache
    best: dict[str, Spent] = {}
    for _ in range(rounds):
        for name, job in jobs.items():
            spent = run(job)
            if name not in best or spent.seconds < best[name].seconds:
                best[name] = spent
    bare = best["bare imports and an empty figure"].seconds
    for name, spent in best.items():
        print(
            f"  {name:34s} {spent.seconds:6.2f} s, {spent.peak_bytes / 1e6:5.0f} MB, "
            f"{spent.seconds / bare:.1f} × the bare process"
        )


def _sweep(scenario: Path, out: Path) -> list[str]:
    return [*PORKGRID, "sweep", str(scenario), "--out", str(out), "--fresh"]


def search_seconds(folder: Path, flybys: int, dates: int) -> tuple[float, int]:
    """Seconds of one search in one thread, and how many cells it reached."""
    stops = []
    for body, first, last in (*STOPS[: flybys + 1], STOPS[-1]):
        step = (last - first) / dates
        stops.append((body, _date(first), _date(first + step * (dates - 1)), step))
    path = folder / "growth.toml"
    path.write_text(scenario_text(stops, 1.0, "c3_km2_s2 = { max = 60 }"))
    plan = make_plan(load_scenario(path))
    started = time.perf_counter()
    search = prepare(plan)
    first_leg = leg_table(plan, 1, plan.tables[0], plan.tables[1])
    choice = search_block(plan, search, plan.tables[0], first_leg)
    return time.perf_counter() - started, int((choice.dates[0] >= 0).sum())


def _date(days: float) -> str:
    return str(np.datetime64("2031-01-01T00:00:00") + np.timedelta64(round(days * 86400), "s"))


def growth(folder: Path) -> None:
    """Print the table."""
    sizes = (25, 50, 100, 200)
    search_seconds(folder, 1, 25)
    print("  seconds of the search in one thread (growth on doubling the dates)")
    print("  flybys" + "".join(f"{size:>18d} dates" for size in sizes))
    for flybys in (1, 2, 3, 4):
        line, before = "", None
        for size in sizes:
            seconds = min(search_seconds(folder, flybys, size)[0] for _ in range(2))
            line += f"{seconds:14.3f} " + ("         " if before is None else f"({seconds / before:4.1f} ×) ")
            before = seconds
        print(f"  {flybys:6d} {line}")


def main() -> None:
    """Run both parts."""
    with tempfile.TemporaryDirectory() as name:
        whole_sweeps(Path(name))
        growth(Path(name))


if __name__ == "__main__":
    main()

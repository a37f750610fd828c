"""How soon does the command line answer: `porkgrid --help`, and the first run on a fresh install?

    python tests/benchmarks/bench_cli.py [rounds of --help] [first runs]

Help is measured against a process that only imports typer. A first run has an empty folder for compiled
kernels; it is measured against the same sweep with kernels compiled, and must say that it compiles.
"""

from __future__ import annotations

import sys
import tempfile
from pathlib import Path

from bench_sweep import scenario_text
from child import PORKGRID, run, verdict
from interleaved import best_seconds

MOST_HELP_SECONDS, MOST_FIRST_SECONDS = 0.5, 45.0


def time_help(rounds: int) -> None:
    """Time `--help` and print."""
    rivals = {
        "help": lambda: run([*PORKGRID, "--help"]),
        "typer": lambda: run([sys.executable, "-c", "import typer"]),
    }
    seconds = best_seconds(rivals, rounds)
    print(f"porkgrid --help, best of {rounds} alternating runs")
    print(f"  help   {seconds['help']:6.3f} s")
    ratio = seconds["help"] / seconds["typer"]
    print(f"  bare   {seconds['typer']:6.3f} s for `import typer`; ratio {ratio:.2f}×")
    print(f"  under {MOST_HELP_SECONDS} s: {verdict(seconds['help'] < MOST_HELP_SECONDS)}")


def time_first_run(rounds: int) -> None:
    """Time a small sweep with and without compiled kernels and print."""
    first, warm = [], []
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        scenario = folder / "scenario.toml"
        scenario.write_text(scenario_text(100))
        sweep = [*PORKGRID, "sweep", str(scenario), "--out", str(folder / "survey"), "--fresh"]
        for number in range(rounds):
            cache = {"NUMBA_CACHE_DIR": str(folder / f"kernels-{number}")}
            first.append(run(sweep, cache))
            warm.append(run(sweep, cache))
    least, usual = (min(spent.seconds for spent in runs) for runs in (first, warm))
    told = all("compiling" in spent.said for spent in first)
    quiet = not any("compiling" in spent.said for spent in warm)
    print(f"first run on a fresh install, a sweep of 100 × 100 cells, best of {rounds} alternating runs")
    print(f"  first  {least:6.2f} s")
    print(f"  warm   {usual:6.2f} s; ratio {least / usual:.2f}×")
    print(f"  under {MOST_FIRST_SECONDS:.0f} s: {verdict(least < MOST_FIRST_SECONDS)}")
    print(f"  says that it compiles, and only then: {verdict(told and quiet)}")


def main(help_rounds: int = 7, first_runs: int = 2) -> None:
    """Both."""
    time_help(help_rounds)
    time_first_run(first_runs)


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))

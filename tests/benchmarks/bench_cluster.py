"""Are two dask workers faster than one, and what do they cost against threads?

    python tests/benchmarks/bench_cluster.py [rounds]

Tiles of a survey of 32 million cells given to a real scheduler with one worker process and with two, one
thread each, after a first sweep that has warmed them; the same sweep by two threads of one process. Engine
only, no figures.
"""

from __future__ import annotations

import json
import subprocess
import sys
import tempfile
import time
from pathlib import Path

from child import verdict
from interleaved import best_seconds

from porkgrid.survey.admit import load_scenario
from porkgrid.survey.sweep import sweep

SCENARIO = Path(__file__).parents[2] / "scenarios" / "earth-mars-2030-2044.toml"
LEAST_SPEEDUP = 1.6


def dask(*arguments: str) -> subprocess.Popen[bytes]:
    """Start a part of a cluster."""
    command = [sys.executable, "-m", "dask", *arguments]
    return subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)


def cluster(folder: Path, workers: int) -> tuple[str, list[subprocess.Popen[bytes]]]:
    """Start a scheduler and workers; its address, and all processes."""
    from distributed import Client

    file = folder / f"scheduler-{workers}.json"
    place = ("--scheduler-file", str(file))
    running = [dask("scheduler", "--port", "0", "--no-dashboard", *place)]
    while not file.exists():
        time.sleep(0.05)
    running += [
        dask("worker", "--nthreads", "1", "--no-nanny", "--no-dashboard", *place) for _ in range(workers)
    ]
    address = json.loads(file.read_text())["address"]
    with Client(address) as client:
        client.wait_for_workers(workers, timeout=60)
    return address, running


def main(rounds: int = 2) -> None:
    """Time all three in turns and print."""
    scenario = load_scenario(SCENARIO)
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        (one, parts), (two, more) = cluster(folder, 1), cluster(folder, 2)
        try:
            seconds = best_seconds(
                {
                    "one worker": lambda: sweep(scenario, folder / "one", fresh=True, cluster=one),
                    "two workers": lambda: sweep(scenario, folder / "two", fresh=True, cluster=two),
                    "two threads": lambda: sweep(scenario, folder / "threads", 2, fresh=True),
                },
                rounds,
            )
        finally:
            for process in parts + more:
                process.kill()
    speedup = seconds["one worker"] / seconds["two workers"]
    print(f"32 million Earth–Mars cells swept and ranked, best of {rounds} alternating runs")
    for what, spent in seconds.items():
        print(f"  {what:<12} {spent:6.1f} s")
    print(f"  two workers {speedup:.2f}× one, at least {LEAST_SPEEDUP}×: {verdict(speedup >= LEAST_SPEEDUP)}")
    print(f"  two workers take {seconds['two workers'] / seconds['two threads']:.2f}× what two threads take")


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))

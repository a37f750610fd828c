"""What do mass measures add to a sweep of a million cells?

    python tests/benchmarks/bench_masses.py [dates a side] [rounds]

The sweep of bench_sweep.py in this process (tiles, store, ranking; no figures): without masses; with a
launcher and a spacecraft (injected and delivered mass, margin, propellant, spacecraft Δv, the table's limit);
with a stack of two stages.
"""

from __future__ import annotations

import shutil
import sys
import tempfile
from pathlib import Path

from bench_sweep import scenario_text
from child import verdict
from interleaved import best_seconds

from porkgrid.survey.admit import load_scenario
from porkgrid.survey.sweep import sweep

MOST_MORE = 0.20
TABLE = "c3_km2_s2,injected_mass_kg\n0,4000\n5,3600\n10,3200\n15,2850\n20,2500\n30,1900\n"
LAUNCHED = """
[launcher]
table = "launcher.csv"

[spacecraft]
isp_s = 320
dry_mass_kg = 900
"""
STACK = """
[stack]
payload_kg = 2000

[[stack.stage]]
isp_s = 450
structural_fraction = 0.1
flies = ["departure"]

[[stack.stage]]
isp_s = 320
structural_fraction = 0.12
flies = ["capture"]
"""


def main(dates: int = 1000, rounds: int = 5) -> None:
    """Time the three in turns and print."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        (folder / "launcher.csv").write_text(TABLE)
        rivals = {}
        for kind, vehicle in (("plain", ""), ("launcher", LAUNCHED), ("stack", STACK)):
            path = folder / f"{kind}.toml"
            path.write_text(scenario_text(dates) + vehicle)
            scenario, out = load_scenario(path), folder / kind
            rivals[kind] = lambda scenario=scenario, out=out: (
                shutil.rmtree(out, ignore_errors=True),
                sweep(scenario, out),
            )
        seconds = best_seconds(rivals, rounds)
    print(f"{dates} × {dates} cells swept and ranked, best of {rounds}")
    print(f"  without masses         {seconds['plain']:.2f} s")
    for kind in ("launcher", "stack"):
        more = seconds[kind] / seconds["plain"] - 1.0
        print(
            f"  with {kind:<17} {seconds[kind]:.2f} s: {100 * more:+.0f} %, "
            f"at most +{100 * MOST_MORE:.0f} %: {verdict(more <= MOST_MORE)}"
        )


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))

"""How long do launch periods of 1 to 60 days by every stored measure take, against reading the grid once?

    python tests/benchmarks/bench_period.py [dates a side] [rounds]

The survey is that of bench_sweep.py, every measure stored. The baseline opens it, reads every variable of the
store with xarray and takes its least value: what anybody who looks at all of it must pay.
"""

from __future__ import annotations

import sys
import tempfile
from pathlib import Path

import numpy as np
from bench_sweep import scenario_text
from child import verdict
from interleaved import best_seconds

from porkgrid.survey.admit import load_scenario
from porkgrid.survey.growth import growth_of_all
from porkgrid.survey.surveys import Survey, open_survey
from porkgrid.survey.sweep import sweep

MOST_SECONDS, MOST_RATIO = 1.0, 4.0


def read_all(survey: Survey) -> float:
    """Read every variable whole; the least value of all."""
    return min(float(np.nanmin(survey.grid[name].values)) for name in survey.grid.data_vars)


def main(dates: int = 1000, rounds: int = 5) -> None:
    """Time all in turns and print."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        scenario = folder / "scenario.toml"
        scenario.write_text(scenario_text(dates))
        sweep(load_scenario(scenario), folder / "survey")

        def opened() -> Survey:  # anew, as what one has read is kept
            survey = open_survey(folder / "survey")
            assert survey.plan.stored  # planned by all, the baseline too
            return survey

        seconds = best_seconds(
            {
                "nothing": lambda: growth_of_all(opened(), "nothing"),
                "arrival": lambda: growth_of_all(opened(), "arrival"),
                "reading": lambda: read_all(opened()),
            },
            rounds,
        )
        measures = len(opened().plan.stored)
    print(f"{dates} × {dates} cells, {measures} measures, 1 to 60 days; best of {rounds}")
    print(f"  reading the grid              {seconds['reading']:6.2f} s")
    for hold in ("nothing", "arrival"):
        spent, ratio = seconds[hold], seconds[hold] / seconds["reading"]
        print(f"  periods, {hold + ' held':<20} {spent:6.2f} s, {ratio:.2f}× reading")
        print(f"    under {MOST_SECONDS:.0f} s: {verdict(spent < MOST_SECONDS)}; "
              f"at most {MOST_RATIO:.0f}×: {verdict(ratio <= MOST_RATIO)}")  # fmt: skip


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))

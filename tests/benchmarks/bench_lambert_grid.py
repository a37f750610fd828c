"""How fast is a porkchop grid, against the published Householder method one problem at a time?

    python tests/benchmarks/bench_lambert_grid.py [dates a side] [rounds]

Earth to Mars with DE440 states, half-day steps, flights of 1 day to 1000 (every cell can be flown; about a
tenth are hyperbolic).  Both fill C3 and arrival speed of every cell, in one thread; then ours in two threads.
"""

from __future__ import annotations

import datetime as dt
import sys
from concurrent.futures import ThreadPoolExecutor

import householder_baseline
import numpy as np
from interleaved import best_seconds

from porkgrid.physics.constants import DAY_S, GM_SUN_KM3_S2
from porkgrid.physics.lambert import ECLIPTIC_POLE_ICRF
from porkgrid.sky.bodies import find_body
from porkgrid.sky.epochs import jd_from_date
from porkgrid.sky.kernel import open_ephemeris
from porkgrid.sky.states import StateTable, state_table
from porkgrid.survey.legs import energy_and_arrival_speed

FIRST_DEPARTURE = dt.date(2028, 6, 1)
POLE = np.array(ECLIPTIC_POLE_ICRF)


def date_tables(dates: int) -> tuple[StateTable, StateTable]:
    """Tables of Earth and, from the day after its last date on, Mars."""
    ephemeris = open_ephemeris()
    first = jd_from_date(FIRST_DEPARTURE)
    leave = first + 500.0 * np.arange(dates) / dates
    arrive = leave + 500.0 + 1.0
    return state_table(ephemeris, find_body("earth", {}), leave), state_table(
        ephemeris, find_body("mars", {}), arrive
    )


def run_ours(leave: StateTable, arrive: StateTable, out: np.ndarray, rows: slice) -> None:
    """Fill C3 and arrival speed of some rows with the row kernels."""
    energy_and_arrival_speed(
        leave.jd[rows], leave.position[:, rows].copy(), leave.velocity[:, rows].copy(),
        arrive.jd, arrive.position, arrive.velocity, GM_SUN_KM3_S2, POLE, 1.0, out[0, rows], out[1, rows],
    )  # fmt: skip


def run_baseline(leave: StateTable, arrive: StateTable, out: np.ndarray) -> None:
    """Fill the same with the published method."""
    householder_baseline.solve_grid(
        leave.position, leave.velocity, leave.jd * DAY_S, arrive.position, arrive.velocity, arrive.jd * DAY_S,
        np.linalg.norm(arrive.position, axis=0), GM_SUN_KM3_S2, POLE, out[0], out[1],
    )  # fmt: skip


def main(dates: int = 1000, rounds: int = 9) -> None:
    """Time, compare the answers, print."""
    leave, arrive = date_tables(dates)
    ours, theirs = np.empty((2, dates, dates)), np.empty((2, dates, dates))
    everything, halves = slice(None), (slice(None, dates // 2), slice(dates // 2, None))

    def run_half(rows: slice) -> None:
        run_ours(leave, arrive, ours, rows)

    with ThreadPoolExecutor(2) as pool:
        rivals = {
            "row kernels": lambda: run_ours(leave, arrive, ours, everything),
            "Householder": lambda: run_baseline(leave, arrive, theirs),
            "two threads": lambda: list(pool.map(run_half, halves)),
        }
        seconds = best_seconds(rivals, rounds)
    print(f"{dates} × {dates} Earth–Mars cells, C3 and arrival speed, best of {rounds} alternating runs")
    for name, spent in seconds.items():
        print(f"  {name:12s} {spent / dates**2 * 1e9:8.1f} ns a solve")
    one = seconds["row kernels"]
    print(f"  row kernels against Householder, one thread each: {seconds['Householder'] / one:.2f}×")
    print(f"  two threads against one: {one / seconds['two threads']:.2f}×")
    print(f"  not solved: {np.isnan(ours).sum()} ours, {np.isnan(theirs).sum()} theirs")
    apart = np.abs(ours / theirs - 1).ravel()
    middle, rare = np.nanquantile(apart, [0.5, 0.999])
    print(f"  answers apart (relative): median {middle:.1e}, 99.9 % {rare:.1e}, most {np.nanmax(apart):.1e}")


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))

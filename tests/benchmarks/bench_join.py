"""How fast are flybys joined, densely and pruned, against one triple at a time with asin and Newton?

    python tests/benchmarks/bench_join.py [dates a side] [rounds]

Earth–Venus–Mars, one thread. The plain rival solves each (departure, flyby, arrival) triple for its periapsis
to 1e-10 by Newton's method on asin + asin, then compares its cost, as one would write it first.
"""

from __future__ import annotations

import math
import sys
import tempfile
from pathlib import Path

import numpy as np
from interleaved import best_seconds
from numba import njit

from porkgrid.survey.admit import load_scenario
from porkgrid.survey.chains import _first_legs, flyby_bounds
from porkgrid.survey.joins import UX, V2, join
from porkgrid.survey.legtables import leg_table
from porkgrid.survey.plan import make_plan

SCENARIO = Path(__file__).parents[2] / "scenarios" / "earth-venus-mars-2034.toml"


@njit(error_model="numpy", fastmath=True)
def plain_join(
    in_fields, in_cost, in_count, out_fields, out_cost, out_leg, out_count, y_min, burn_max, best, flyby
):
    """Best cost and flyby date of each arrival for one departure, a triple at a time."""
    for j in range(in_fields.shape[0]):
        for p in range(in_count[j]):
            a2 = in_fields[j, V2, p]
            for e in range(out_count[j]):
                b2 = out_fields[j, V2, e]
                cosine = 0.0
                for x in range(UX, UX + 3):
                    cosine += in_fields[j, x, p] * out_fields[j, x, e]
                turn = math.acos(min(max(cosine, -1.0), 1.0))
                y = (1.0 / math.sin(0.5 * turn) - 1.0) / math.sqrt(a2 * b2)
                for _ in range(50):
                    s1, s2 = 1.0 / (1.0 + a2 * y), 1.0 / (1.0 + b2 * y)
                    miss = math.asin(s1) + math.asin(s2) - turn
                    slope = a2 * s1 * s1 / math.sqrt(1.0 - s1 * s1) + b2 * s2 * s2 / math.sqrt(1.0 - s2 * s2)
                    step = miss / slope
                    y = max(y + step, 0.1 * y)
                    if abs(step) < 1e-10 * y:
                        break
                if y < y_min:
                    continue
                burn = abs(math.sqrt(b2 + 2.0 / y) - math.sqrt(a2 + 2.0 / y))
                cost = in_cost[j, p] + out_cost[j, e] + burn
                k = out_leg[j, e]
                if burn <= burn_max and cost < best[k]:
                    best[k] = cost
                    flyby[k] = j


def main(dates: int = 300, rounds: int = 5) -> None:
    """Time, compare the answers, print."""
    plan, departures, ends_out = _prepared(dates)
    m = len(plan.tables[-1].jd)
    bounds = flyby_bounds(plan, 1)
    answers: dict[str, np.ndarray] = {}
    tallies: dict[str, np.ndarray] = {}

    def ours(name: str, slack: float) -> None:
        values = bounds.as_array(1.0, math.inf, slack)
        tally = np.zeros(3, dtype=np.int64)
        answers[name] = np.empty((len(departures), m))
        for row, legs in enumerate(departures):
            best, came, by = (
                np.full(m, math.inf),
                np.full(m, -1, dtype=np.int64),
                np.full(m, -1, dtype=np.int32),
            )
            join(
                legs.fields, legs.cost, legs.count, ends_out.fields, ends_out.cost, ends_out.leg,
                ends_out.count, m, 0, values, best, came, by, tally,
            )  # fmt: skip
            answers[name][row] = best
        tallies[name] = tally

    def plain() -> None:
        answers["plain"] = np.empty((len(departures), m))
        for row, legs in enumerate(departures):
            best, flyby = np.full(m, math.inf), np.full(m, -1, dtype=np.int64)
            plain_join(
                legs.fields, legs.cost, legs.count, ends_out.fields, ends_out.cost, ends_out.leg,
                ends_out.count, bounds.y_min, bounds.burn_max, best, flyby,
            )  # fmt: skip
            answers["plain"][row] = best

    rivals = {
        "plain": plain,
        "dense": lambda: ours("dense", math.inf),
        "pruned": lambda: ours("pruned", 1e-9),
    }
    seconds = best_seconds(rivals, rounds)
    triples = sum(int((legs.count * ends_out.count).sum()) for legs in departures)
    print(f"{triples:,} triples of legs that the limits allow, one thread, best of {rounds} alternating runs")
    for name, spent in seconds.items():
        print(f"  {name:7s} {spent / triples * 1e9:8.2f} ns a triple")
    print(f"  dense against plain: {seconds['plain'] / seconds['dense']:.1f}×")
    print(f"  pruned against dense: {seconds['dense'] / seconds['pruned']:.1f}× the speed, "
          f"{tallies['dense'][1] / tallies['pruned'][1]:.0f} times fewer burns computed")  # fmt: skip
    print(f"  pruned equals dense to the last bit: {np.array_equal(answers['dense'], answers['pruned'])}")
    alive = np.isfinite(answers["plain"]) & np.isfinite(answers["dense"])
    apart = np.abs(answers["plain"][alive] - answers["dense"][alive]).max()
    both = np.array_equal(np.isfinite(answers["plain"]), np.isfinite(answers["dense"]))
    print(f"  plain and dense reach the same cells: {both}; costs apart by {apart:.0e} km/s at the most")


def _prepared(dates: int):
    text = SCENARIO.read_text()
    with tempfile.TemporaryDirectory() as name:
        path = Path(name) / "scenario.toml"
        path.write_text(text)
        plan = make_plan(load_scenario(path))
    table = plan.tables[0]
    first = leg_table(plan, 1, table, plan.tables[1])
    y_min = plan.search.y_min[0]
    rows = np.linspace(0, len(table.jd) - 1, min(dates, len(table.jd))).astype(int)
    legs = [_first_legs(first, plan.tables[1], y_min, int(i)) for i in rows]
    return plan, legs, plan.search.out[0]


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))

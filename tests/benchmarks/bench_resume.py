"""What does it cost to go on with a sweep of which ten thousand tiles are done, against one of which one is?

    python tests/benchmarks/bench_resume.py [tiles] [rounds]

A process starts, finds out which tiles are sound, computes the first that is missing, and stops. The baseline
is the same process on the same sweep when it had only begun. Tiles are of 64 cells, with the measures that
four limits need, so that there are ten thousand without an hour's sweep.
"""

from __future__ import annotations

import sys
import tempfile
from pathlib import Path

from bench_sweep import scenario_text
from child import run, verdict

MOST_SECONDS = 2.0  # over the baseline
SIDE = 8  # cells of a tile
SPARE = 200  # tiles that are left to be done

STOP_AFTER = """
import sys
from porkgrid.survey import plan
plan.TILE_CELLS, plan.TILE_COLUMNS = {cells}, {columns}
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.sweep import sweep
left = int(sys.argv[3])
def stop(progress):
    global left
    left -= 1
    if not left:
        raise KeyboardInterrupt
try:
    sweep(load_scenario(sys.argv[1]), sys.argv[2], report=stop)
except KeyboardInterrupt:
    pass
"""


def main(tiles: int = 10_000, rounds: int = 3) -> None:
    """Sweep so many tiles, then time both in turns and print."""
    side = int((tiles + SPARE) ** 0.5) + 1
    program = [sys.executable, "-c", STOP_AFTER.format(cells=SIDE**2, columns=SIDE)]
    with tempfile.TemporaryDirectory() as name:
        folder, begun_folder = Path(name) / "survey", Path(name) / "begun"
        scenario = Path(name) / "scenario.toml"
        scenario.write_text('measures = ["c3_km2_s2"]\n' + scenario_text(side * SIDE))
        run([*program, str(scenario), str(begun_folder), "1"])
        run([*program, str(scenario), str(folder), str(tiles)])
        done = (folder / "tiles.jsonl").read_bytes().count(b'"tile"')
        files = sum(1 for _ in (folder / "grid.zarr").glob("*/c/*/*"))
        resumed, begun = [], []
        for _ in range(rounds):
            resumed.append(run([*program, str(scenario), str(folder), "1"]))
            begun.append(run([*program, str(scenario), str(begun_folder), "1"]))
    resume, begin = (min(each.seconds for each in runs) for runs in (resumed, begun))
    cpu = min(each.cpu_seconds for each in resumed) - min(each.cpu_seconds for each in begun)
    print(f"{done} finished tiles in {files} chunks; best of {rounds}")
    print(f"  with all of them  {resume:6.2f} s to the first new tile")
    print(f"  with one          {begin:6.2f} s")
    print(f"  ratio {resume / begin:.2f}×, {cpu:+.2f} s of processor time")
    print(
        f"  resuming costs {resume - begin:.2f} s, under {MOST_SECONDS:.0f} s: "
        f"{verdict(resume - begin < MOST_SECONDS)}"
    )


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))

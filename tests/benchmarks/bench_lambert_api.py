"""How fast is `porkgrid.physics.lambert.lambert` on arrays of mixed problems, against the published method?

    python tests/benchmarks/bench_lambert_api.py [problems] [rounds]

Radius ratio 0.2 to 5, transfer angles all round the circle, ellipses and hyperbolas; then 1 and 2 turns, each
branch, on a tenth as many.  One thread each; ours pays for checking and allocating, the baseline fills arrays
it is given.
"""

from __future__ import annotations

import sys
from dataclasses import dataclass

import householder_baseline
import numpy as np
from interleaved import best_seconds

from porkgrid.physics.constants import AU_KM, GM_SUN_KM3_S2
from porkgrid.physics.lambert import ECLIPTIC_POLE_ICRF, lambert

POLE = np.array(ECLIPTIC_POLE_ICRF)


@dataclass(frozen=True, eq=False)
class Batch:
    """Problems of one kind: r1, r2 (n, 3) km, tof (n,) s."""

    r1: np.ndarray
    r2: np.ndarray
    tof: np.ndarray
    revs: int
    branch: str


def draw(rng: np.random.Generator, n: int, revs: int, branch: str) -> Batch:
    """Draw flights of 0.1 to 10 parabolic times, or with revolutions up to twice what surely holds them."""
    theta, incline = rng.uniform(0, 2 * np.pi, n), rng.uniform(0, 0.2, n)
    start, ratio = rng.uniform(0, 2 * np.pi, n), 10 ** rng.uniform(-0.7, 0.7, n)

    def place(angle, radius):
        plane = np.stack([np.cos(angle), np.sin(angle) * np.cos(incline), np.sin(angle) * np.sin(incline)], 1)
        return radius[:, None] * AU_KM * plane

    r1, r2 = place(start, np.ones(n)), place(start + theta, ratio)
    s = (AU_KM * (1 + ratio) + np.linalg.norm(r2 - r1, axis=1)) / 2
    scale = np.sqrt(2 * s**3 / GM_SUN_KM3_S2)
    sense = np.where(np.cross(r1, r2) @ POLE < 0, -1, 1)
    parabolic = scale / 3 * (1 - sense * ((s - np.linalg.norm(r2 - r1, axis=1)) / s) ** 1.5)
    # Least energy, N revolutions more: sqrt(s³/2gm) (N + 1) π is longer than the least time for N.
    several = scale / 2 * (revs + 1) * np.pi * rng.uniform(1, 2, n)
    tof = parabolic * 10 ** rng.uniform(-1, 1, n) if revs == 0 else several
    return Batch(r1, r2, tof, revs, branch)


def compare(batch: Batch, rounds: int) -> None:
    """Time both on one batch and print a line."""
    n = len(batch.tof)
    v1, v2 = np.empty((n, 3)), np.empty((n, 3))
    answers = {}

    def ours():
        answers["v1"], _ = lambert(
            batch.r1, batch.r2, batch.tof, GM_SUN_KM3_S2, revs=batch.revs, branch=batch.branch
        )

    def theirs():
        householder_baseline.solve_list(
            batch.r1, batch.r2, batch.tof, GM_SUN_KM3_S2, batch.revs, batch.branch == "left", POLE, v1, v2
        )

    seconds = best_seconds({"ours": ours, "theirs": theirs}, rounds)
    apart = np.linalg.norm(answers["v1"] - v1, axis=1) / np.linalg.norm(v1, axis=1)
    kind = "no revolutions" if batch.revs == 0 else f"N = {batch.revs}, {batch.branch}"
    hyperbolic = np.mean((v1**2).sum(1) > 2 * GM_SUN_KM3_S2 / np.linalg.norm(batch.r1, axis=1))
    missed = (np.isnan(answers["v1"][:, 0]).sum(), np.isnan(v1[:, 0]).sum())
    print(f"  {kind}: {n} problems, {hyperbolic:.0%} hyperbolic, not solved {missed[0]}, {missed[1]}")
    print(
        f"      lambert() {seconds['ours'] / n * 1e9:.1f} ns, "
        f"Householder {seconds['theirs'] / n * 1e9:.1f} ns, "
        f"ratio {seconds['theirs'] / seconds['ours']:.2f}×; "
        f"answers apart: median {np.nanmedian(apart):.0e}, most {np.nanmax(apart):.0e}"
    )


def main(problems: int = 1_000_000, rounds: int = 5) -> None:
    """Time every kind."""
    rng = np.random.default_rng(7)
    print(f"best of {rounds} alternating runs, one thread; v1 and v2 out")
    compare(draw(rng, problems, 0, "left"), rounds)
    for revs in (1, 2):
        for branch in ("left", "right"):
            compare(draw(rng, problems // 10, revs, branch), rounds)


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))

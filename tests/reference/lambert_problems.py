"""Draw random Lambert problems over the whole domain, the awkward corners on purpose."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, fields

import flight_time_judge as judge
import numpy as np
from mpmath_lambert import ECLIPTIC_POLE_ICRF

from porkgrid.physics.constants import AU_KM, GM_SUN_KM3_S2

MAX_REVS = 5
POLE = np.array(ECLIPTIC_POLE_ICRF)


@dataclass(frozen=True, eq=False)
class Problems:
    """n problems about the Sun: r1, r2 (n, 3) km, tof (n,) s, revs (n,), left (n,) branch, theta (n,) rad,
    least_tof (n,) s the least flight time there is for N revolutions (0 for N = 0)."""

    r1: np.ndarray
    r2: np.ndarray
    tof: np.ndarray
    revs: np.ndarray
    left: np.ndarray
    theta: np.ndarray
    least_tof: np.ndarray
    gm: float = GM_SUN_KM3_S2

    def __getitem__(self, chosen: np.ndarray) -> Problems:
        parts = {f.name: getattr(self, f.name)[chosen] for f in fields(self) if f.name != "gm"}
        return Problems(**parts, gm=self.gm)

    def __len__(self) -> int:
        return len(self.tof)

    def text(self, i: int) -> str:
        """Write problem i so that it can be pasted into a session, digit for digit."""
        branch = "left" if self.left[i] else "right"
        return (
            f"r1={self.r1[i].tolist()}, r2={self.r2[i].tolist()}, tof={self.tof[i].item()!r}, "
            f"gm={self.gm!r}, revs={self.revs[i]}, branch={branch!r}  (theta={self.theta[i].item()!r})"
        )


def random_problems(rng: np.random.Generator, n: int, corner_share: float = 1 / 3) -> Problems:
    """Draw n problems: radius ratio 1e-3..1e3, flight 1e-3..1e3 parabolic times, N = 0 (half of them) to 5.

    A quarter of the radii are equal to 1e-8..0.1, as on resonant legs from a planet to itself.
    ``corner_share`` of the angles lie 1e-6 to 0.1 rad from 0, 180° or 360°; half of the flights with N >= 1
    lie within 1e-8 to 100 of the least time there is, some of them under it.  |pole · normal| >= 0.01, so
    that the sense of motion is not a matter of rounding.
    """
    theta = _angles(rng, n, corner_share)
    r1, r2 = _vectors(rng, theta)
    revs = np.where(rng.random(n) < 0.5, 0, rng.integers(1, MAX_REVS + 1, n))
    shape = judge.shape(r1, r2, POLE)
    scale = np.asarray(judge.time_scale(shape, GM_SUN_KM3_S2), float)
    parabolic = np.asarray(judge.time_of_flight(np.ones(n, judge.LONG), shape, np.zeros(n)), float)
    tof = scale * parabolic * 10 ** rng.uniform(-3, 3, n)
    least_tof = np.zeros(n)
    turns = revs > 0
    least_tof[turns] = scale[turns] * judge.least_time(shape[turns], revs[turns])[0]
    offset = 10 ** rng.uniform(-8, 2, n) * np.where(rng.random(n) < 0.8, 1, -1)
    near_least = turns & (rng.random(n) < 0.5)
    tof = np.where(near_least, least_tof * np.maximum(1 + offset, 0.5), tof)
    return Problems(r1, r2, tof, revs, rng.random(n) < 0.5, theta, least_tof)


def solve_all(lambert: Callable, problems: Problems) -> tuple[np.ndarray, np.ndarray]:
    """Call an API-style solver once per (N, branch) present; v1, v2 (n, 3)."""
    v1 = np.full(problems.r1.shape, np.inf)
    v2 = v1.copy()
    for revs, branch, chosen in by_kind(problems):
        part = problems[chosen]
        v1[chosen], v2[chosen] = lambert(part.r1, part.r2, part.tof, part.gm, revs=revs, branch=branch)
    return v1, v2


def by_kind(problems: Problems) -> Iterator[tuple[int, str, np.ndarray]]:
    """Yield (revs, branch, mask) for every kind present."""
    for revs in range(MAX_REVS + 1):
        for branch in ("left", "right"):
            chosen = (problems.revs == revs) & (problems.left == (branch == "left"))
            if chosen.any():
                yield revs, branch, chosen


def _angles(rng: np.random.Generator, n: int, corner_share: float) -> np.ndarray:
    corner = rng.choice([0.0, np.pi, 2 * np.pi], n)
    side = np.where(corner == 0, 1, np.where(corner > 4, -1, rng.choice([-1, 1], n)))
    near = corner + side * 10 ** rng.uniform(-6, -1, n)
    return np.where(rng.random(n) < corner_share, near, rng.uniform(1e-6, 2 * np.pi - 1e-6, n))


def _vectors(rng: np.random.Generator, theta: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    n = len(theta)
    normal = _unit(rng.normal(size=(n, 3)))
    height = normal @ POLE
    normal[height < 0] *= -1
    normal[np.abs(height) < 0.01] = POLE
    first = _unit(np.cross(normal, rng.normal(size=(n, 3))))
    second = np.cross(normal, first)
    alike = 1 + rng.choice([-1, 1], (n, 1)) * 10 ** rng.uniform(-8, -1, (n, 1))
    ratio = np.where(rng.random((n, 1)) < 0.25, alike, 10 ** rng.uniform(-3, 3, (n, 1)))
    direction = np.cos(theta)[:, None] * first + np.sin(theta)[:, None] * second
    return AU_KM * first / np.sqrt(ratio), AU_KM * direction * np.sqrt(ratio)


def _unit(x: np.ndarray) -> np.ndarray:
    return x / np.linalg.norm(x, axis=-1, keepdims=True)

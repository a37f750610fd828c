"""Time rivals fairly on a busy machine: alternate them and keep each one's best run."""

from __future__ import annotations

import time
from collections.abc import Callable, Mapping


def best_seconds(rivals: Mapping[str, Callable[[], object]], rounds: int) -> dict[str, float]:
    """Run every rival once to compile, then in turns; return the least wall-clock seconds of each."""
    for run in rivals.values():
        run()
    best = dict.fromkeys(rivals, float("inf"))
    for _ in range(rounds):
        for name, run in rivals.items():
            start = time.perf_counter()
            run()
            best[name] = min(best[name], time.perf_counter() - start)
    return best

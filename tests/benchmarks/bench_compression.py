"""Which compressor should write the chunks? Time and size of those at hand, against the plain bytes.

    python tests/benchmarks/bench_compression.py [rounds]

Chunks of a real tile of the fifteen-year scenario, every measure. Ratios: bytes written over bytes plain, and
seconds over those of copying and checking the plain bytes.
"""

from __future__ import annotations

import sys
from pathlib import Path

import google_crc32c
import numpy as np
from interleaved import best_seconds
from numcodecs import Blosc

from porkgrid.survey.admit import load_scenario
from porkgrid.survey.chunks import encode
from porkgrid.survey.plan import make_plan
from porkgrid.survey.tiles import compute_tile

SCENARIO = Path(__file__).parents[2] / "scenarios" / "earth-mars-2030-2044.toml"
CHOICES = [
    (name, level, shuffle)
    for name, level in (("lz4", 1), ("lz4", 5), ("lz4", 9), ("zstd", 1), ("zstd", 3), ("blosclz", 5))
    for shuffle in (Blosc.SHUFFLE, Blosc.BITSHUFFLE)
]
SHUFFLES = {Blosc.SHUFFLE: "bytes", Blosc.BITSHUFFLE: "bits"}


def plain(chunks: list[np.ndarray]) -> int:
    """The bytes with a checksum and no compression."""
    for chunk in chunks:
        google_crc32c.value(chunk.tobytes())
    return sum(chunk.nbytes for chunk in chunks)


def main(rounds: int = 5) -> None:
    """Time all in turns and print."""
    plan = make_plan(load_scenario(SCENARIO))
    values, _ = compute_tile(plan, plan.tiles[len(plan.tiles) // 2])
    chunks = [np.ascontiguousarray(each) for each in values.values()]
    sizes: dict[str, int] = {}
    rivals = {"plain": lambda: sizes.update(plain=plain(chunks))}
    for name, level, shuffle in CHOICES:
        coder, label = Blosc(name, level, shuffle), f"{name} {level} {SHUFFLES[shuffle]}"
        rivals[label] = lambda coder=coder, label=label: sizes.update(
            {label: sum(len(coder.encode(chunk)) for chunk in chunks)}
        )
    rivals["as stored"] = lambda: sizes.update({"as stored": sum(len(encode(chunk)) for chunk in chunks)})
    seconds = best_seconds(rivals, rounds)
    print(f"{len(chunks)} chunks of {chunks[0].size} cells, {sizes['plain'] / 1e6:.1f} MB; best of {rounds}")
    for label in rivals:
        print(
            f"  {label:<16} {1e3 * seconds[label]:7.1f} ms, {seconds[label] / seconds['plain']:5.1f}× plain, "
            f"{sizes[label] / sizes['plain']:.3f} of the size"
        )


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))

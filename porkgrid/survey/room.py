"""Whether the disk has room for a survey, before it is begun."""

from __future__ import annotations

import shutil
from pathlib import Path

import numpy as np

from porkgrid.errors import RequestError
from porkgrid.survey.chunks import encode
from porkgrid.survey.plan import Plan
from porkgrid.survey.store import stored_type, tiled
from porkgrid.survey.tiles import compute_tile

_SPARE = 1.1  # for what is predicted too low, and the figures


def refuse_full_disk(folder: Path, plan: Plan) -> None:
    """RequestError where the survey would not fit on the folder's disk, with what would.

    A tile from the middle says how well the chunks are compressed. It is computed only where the disk has no
    room for them as they are.
    """
    free = shutil.disk_usage(_existing(folder)).free
    n, m = plan.shape
    plain = n * m * sum(np.dtype(_type(plan, name)).itemsize for name in tiled(plan))
    if plain < free:
        return
    needed = plain * _SPARE if plan.flybys else _compressed_bytes(plan) * _SPARE
    if needed < free:
        return
    factor = (needed / max(free, 1.0)) ** 0.5
    steps = " and ".join(
        f"{1.05 * factor * each.step_days:.2g}" for each in plan.scenario.encounters[:: len(plan.tables) - 1]
    )
    raise RequestError(
        f"{folder}: the survey takes about {_size(needed)}, and {_size(free)} are free there; "
        f"steps of {steps} days, fewer measures in the scenario, or a folder elsewhere (--out) would fit"
    )


def _size(count: float) -> str:
    return f"{count / 1e9:.1f} GB" if count >= 1e9 else f"{count / 1e6:.2f} MB"


def _compressed_bytes(plan: Plan) -> float:
    tile = plan.tiles[len(plan.tiles) // 2]
    values, _ = compute_tile(plan, tile)
    return sum(len(encode(values[name])) for name in tiled(plan)) * plan.shape[0] * plan.shape[1] / tile.cells


def _type(plan: Plan, name: str) -> type:
    return stored_type(plan.measures[name]) if name in plan.measures else np.uint32


def _existing(folder: Path) -> Path:
    """The folder, or the nearest above it that is there."""
    place = folder.absolute()
    while not place.exists():
        place = place.parent
    return place

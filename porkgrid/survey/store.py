"""The grid on disk: a zarr store of measures that xarray opens, written tile by tile.

Each tile is one chunk of every array. A chunk is written under a temporary name and renamed (zarr's local
store does so) and carries a checksum that is verified whenever it is read.
"""

from __future__ import annotations

import warnings
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr
import zarr

from porkgrid.sky.epochs import datetime64_from_jd
from porkgrid.survey.chunks import codecs, encode, write_chunk
from porkgrid.survey.limits import flag_names, flag_titles
from porkgrid.survey.measures import BOTH, Measure
from porkgrid.survey.plan import Plan, Tile

CAUTION = (
    "Early-phase estimates from patched conics; not for flight operations. Launch safety, planetary "
    "protection and navigation are for the licensed and responsible people and local rules."
)
STORE = "grid.zarr"
BLOCKED_BY = "blocked_by"
NEVER_SWEPT = 0xFFFFFFFF  # `blocked_by` of cells that no tile has been written for


def create_store(folder: Path, plan: Plan, version: str) -> None:
    """Make the empty store of a plan: coordinates and measures of one date whole, the rest without chunks."""
    path = folder / STORE
    # chunks of dates that are all 0 are written too: what is missing is a fault (survey.reading)
    with warnings.catch_warnings(), zarr.config.set({"array.write_empty_chunks": True}):
        # consolidated metadata are outside the zarr 3 specification, which xarray reads and this warns of
        warnings.simplefilter("ignore", zarr.errors.ZarrUserWarning)
        _by_date(plan, version).to_zarr(path, mode="w", zarr_format=3, consolidated=False)
        group = zarr.open_group(path, mode="r+")
        for name in plan.stored:
            measure = plan.measures[name]
            if measure.dims == BOTH:
                _new_array(group, name, plan, stored_type(measure), _fill_value(name), _attributes(measure))
        _new_array(group, BLOCKED_BY, plan, np.uint32, NEVER_SWEPT, _flags(plan))
        zarr.consolidate_metadata(path)


def tiled(plan: Plan) -> list[str]:
    """Names of the arrays that tiles are written to."""
    return [*(name for name in plan.stored if plan.measures[name].dims == BOTH), BLOCKED_BY]


def stored_type(measure: Measure) -> type:
    """Four bytes for numbers that are estimates to four digits, eight for epochs."""
    return np.float64 if measure.name.endswith("_epoch_jd_tdb") else np.float32


def write_tile(folder: Path, plan: Plan, tile: Tile, values: Mapping[str, np.ndarray]) -> list[int]:
    """Write one tile of every array, (rows, columns) blocks; the bytes of each in the order of `tiled`."""
    place = chunk_of(plan, tile)
    sizes = []
    for name in tiled(plan):
        content = encode(_filled(values[name], plan.chunks, _fill_value(name)))
        write_chunk(f"{folder}/{STORE}/{name}", place, content)
        sizes.append(len(content))
    return sizes


def chunk_of(plan: Plan, tile: Tile) -> tuple[int, int]:
    """Which chunk of every array a tile is."""
    return tile.rows.start // plan.chunks[0], tile.columns.start // plan.chunks[1]


def _filled(values: np.ndarray, shape: tuple[int, int], fill: float) -> np.ndarray:
    """The block in a whole chunk: at the grid's edges the rest of it is the fill value."""
    if values.shape == shape:
        return values
    chunk = np.full(shape, fill, dtype=values.dtype)
    chunk[: values.shape[0], : values.shape[1]] = values
    return chunk


def _fill_value(name: str) -> float:
    return NEVER_SWEPT if name == BLOCKED_BY else np.nan


def _by_date(plan: Plan, version: str) -> xr.Dataset:
    departure, arrival = plan.tables[0].jd, plan.tables[-1].jd
    calendar = {"long_name": "calendar date, TDB"}
    coordinates = {
        "departure": ("departure", datetime64_from_jd(departure), calendar),
        "arrival": ("arrival", datetime64_from_jd(arrival), calendar),
    }
    data = {}
    for name in plan.stored:
        measure = plan.measures[name]
        if measure.dims != BOTH:
            data[name] = (measure.dims, _one_date(plan, measure), _attributes(measure))
    attributes = {
        "title": plan.scenario.name,
        "route": plan.route,
        "rank_by": plan.rank_by,
        "rank_order": "least" if plan.rank_sign > 0 else "most",
        "kernel": plan.ephemeris.label,
        "porkgrid": version,
        "caution": CAUTION,
    }
    return xr.Dataset(data, coordinates, attributes)


def _one_date(plan: Plan, measure: Measure) -> np.ndarray:
    """A measure that depends on one date only needs the tables, not the legs."""
    cells = plan.cells(plan.tables[0], plan.tables[-1], plan.earth_at_arrival, [])
    return np.ravel(measure.compute(cells)).astype(np.float64)


def _attributes(measure: Measure) -> dict[str, str]:
    return {
        "units": measure.unit,
        "long_name": measure.meaning,
        "symbol": measure.symbol,
        "better": measure.better,
    }


def _flags(plan: Plan) -> dict[str, Any]:
    names = flag_names(plan.bounds)
    return {
        "long_name": "what forbids the cell; 0 where it is allowed",
        "flag_masks": [1 << bit for bit in range(len(names))],
        "flag_meanings": " ".join(names),
        "flag_titles": flag_titles(plan.bounds),
    }


def _new_array(
    group: zarr.Group, name: str, plan: Plan, dtype: type, fill: float, attributes: dict[str, Any]
) -> None:
    group.create_array(
        name,
        shape=plan.shape,
        chunks=plan.chunks,
        dtype=dtype,
        fill_value=fill,
        compressors=codecs(np.dtype(dtype)),
        dimension_names=BOTH,
        attributes=attributes,
    )

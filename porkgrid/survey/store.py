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
from zarr.codecs import BloscCodec, Crc32cCodec

from porkgrid.sky.epochs import datetime64_from_jd
from porkgrid.survey.limits import flag_names, flag_titles
from porkgrid.survey.measures import BOTH, Measure
from porkgrid.survey.plan import Plan, Tile

CAUTION = (
    "Early-phase estimates from patched conics; not for flight operations. Launch safety, planetary "
    "protection and navigation are for the licensed and responsible people and local rules."
)
STORE = "grid.zarr"
BLOCKED_BY = "blocked_by"


def create_store(folder: Path, plan: Plan, version: str) -> None:
    """Make the empty store of a plan: coordinates and measures of one date whole, the rest without chunks."""
    path = folder / STORE
    with warnings.catch_warnings():
        # consolidated metadata are outside the zarr 3 specification, which xarray reads and this warns of
        warnings.simplefilter("ignore", zarr.errors.ZarrUserWarning)
        _by_date(plan, version).to_zarr(path, mode="w", zarr_format=3, consolidated=False)
        group = zarr.open_group(path, mode="r+")
        for name in plan.stored:
            measure = plan.measures[name]
            if measure.dims == BOTH:
                _new_array(group, name, plan, stored_type(measure), np.nan, _attributes(measure))
        _new_array(group, BLOCKED_BY, plan, np.uint32, 0xFFFFFFFF, _flags(plan))
        zarr.consolidate_metadata(path)


def open_arrays(folder: Path) -> dict[str, zarr.Array]:
    """The arrays of a store that tiles are written to, by name."""
    group = zarr.open_group(folder / STORE, mode="r+")
    return {name: array for name, array in group.arrays() if array.ndim == 2}


def stored_type(measure: Measure) -> type:
    """Four bytes for numbers that are estimates to four digits, eight for epochs."""
    return np.float64 if measure.name.endswith("_epoch_jd_tdb") else np.float32


def write_tile(arrays: Mapping[str, zarr.Array], tile: Tile, values: Mapping[str, np.ndarray]) -> None:
    """Write one tile of every array. `values` hold (rows, columns) blocks."""
    for name, array in arrays.items():
        array[tile.rows, tile.columns] = values[name]


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
        compressors=[BloscCodec(cname="lz4", clevel=3, shuffle="bitshuffle"), Crc32cCodec()],
        dimension_names=BOTH,
        attributes=attributes,
    )

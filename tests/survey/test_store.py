"""The grid on disk, read back by xarray and zarr alone."""

import warnings
from dataclasses import replace

import numpy as np
import pytest
import xarray as xr
import zarr

from porkgrid.survey.measures import BOTH
from porkgrid.survey.plan import Tile
from porkgrid.survey.store import BLOCKED_BY, STORE, chunk_of, create_store, tiled, write_tile
from porkgrid.survey.tiles import compute_tile


@pytest.fixture(scope="module")
def grid(survey):
    return xr.open_zarr(survey.path / STORE, chunks=None).load()


def test_xarray_opens_the_store_without_a_warning(survey):
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        xr.open_zarr(survey.path / STORE).close()


def test_dates_are_calendar_dates_of_the_windows(grid):
    assert grid["departure"].values[[0, 1, -1]].astype("M8[D]").astype(str).tolist() == [
        "2028-09-01", "2028-09-06", "2029-03-30",
    ]  # fmt: skip
    assert grid["arrival"].values[[0, 1]].astype("M8[D]").astype(str).tolist() == ["2029-02-15", "2029-02-22"]


def test_every_measure_is_a_variable_with_unit_and_meaning(grid, rook):
    assert set(grid.data_vars) == {*rook.stored, "blocked_by"}
    for name in rook.stored:
        variable, measure = grid[name], rook.measures[name]
        assert variable.dims == measure.dims
        assert variable.attrs["units"] == measure.unit
        assert variable.attrs["long_name"] == measure.meaning
        assert variable.attrs["symbol"] == measure.symbol
        assert variable.dtype == (np.float32 if measure.dims == BOTH else np.float64)


def test_values_are_those_of_the_cells(grid, rook, rook_cells):
    for name in rook.stored:
        whole = np.ravel(rook.measures[name].compute(rook_cells))
        np.testing.assert_allclose(grid[name].values.ravel(), whole, rtol=2e-7, err_msg=name)


def test_flags_follow_the_conventions_for_flag_variables(grid):
    """CF conventions 3.5: flag_masks and blank-separated flag_meanings of one length."""
    flags = grid["blocked_by"]
    assert flags.dtype == np.uint32
    meanings = flags.attrs["flag_meanings"].split()
    assert flags.attrs["flag_masks"] == [1 << bit for bit in range(len(meanings))]
    assert len(flags.attrs["flag_titles"]) == len(meanings)
    assert meanings[3:] == ["c3_km2_s2", "dla_deg", "v_inf_arrival_km_s", "arrival_sep_deg"]
    assert "C3 at most 25 km²/s²" in flags.attrs["flag_titles"]


def test_the_grid_says_what_it_is(grid):
    assert grid.attrs["title"] == "Rook to Mars"
    assert grid.attrs["route"] == "Earth → Mars"
    assert (grid.attrs["rank_by"], grid.attrs["rank_order"]) == ("dv_total_km_s", "least")
    assert grid.attrs["kernel"] == "DE440"
    assert "not for flight operations" in grid.attrs["caution"]


def test_every_tile_is_one_chunk(survey):
    array = zarr.open_group(survey.path / STORE, mode="r")["c3_km2_s2"]
    assert array.chunks == (8, 32)
    chunks = [path for path in (survey.path / STORE / "c3_km2_s2" / "c").rglob("*") if path.is_file()]
    assert len(chunks) == 12


@pytest.fixture(scope="module")
def tiled_rook(rook):
    """ROOK in tiles of 8 × 32 cells."""
    return replace(rook, tile_cells=256, tile_columns=32)


def test_tiles_that_are_not_written_are_no_numbers_and_not_allowed(tiled_rook, tmp_path):
    rook = tiled_rook
    create_store(tmp_path, rook, "0")
    tile = Tile(5, slice(16, 24), slice(32, 59))
    values, _ = compute_tile(rook, tile)
    assert tile in rook.tiles
    write_tile(tmp_path, rook, tile, values)
    grid = xr.open_zarr(tmp_path / STORE, chunks=None)
    there = np.zeros(rook.shape, bool)
    there[tile.rows, tile.columns] = True
    assert np.array_equal(np.isfinite(grid["c3_km2_s2"].values), there)
    assert np.all(grid["blocked_by"].values[~there] == 0xFFFFFFFF)
    assert np.array_equal(grid["blocked_by"].values[there], values["blocked_by"].ravel())


def test_a_tile_is_the_chunk_of_its_rows_and_columns_and_tells_its_bytes(tiled_rook, tmp_path):
    rook = tiled_rook
    create_store(tmp_path, rook, "0")
    assert [chunk_of(rook, tile) for tile in rook.tiles] == [(i, j) for i in range(6) for j in range(2)]
    tile = rook.tiles[-1]
    sizes = write_tile(tmp_path, rook, tile, compute_tile(rook, tile)[0])
    paths = [tmp_path / STORE / name / "c" / "5" / "1" for name in tiled(rook)]
    assert sizes == [path.stat().st_size for path in paths]
    assert tiled(rook)[-1] == BLOCKED_BY
    assert set(tiled(rook)) == {name for name in rook.stored if rook.measures[name].dims == BOTH} | {
        BLOCKED_BY
    }


def test_a_byte_that_has_changed_on_disk_is_noticed(rook, tmp_path):
    create_store(tmp_path, rook, "0")
    tile = rook.tiles[0]
    write_tile(tmp_path, rook, tile, compute_tile(rook, tile)[0])
    chunk = tmp_path / STORE / "c3_km2_s2" / "c" / "0" / "0"
    data = bytearray(chunk.read_bytes())
    data[len(data) // 2] ^= 1
    chunk.write_bytes(data)
    grid = xr.open_zarr(tmp_path / STORE, chunks=None)
    with pytest.raises(ValueError, match="checksum"):
        grid["c3_km2_s2"].load()


def test_a_store_is_made_anew_over_an_old_one(rook, loops, tmp_path):
    create_store(tmp_path, rook, "0")
    create_store(tmp_path, loops, "0")
    grid = xr.open_zarr(tmp_path / STORE, chunks=None)
    assert grid.attrs["title"] == "Loon to Mars the long way"
    assert "dv_total_km_s" not in grid

"""A tile's values and sums, against counting."""

from dataclasses import replace

import numpy as np
import pytest

from porkgrid.survey.limits import Bound, flag_names
from porkgrid.survey.measures import BOTH
from porkgrid.survey.plan import Tile
from porkgrid.survey.tiles import compute_tile

TILE = Tile(5, slice(21, 43), slice(0, 40))


@pytest.fixture(scope="module")
def computed(rook):
    return compute_tile(rook, TILE)


def test_a_tile_has_every_stored_measure_of_two_dates_in_single_precision(rook, computed):
    values, _ = computed
    both = {name for name in rook.stored if rook.measures[name].dims == BOTH}
    assert values.keys() == both | {"blocked_by"}
    assert {array.shape for array in values.values()} == {(22, 40)}
    assert {array.dtype for name, array in values.items() if name != "blocked_by"} == {np.dtype(np.float32)}
    assert values["blocked_by"].dtype == np.uint32


def test_values_are_those_of_the_cells_at_the_tiles_place(rook, rook_cells, computed):
    values, _ = computed
    for name in ("c3_km2_s2", "tof_days", "sun_max_au", "leg1_revs"):
        whole = np.broadcast_to(rook.measures[name].compute(rook_cells), rook.shape)
        np.testing.assert_allclose(values[name], whole[TILE.rows, TILE.columns], rtol=1e-6)


def test_sums_count_the_cells_of_each_flag(rook, computed):
    values, sums = computed
    blocked = values["blocked_by"]
    assert (sums.tile, sums.cells) == (5, 880)
    assert sums.allowed == np.count_nonzero(blocked == 0) > 0
    names = flag_names(rook.bounds)
    assert list(sums.forbidden) == list(sums.alone) == names
    for bit, name in enumerate(names):
        cells = [cell for cell in blocked.ravel() if int(cell) >> bit & 1]
        assert sums.forbidden[name] == len(cells)
        assert sums.alone[name] == sum(int(cell) == 1 << bit for cell in cells)
    assert sums.forbidden["arrival_before_departure"] > 0
    assert 0 < sums.alone["c3_km2_s2"] < sums.forbidden["c3_km2_s2"]


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_the_best_is_the_best_allowed_value_at_full_precision(rook, sign):
    plan = replace(rook, rank_sign=sign)
    values, sums = compute_tile(plan, TILE)
    allowed = values["dv_total_km_s"][values["blocked_by"] == 0]
    assert np.float32(sums.best) == sign * (sign * allowed).min()


def test_a_tile_with_no_cell_allowed_has_no_best(rook):
    closed = replace(rook, bounds=(Bound(rook.measures["c3_km2_s2"], None, 0.0),))
    _, sums = compute_tile(closed, TILE)
    assert sums.allowed == 0
    assert sums.best is None

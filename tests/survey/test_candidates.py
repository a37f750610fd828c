"""The table of candidates, against the grid it was picked from."""

import numpy as np
import pandas as pd
import pytest
import xarray as xr
from survey_scenarios import LOOPS, ROOK, changed, limited

from porkgrid.errors import RequestError
from porkgrid.sky.epochs import datetime64_from_jd
from porkgrid.survey.candidates import Picked, measures_at, rank_anew
from porkgrid.survey.legs import LegOption
from porkgrid.survey.measures import BOTH


@pytest.fixture(scope="module")
def table(survey):
    return survey.candidates


def cells_of(survey, table):
    """The grid at the dates of a table, one row each."""
    days = {side: xr.DataArray(pd.to_datetime(table[side]), dims="row") for side in ("departure", "arrival")}
    return survey.grid.sel(days)


def test_every_measure_of_the_route_is_a_column(table, rook):
    refined = [f"refined_{name}" for name in ("dv_total_km_s", "departure", "arrival", "note")]
    assert list(table.columns) == ["rank", "departure", "arrival", *rook.measures, *refined]
    assert table["rank"].tolist() == list(range(1, len(table) + 1))
    assert len(table) >= 2


def test_candidates_are_allowed_cells_with_the_grids_values(survey, table, rook):
    cells = cells_of(survey, table)
    assert np.all(cells["blocked_by"].values == 0)
    for name in rook.stored:
        np.testing.assert_allclose(table[name], cells[name].values, rtol=2e-7, err_msg=name)


def test_the_file_has_full_precision(table, rook, rook_cells):
    """Not that of the grid, which is single."""
    jd1, jd2 = rook.tables[0].jd, rook.tables[1].jd
    for _, row in table.iterrows():
        i = np.flatnonzero(jd1 == row["departure_epoch_jd_tdb"])[0]
        j = np.flatnonzero(jd2 == row["arrival_epoch_jd_tdb"])[0]
        assert row["c3_km2_s2"] == pytest.approx(rook_cells.c3[i, j], rel=1e-11)


def test_the_first_candidate_is_the_best_allowed_cell_of_the_grid(survey, table):
    allowed = survey.grid["blocked_by"].values == 0
    least = survey.grid["dv_total_km_s"].values[allowed].min()
    assert table["dv_total_km_s"][0] == pytest.approx(least, rel=2e-7)
    assert table["dv_total_km_s"].is_monotonic_increasing


def test_candidates_are_local_bests_and_windows_apart(survey, table):
    cost = np.where(survey.grid["blocked_by"].values == 0, survey.grid["dv_total_km_s"].values, np.inf)
    departure, arrival = (pd.DatetimeIndex(survey.grid[side].values) for side in ("departure", "arrival"))
    epochs = table[["departure_epoch_jd_tdb", "arrival_epoch_jd_tdb"]].to_numpy()
    for k, (day1, day2) in enumerate(zip(table["departure"], table["arrival"], strict=True)):
        i, j = departure.get_loc(day1), arrival.get_loc(day2)
        around = cost[max(i - 1, 0) : i + 2, max(j - 1, 0) : j + 2]
        assert cost[i, j] == around.min()
        assert np.all(np.max(np.abs(epochs[:k] - epochs[k]), axis=1) >= 5.0)


def test_dates_are_those_of_the_epochs(table):
    for side in ("departure", "arrival"):
        days = datetime64_from_jd(table[f"{side}_epoch_jd_tdb"].to_numpy()).astype("M8[D]").astype(str)
        assert table[side].tolist() == days.tolist()


def test_half_days_are_shown_with_their_hour(sweep_text):
    table = sweep_text(changed(ROOK, ("step_days = 5.0", "step_days = 4.5"))).candidates
    assert {len(day) for day in table["departure"]} <= {len("2028-11-30"), len("2028-11-30T12:00")}
    odd = table["departure_epoch_jd_tdb"] % 1.0 == 0.0
    assert odd.any()
    assert table["departure"][odd].str.endswith("T12:00").all()


def test_measures_between_the_grids_dates_lie_between_those_of_the_grid(rook, rook_cells):
    """A C3 half-way, against the mean of the cells around, which bends by a few per cent over these steps."""
    i, j = 15, 25
    jd1, jd2 = rook.tables[0].jd, rook.tables[1].jd
    between = Picked((0.5 * (jd1[i] + jd1[i + 1]), 0.5 * (jd2[j] + jd2[j + 1])), (LegOption(),))
    found = measures_at(rook, between)
    around = rook_cells.c3[i : i + 2, j : j + 2]
    assert found["c3_km2_s2"] == pytest.approx(around.mean(), rel=0.03)
    assert found["tof_days"] == 0.5 * (jd2[j] + jd2[j + 1] - jd1[i] - jd1[i + 1])
    on_grid = measures_at(rook, Picked((jd1[i], jd2[j]), (LegOption(),)))
    assert on_grid.keys() == rook.measures.keys()
    for name, measure in rook.measures.items():
        cell = np.broadcast_to(measure.compute(rook_cells), rook.shape)[i, j]
        assert on_grid[name] == pytest.approx(cell, rel=1e-11), name


def test_a_candidate_with_revolutions_is_tabulated_as_it_is_flown(sweep_text):
    """The cheapest flights of this grid that limits leave are of all three options."""
    survey = sweep_text(LOOPS + "\n[rank]\nkeep = 60\napart_days = 0\n")
    table = survey.candidates
    assert len({(row["leg1_revs"], row["leg1_branch"]) for _, row in table.iterrows()}) > 1
    cells = cells_of(survey, table)
    for name in ("leg1_revs", "leg1_branch", "c3_km2_s2", "v_inf_arrival_km_s", "sun_max_au"):
        np.testing.assert_allclose(table[name], cells[name].values, rtol=2e-7, err_msg=name)


# Ranking anew


def test_ranking_anew_by_nothing_new_gives_the_same_table(survey, table):
    again, by = rank_anew(survey, None, None, None, None)
    assert by == "dv_total_km_s"
    on_grid = table[[name for name in table if not name.startswith("refined_")]]
    pd.testing.assert_frame_equal(again, on_grid, check_dtype=False, rtol=1e-11)


@pytest.mark.parametrize(("order", "sign"), [(None, 1.0), ("least", 1.0), ("most", -1.0)])
@pytest.mark.parametrize("by", ["c3_km2_s2", "tof_days", "arrival_sun_distance_au"])
def test_ranking_by_another_measure_starts_with_its_best_allowed_value(survey, by, order, sign):
    found, named = rank_anew(survey, by, order, 3, None)
    assert named == by
    band = survey.grid[[by, "blocked_by"]]
    values = band[by].broadcast_like(band["blocked_by"]).transpose("departure", "arrival").values
    allowed = values[band["blocked_by"].values == 0]
    assert found[by][0] == pytest.approx(sign * (sign * allowed).min(), rel=2e-7)
    assert (np.diff(sign * found[by]) >= -1e-6).all()
    assert len(found) <= 3


def test_windows_may_be_counted_wider_or_narrower(survey, table):
    wide, _ = rank_anew(survey, None, None, 50, 1000.0)
    narrow, _ = rank_anew(survey, None, None, 50, 0.0)
    assert len(wide) == 1
    assert len(narrow) >= len(table)


@pytest.mark.parametrize("by", ["c3", "leg2_tof_days", "blocked_by"])
def test_a_measure_that_is_not_stored_is_refused_with_those_that_are(survey, by):
    with pytest.raises(RequestError, match=rf"does not store '{by}'; it has .*c3_km2_s2"):
        rank_anew(survey, by, None, None, None)


def test_a_survey_that_the_limits_close_has_an_empty_table(sweep_text):
    table = sweep_text(limited(ROOK, "c3_km2_s2 = { max = 1 }")).candidates
    assert table.empty
    assert list(table.columns)[:3] == ["rank", "departure", "arrival"]


def test_more_is_better_where_the_scenario_says_so(sweep_text, rook):
    survey = sweep_text(changed(ROOK, ("[rank]", '[rank]\nby = "tof_days"\norder = "most"')))
    allowed = survey.grid["blocked_by"].values == 0
    assert survey.candidates["tof_days"][0] == survey.grid["tof_days"].values[allowed].max()
    assert rook.measures["tof_days"].dims == BOTH

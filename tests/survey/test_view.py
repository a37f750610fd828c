"""What figures are drawn from, against the whole grid in memory."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from survey_scenarios import ROOK, changed

from porkgrid.survey import view
from porkgrid.survey.view import better_sign, day_bests, drawn_view, flag_shares, row_bands

NAMES = ["c3_km2_s2", "arrival_sep_deg", "departure_epoch_jd_tdb"]


@pytest.fixture(scope="module")
def whole(survey):
    return survey.grid.load()


def in_both(whole, name):
    return whole[name].broadcast_like(whole["blocked_by"]).transpose("departure", "arrival").values


@pytest.mark.parametrize("cells", [1, 59, 60, 200, 10**6])
@pytest.mark.parametrize("name", [*NAMES, "blocked_by"])
def test_bands_put_together_are_the_grid(survey, whole, monkeypatch, name, cells):
    monkeypatch.setattr(view, "BAND_CELLS", cells)
    bands = list(row_bands(survey, name))
    assert len(bands) == -(-43 // max(1, cells // 59))
    values = np.concatenate([values for values, _ in bands])
    assert np.array_equal(values, in_both(whole, name), equal_nan=True)
    assert np.array_equal(np.concatenate([blocked for _, blocked in bands]), whole["blocked_by"].values)


@settings(max_examples=25, deadline=None)
@given(st.integers(1, 70), st.integers(1, 600))
def test_a_thinned_view_is_every_kth_date_of_the_whole(survey, whole, side, cells):
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(view, "DRAWN_SIDE", side)
        patch.setattr(view, "BAND_CELLS", cells)
        drawn = drawn_view(survey, NAMES)
    steps = [-(-length // side) for length in (43, 59)]
    expected = whole[[*NAMES, "blocked_by"]].isel(
        departure=slice(None, None, steps[0]), arrival=slice(None, None, steps[1])
    )
    for name in expected.variables:
        assert drawn[name].dims == expected[name].dims
        np.testing.assert_array_equal(drawn[name].values, expected[name].values)
        assert drawn[name].attrs == expected[name].attrs
    assert max(drawn.sizes.values()) <= side
    assert ("thinned" in drawn.attrs) == (max(steps) > 1)


def test_a_thinned_view_says_so(survey, monkeypatch):
    monkeypatch.setattr(view, "DRAWN_SIDE", 30)
    assert (
        drawn_view(survey, NAMES).attrs["thinned"]
        == "drawn from every 2. departure and every 2. arrival date"
    )


@pytest.mark.parametrize("cells", [1, 200, 10**6])
@pytest.mark.parametrize("name", ["dv_total_km_s", "arrival_sep_deg"])
def test_day_bests_are_the_best_allowed_of_each_row_and_column(survey, whole, monkeypatch, name, cells):
    monkeypatch.setattr(view, "BAND_CELLS", cells)
    found = day_bests(survey, name)
    values = np.where(whole["blocked_by"].values == 0, in_both(whole, name), np.nan)
    for axis, best in ((1, found.departure_best), (0, found.arrival_best)):
        open_days = ~np.all(np.isnan(values), axis=axis)
        assert open_days.any()
        assert not open_days.all()
        assert np.array_equal(~np.isnan(best), open_days)
        rows = values if axis == 1 else values.T
        assert np.array_equal(best[open_days], np.nanmin(rows[open_days], axis=1))
    assert np.array_equal(found.departure, whole["departure"].values)
    assert np.array_equal(found.arrival, whole["arrival"].values)


def test_the_best_is_the_most_where_the_survey_ranks_so(sweep_text):
    survey = sweep_text(changed(ROOK, ("[rank]", '[rank]\nby = "tof_days"\norder = "most"')))
    assert better_sign(survey, "tof_days") == -1.0
    assert better_sign(survey, "c3_km2_s2") == 1.0
    allowed = survey.grid["tof_days"].where(survey.grid["blocked_by"] == 0)
    best = day_bests(survey, "tof_days").departure_best
    np.testing.assert_array_equal(best, allowed.max("arrival").values)


def test_shares_are_those_of_the_flags_counted(survey, whole):
    blocked = whole["blocked_by"].values
    shares = {each.title: each for each in flag_shares(survey)}
    titles = whole["blocked_by"].attrs["flag_titles"]
    for mask, title in zip(whole["blocked_by"].attrs["flag_masks"], titles, strict=True):
        share = np.mean((blocked & np.uint32(mask)) != 0)
        if title not in shares:
            assert share == 0.0
            assert title in titles[:3]
            continue
        assert shares[title].share == pytest.approx(share)
        assert shares[title].alone == pytest.approx(np.mean(blocked == mask))


def test_limits_are_listed_even_if_they_cost_nothing_but_reasons_only_where_they_occur(sweep_text):
    survey = sweep_text(changed(ROOK, ("max = 25", "max = 1e9"), ("2029-02-15", "2029-05-15")))
    titles = [each.title for each in flag_shares(survey)]
    assert titles[0] == "C3 at most 1e+09 km²/s²"
    assert len(titles) == 4

"""Limits moved in a real browser hide exactly the cells outside, and rank what is left as a sweep would."""

from __future__ import annotations

import numpy as np
import pytest
from review_tab import drawn, rows, set_limit, settled, stored

from porkgrid.survey.candidates import epoch_names
from porkgrid.survey.rank import distinct, local_bests

pytestmark = [pytest.mark.browser, pytest.mark.slow]


@pytest.mark.parametrize("most", [14.0, 25.0, 60.0], ids=["tighter", "the same", "looser"])
def test_moving_a_limit_hides_exactly_the_cells_outside(tab, rook, most):
    set_limit(tab, "c3_km2_s2", "most", most)
    np.testing.assert_array_equal(np.isfinite(drawn(tab)), moved_c3(rook, most).T)


def moved_c3(survey, most: float) -> np.ndarray:
    """The cells that are allowed when C3 may be so much and the other limits stand."""
    names = survey.grid["blocked_by"].attrs["flag_meanings"].split()
    others = stored(survey, "blocked_by") & ~np.uint32(1 << names.index("c3_km2_s2"))
    return (others == 0) & (stored(survey, "c3_km2_s2") <= most)


def test_a_slider_moves_its_limit(tab, rook):
    slider = tab.locator('#sliders [data-limit="tof_days"], #sliders [data-limit="c3_km2_s2"]').first.locator(
        'input[type="range"]'
    )
    before = np.isfinite(drawn(tab)).sum()
    slider.focus()
    for _ in range(20):
        slider.press("ArrowLeft")
    settled(tab)
    most = float(slider.input_value())
    assert most < 25.0
    assert 0 < np.isfinite(drawn(tab)).sum() < before
    number = tab.locator('#sliders [data-limit="c3_km2_s2"] input[type="number"]')
    set_to = float(number.input_value())
    assert set_to == pytest.approx(most, rel=1e-5)
    np.testing.assert_array_equal(np.isfinite(drawn(tab)), moved_c3(rook, set_to).T)


def test_a_limit_left_out_lets_its_cells_pass_and_as_swept_brings_it_back(tab, rook):
    at_first = drawn(tab)
    tab.locator('#sliders [data-limit="c3_km2_s2"] input[type="checkbox"]').uncheck()
    settled(tab)
    np.testing.assert_array_equal(np.isfinite(drawn(tab)), moved_c3(rook, np.inf).T)
    tab.locator("#reset").click()
    settled(tab)
    np.testing.assert_array_equal(drawn(tab), at_first)


def test_a_limit_can_be_added_on_any_measure(tab, rook):
    tab.locator("#more").select_option("sun_max_au")
    settled(tab)
    before = np.isfinite(drawn(tab))
    np.testing.assert_array_equal(before, (stored(rook, "blocked_by") == 0).T)
    set_limit(tab, "sun_max_au", "most", 1.5)
    allowed = (stored(rook, "blocked_by") == 0) & (stored(rook, "sun_max_au") <= 1.5)
    assert 0 < allowed.sum() < before.sum()
    np.testing.assert_array_equal(np.isfinite(drawn(tab)), allowed.T)


def test_candidates_of_the_sweep_are_listed_as_they_were_ranked(tab, rook):
    listed = rows(tab)
    exact = rook.candidates
    assert [row["key"] for row in listed] == [f"exact-{rank}" for rank in exact["rank"]]
    assert [row["cells"]["stop-0"] for row in listed] == list(exact["departure"])


@pytest.mark.parametrize(("name", "most"), [("rook", 14.0), ("starling", 25.0)], ids=["tighter", "looser"])
def test_moving_a_limit_ranks_anew(visit, page_of, request, name, most):
    survey = request.getfixturevalue(name)
    tab = visit(page_of(survey.path))
    set_limit(tab, "c3_km2_s2", "most", most)
    listed = rows(tab)
    exact = survey.candidates
    still = [f"exact-{row['rank']}" for _, row in exact.iterrows() if row["c3_km2_s2"] <= most]
    assert [row["key"] for row in listed if row["key"].startswith("exact")] == still
    dates = {(row["cells"]["stop-0"], row["cells"]["stop-1"]) for row in listed}
    of_page = {
        (row["cells"]["stop-0"], row["cells"]["stop-1"])
        for row in listed
        if not row["key"].startswith("exact")
    }
    wanted = best_dates(survey, moved_c3(survey, most))
    assert of_page  # the limit has moved enough for new bests
    assert of_page <= wanted <= dates
    values = [float(row["cells"]["dv_total_km_s"]) for row in listed]
    assert values == sorted(values)


def best_dates(survey, allowed: np.ndarray) -> set[tuple[str, str]]:
    """Dates of the distinct local bests as the sweep would rank them."""
    cost, blocked = stored(survey, "dv_total_km_s"), np.where(allowed, 0, 1).astype(np.uint32)
    i, j, _ = local_bests(lambda band: (cost[band], blocked[band]), len(cost), 1.0)
    epochs = np.column_stack([stored(survey, name)[i, j] for name in epoch_names(survey.plan)])
    rank = survey.scenario.rank
    days = [np.datetime_as_string(survey.grid[side].values, "D") for side in ("departure", "arrival")]
    return {(days[0][i[k]], days[1][j[k]]) for k in distinct(epochs, rank.apart_days, rank.keep)}


def test_ranking_by_another_measure_puts_its_best_first(tab, rook):
    tab.locator("#measure").select_option("tof_days")
    settled(tab)
    values = [float(row["cells"]["tof_days"]) for row in rows(tab)]
    allowed = stored(rook, "blocked_by") == 0
    assert values == sorted(values)
    assert values[0] == stored(rook, "tof_days")[allowed].min()

"""The page in a real browser: what it reads, shows and sorts is what the survey holds; names stay text."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from review_scenarios import CUCKOO, HOSTILE
from review_tab import drawn, place_of, point_at, readings, rows, settled, stored
from survey_scenarios import ROOK

from porkgrid.figures.draw import draw_path_of
from porkgrid.survey.ledger import read_ledger

pytestmark = [pytest.mark.browser, pytest.mark.slow]


@pytest.mark.parametrize(("i", "j"), [(0, 0), (20, 30), (42, 58)])
def test_the_crosshair_reads_what_the_store_holds(tab, rook, i, j):
    point_at(tab, i, j)
    read = readings(tab, "here")
    assert len(read) > 20
    for name in read:
        value = float(stored(rook, name)[i, j])
        assert (float(read[name][1]) if read[name][1] else np.nan) == pytest.approx(
            value, rel=0, abs=0, nan_ok=True
        )
    flag = stored(rook, "blocked_by")[i, j]
    assert tab.locator("#status").text_content().endswith("allowed.") == (flag == 0)


def test_numbers_are_shown_rounded_as_their_unit_is_worth(tab, rook):
    point_at(tab, 20, 30)
    value = float(stored(rook, "c3_km2_s2")[20, 30])
    assert readings(tab, "here")["c3_km2_s2"][0] == f"{value:.2f}"


def test_the_chart_shows_the_allowed_cells_and_no_others(tab, rook):
    allowed = stored(rook, "blocked_by") == 0
    values = np.where(allowed, stored(rook, "dv_total_km_s"), np.nan)
    np.testing.assert_array_equal(drawn(tab), values.T)


def test_columns_sort_both_ways(tab):
    heading = tab.locator('#table th[data-column="c3_km2_s2"]')
    for direction, reverse in (("ascending", False), ("descending", True)):
        heading.locator("button").click()
        values = [float(row["cells"]["c3_km2_s2"]) for row in rows(tab)]
        assert heading.get_attribute("aria-sort") == direction
        assert values == sorted(values, reverse=reverse)
        assert len(set(values)) > 1


def test_a_row_puts_its_mark_in_the_chart_and_its_numbers_beside(tab, rook):
    tab.locator("#table tbody tr").nth(1).click()
    settled(tab)
    row = rook.candidates.iloc[1]
    ring = tab.evaluate(
        "() => { const t = document.getElementById('chart').data[4]; return [t.x[0], t.y[0]]; }"
    )
    assert ring == [row["departure"], row["arrival"]]
    for name, (_, full) in readings(tab, "chosen").items():
        assert float(full) == row[name]


def test_what_a_candidate_becomes_off_the_grid_is_said(tab, rook):
    tab.locator("#table tbody tr").nth(1).click()
    row = rook.candidates.iloc[1]
    told = tab.locator("#refined").text_content()
    assert f"{row['refined_departure']} → {row['refined_arrival']}" in told
    assert f"{row['refined_dv_total_km_s']:.3f} km/s" in told


def test_a_click_beside_a_mark_takes_its_row(tab, rook):
    second = rook.candidates.iloc[1]
    i = int(np.searchsorted(stored(rook, "departure_epoch_jd_tdb")[:, 0], second["departure_epoch_jd_tdb"]))
    j = int(np.searchsorted(stored(rook, "arrival_epoch_jd_tdb")[0], second["arrival_epoch_jd_tdb"]))
    point_at(tab, i, j)
    tab.mouse.click(*place_of(tab, i, j))
    settled(tab)
    assert tab.locator('#table tr[aria-selected="true"]').get_attribute("data-key") == "exact-2"


def test_a_held_crosshair_stays_until_it_is_let_go(tab):
    point_at(tab, 30, 50)
    tab.mouse.click(*place_of(tab, 30, 50))
    held = tab.locator("#status").text_content()
    tab.mouse.move(*place_of(tab, 10, 20))
    tab.wait_for_timeout(100)
    assert tab.locator("#status").text_content() == held
    tab.locator("#chart").press("Escape")
    point_at(tab, 12, 22)
    assert tab.locator("#status").text_content() != held


def test_arrow_keys_move_the_crosshair_by_dates(tab, rook):
    tab.locator("#chart").focus()
    dates = [np.datetime_as_string(rook.grid[side].values, "D") for side in ("departure", "arrival")]
    first = rook.candidates.iloc[0]
    i, j = list(dates[0]).index(first["departure"]), list(dates[1]).index(first["arrival"])
    for key, di, dj in (
        ("ArrowRight", 1, 0),
        ("ArrowUp", 0, 1),
        ("ArrowLeft", -1, 0),
        ("Shift+ArrowDown", 0, -10),
    ):
        tab.keyboard.press(key)
        i, j = i + di, j + dj
        stops = tab.locator("#readings .stop .here").all_text_contents()
        assert stops == [dates[0][i], dates[1][j]]


def test_the_table_can_be_worked_from_the_keyboard(tab):
    tab.locator("#table tbody tr").first.focus()
    tab.keyboard.press("ArrowDown")
    tab.keyboard.press("Enter")
    assert tab.locator('#table tr[aria-selected="true"]').get_attribute("data-key") == "exact-2"
    tab.keyboard.press("ArrowUp")
    tab.keyboard.press(" ")
    assert tab.locator('#table tr[aria-selected="true"]').get_attribute("data-key") == "exact-1"


def test_every_control_has_a_name(tab):
    unnamed = tab.evaluate(
        """() => Array.from(document.querySelectorAll("input, select, button"))
          .filter((each) => !each.labels?.length && !each.getAttribute("aria-label"))
          .filter((each) => !each.textContent.trim())
          .map((each) => each.outerHTML)"""
    )
    assert unnamed == []


def test_colours_follow_the_switch(tab):
    def ground() -> str:
        return str(tab.evaluate("() => getComputedStyle(document.body).backgroundColor"))

    light = ground()
    tab.locator("#theme").select_option("dark")
    settled(tab)
    assert ground() != light
    tab.locator("#theme").select_option("light")
    settled(tab)
    assert ground() == light


def test_a_hostile_name_stays_text(visit, swept, page_of):
    survey = swept(CUCKOO, "cuckoo")
    tab = visit(page_of(survey.path))
    name = HOSTILE.replace('\\"', '"')
    assert tab.evaluate("() => window.taken") is None
    assert tab.locator("#title").text_content() == name
    assert tab.locator("#description").text_content() == name
    assert tab.title() == name
    assert tab.locator("img").count() == 0


def test_several_surveys_share_a_page(visit, rook, starling, page_of):
    tab = visit(page_of(rook.path, starling.path))
    tab.locator("#measure").select_option("c3_km2_s2")
    tab.locator("#survey").select_option("1")
    tab.wait_for_function("document.documentElement.dataset.ready === '1'")
    assert tab.locator("#title").text_content() == "Starling to Mars"
    assert tab.locator("#measure").input_value() == "c3_km2_s2"
    allowed = stored(starling, "blocked_by") == 0
    np.testing.assert_array_equal(drawn(tab), np.where(allowed, stored(starling, "c3_km2_s2"), np.nan).T)


def test_a_survey_half_swept_says_what_is_missing_and_shows_the_rest(visit, half_rook, page_of, rook):
    folder, done = half_rook
    tab = visit(page_of(folder))
    share = 1.0 - done_cells(folder) / rook.grid["blocked_by"].size
    banner = tab.locator("#missing").text_content()
    assert f"{100 * share:.1f} % of the cells are missing ({12 - done} of 12 tiles)" in banner
    assert "when the sweep is finished" in tab.locator("#figured").text_content()
    there = drawn(tab)
    whole = np.where(stored(rook, "blocked_by") == 0, stored(rook, "dv_total_km_s"), np.nan).T
    assert 0 < np.isfinite(there).sum() < np.isfinite(whole).sum()
    shown = np.isfinite(there)
    np.testing.assert_array_equal(there[shown], whole[shown])


def done_cells(folder: Path) -> int:
    return sum(sums.cells for sums in read_ledger(folder).values())


def test_figures_of_the_chosen_candidate_are_shown(visit, swept, page_of):
    survey = swept(ROOK, "drawn")
    draw_path_of(survey, 1, ["svg"])
    tab = visit(page_of(survey.path))
    image = tab.locator("#figures img")
    image.wait_for()
    tab.wait_for_function("document.querySelector('#figures img').naturalWidth > 0")
    assert "candidate 1" in image.get_attribute("alt")
    tab.locator("#table tbody tr").nth(1).click()
    tab.wait_for_function("document.querySelectorAll('#figures img').length === 0")
    assert "--path 2" in tab.locator("#figured").text_content()


def test_on_paper_the_page_is_light_and_the_chart_fits_and_the_screen_comes_back(tab):
    tab.locator("#theme").select_option("dark")
    settled(tab)
    width = "() => document.querySelector('#chart .main-svg').clientWidth"
    theme = "() => document.documentElement.dataset.theme"
    on_screen = tab.evaluate(width)
    tab.evaluate("() => { dispatchEvent(new Event('beforeprint')); }")
    settled(tab)
    assert tab.evaluate(theme) == "light"
    assert tab.evaluate(width) == 980 != on_screen
    tab.evaluate("() => { dispatchEvent(new Event('afterprint')); }")
    settled(tab)
    assert tab.evaluate(theme) == "dark"
    assert tab.evaluate(width) == on_screen

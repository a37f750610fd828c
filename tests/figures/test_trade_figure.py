"""The figure of a trade front: legible, on its axes, and true to the front."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from survey_scenarios import ROOK, changed, written

from porkgrid.figures.trade import draw_trade, save_trade
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.surveys import Survey
from porkgrid.survey.sweep import sweep
from porkgrid.survey.trade import Front, front_table, trade_front


@pytest.fixture(scope="module")
def rook_survey(tmp_path_factory) -> Survey:
    folder = tmp_path_factory.mktemp("trade")
    return sweep(load_scenario(written(folder, ROOK)), folder / "rook", workers=1)


CASES = [
    (None, ["tof_days"], 12),
    (None, ["tof_days"], 60),
    (None, ["arrival_epoch_jd_tdb"], 9),
    ("c3_km2_s2", ["tof_days", "v_inf_arrival_km_s"], 20),
    ("c3_km2_s2", ["departure_epoch_jd_tdb", "arrival_epoch_jd_tdb"], 3),
    ("arrival_epoch_jd_tdb", ["leg1_revs"], 5),  # one point
]


@pytest.mark.parametrize(("by", "traded", "keep"), CASES)
def test_no_text_stands_on_another_or_leaves_the_slide(
    rook_survey: Survey,
    by: str | None,
    traded: list[str],
    keep: int,
    placed_texts: Callable,
    overlapping: Callable,
) -> None:
    front = trade_front(rook_survey, by, traded)
    figure = draw_trade(rook_survey, front, front_table(rook_survey, front, keep))
    placed = placed_texts(figure)
    assert overlapping(placed) == []
    assert min(text.get_fontsize() for text, _ in placed) >= 8.0
    width, height = figure.bbox.size
    assert all(b.x0 >= 0 and b.y0 >= 0 and b.x1 <= width and b.y1 <= height for _, b in placed)


def test_the_line_of_the_front_goes_through_its_points_and_the_axes_hold_them(rook_survey: Survey) -> None:
    front = trade_front(rook_survey, None, ["tof_days"])
    axes = draw_trade(rook_survey, front, front_table(rook_survey, front, 5)).axes[1]
    line = next(line for line in axes.get_lines() if line.get_drawstyle() == "steps-post")
    order = np.argsort(front.values[:, 1])
    np.testing.assert_array_equal(line.get_xdata(), front.values[order, 1])
    np.testing.assert_array_equal(line.get_ydata(), front.values[order, 0])
    low, high = axes.get_xlim()
    assert np.all((front.values[:, 1] > low) & (front.values[:, 1] < high))
    low, high = axes.get_ylim()
    assert np.all((front.values[:, 0] > low) & (front.values[:, 0] < high))


def test_axes_and_notes_say_what_is_traded_and_how_many_cells_are_shown(
    rook_survey: Survey, placed_texts: Callable
) -> None:
    front = trade_front(rook_survey, None, ["tof_days"])
    texts = [
        text.get_text()
        for text, _ in placed_texts(draw_trade(rook_survey, front, front_table(rook_survey, front, 4)))
    ]
    assert "total Δv (km/s), lower is better" in texts
    assert "flight time (days), lower is better" in texts
    assert "Earth → Mars · trade of total Δv against flight time" in texts
    counted = f"{len(front.rows):,} of {front.allowed:,} allowed cells are on the front"
    assert any(
        text.startswith(counted) and text.endswith("4 of them, evenly spread, are numbered") for text in texts
    )


def test_a_measure_of_which_more_is_better_says_so(rook_survey: Survey, placed_texts: Callable) -> None:
    front = trade_front(rook_survey, "arrival_sep_deg", ["tof_days"], "most")
    texts = [
        t.get_text()
        for t, _ in placed_texts(draw_trade(rook_survey, front, front_table(rook_survey, front, 4)))
    ]
    assert "Sun–Earth–body angle at arrival (deg), higher is better" in texts


def test_the_cloud_is_where_allowed_cells_are_and_nowhere_else(rook_survey: Survey) -> None:
    front = trade_front(rook_survey, None, ["tof_days"])
    axes = draw_trade(rook_survey, front, front_table(rook_survey, front, 5)).axes[1]
    pixels = axes.get_images()[0].get_array()[..., 0]
    left, right, bottom, top = axes.get_images()[0].get_extent()
    rows, columns = pixels.shape

    def tinted(x: float, y: float) -> bool:
        return (
            pixels[int((top - y) / (top - bottom) * rows), int((x - left) / (right - left) * columns)] < 255
        )

    assert all(tinted(x, y) for y, x in front.values)
    worst, best = front.values[:, 1].min(), front.values[:, 0].min()
    assert not tinted(worst, best)  # better than the front in both: nothing flies there


def test_an_empty_front_says_that_nothing_is_allowed(tmp_path, placed_texts: Callable) -> None:
    text = changed(ROOK, ("c3_km2_s2 = { max = 25 }", "c3_km2_s2 = { max = 0.1 }"))
    survey = sweep(load_scenario(written(tmp_path, text)), tmp_path / "closed", workers=1)
    front = trade_front(survey, None, ["tof_days"])
    figure = draw_trade(survey, front, front_table(survey, front, 5))
    assert "No cell of this survey is allowed." in [t.get_text() for t, _ in placed_texts(figure)]


def test_the_file_is_named_after_what_is_traded(rook_survey: Survey) -> None:
    front = trade_front(rook_survey, None, ["tof_days", "c3_km2_s2"])
    assert isinstance(front, Front)
    files = save_trade(rook_survey, front, front_table(rook_survey, front, 5), ["png"])
    assert files == [rook_survey.path / "figures" / "trade-dv_total_km_s-tof_days-c3_km2_s2.png"]
    assert files[0].stat().st_size > 10_000

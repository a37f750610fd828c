"""The limit map shows which limits forbid a cell and what each costs."""

from __future__ import annotations

from collections.abc import Callable
from functools import cache

import numpy as np
import pytest
import synthetic_porkchop as grids
from matplotlib.figure import Figure
from synthetic_porkchop import CASES, EVERY_CASE

from porkgrid.figures.limit_map import draw_limit_map, percent
from porkgrid.survey.view import FlagShare


@cache
def map_of(case: str) -> Figure:
    view = CASES[case][0]()
    return draw_limit_map(view, grids.shares_of(view))


@pytest.mark.parametrize("case", EVERY_CASE)
def test_no_text_of_the_map_stands_on_another_or_leaves_the_slide(
    case: str, placed_texts: Callable, overlapping: Callable
) -> None:
    figure = map_of(case)
    placed = placed_texts(figure)
    assert overlapping(placed) == []
    assert min(text.get_fontsize() for text, _ in placed) >= 8.0
    width, height = figure.bbox.size
    assert all(b.x0 >= 0 and b.y0 >= 0 and b.x1 <= width and b.y1 <= height for _, b in placed)


def test_each_limit_is_named_with_both_of_its_shares(placed_texts: Callable) -> None:
    view = grids.usual()
    shares = grids.shares_of(view)
    texts = [text.get_text() for text, _ in placed_texts(draw_limit_map(view, shares))]
    for share in shares[3:]:
        at = texts.index(share.title)
        assert texts[at + 1 : at + 3] == [percent(share.share), percent(share.alone)]


def test_of_more_limits_than_fit_the_costliest_are_shown_and_the_rest_counted(placed_texts: Callable) -> None:
    view = grids.many_limits(12)
    shares = grids.shares_of(view)
    texts = [text.get_text() for text, _ in placed_texts(draw_limit_map(view, shares))]
    shown = [share for share in shares[3:] if share.title in texts]
    hidden = [share for share in shares[3:] if share.title not in texts]
    assert f"… and {len(hidden)} more, each forbidding less" in texts
    assert min(s.share for s in shown) >= max(s.share for s in hidden)


def test_bars_are_as_long_as_the_shares_they_stand_for() -> None:
    view = grids.usual()
    figure = draw_limit_map(view, [FlagShare(s.title, 0.4, 0.1) for s in grids.shares_of(view)])
    lengths = [image.get_extent()[1] - image.get_extent()[0] for image in figure.axes[0].get_images()]
    bars = [length for length in lengths if length != pytest.approx(0.34)]
    assert len(bars) == 6
    assert bars[0] / bars[1] == pytest.approx(4.0)


def test_a_grid_without_limits_says_so(placed_texts: Callable) -> None:
    assert "No limits were set" in [text.get_text() for text, _ in placed_texts(map_of("all allowed"))]


@pytest.mark.parametrize(
    ("share", "text"),
    [(0.0, "0 %"), (0.0004, "under 0.1 %"), (0.034, "3.4 %"), (0.62, "62 %"), (1.0, "100 %")],
)
def test_shares_are_written_with_the_figures_they_deserve(share: float, text: str) -> None:
    assert percent(share) == text


def test_a_thinned_grid_is_drawn_with_the_shares_of_the_full_one(placed_texts: Callable) -> None:
    view = grids.usual()
    shares = grids.shares_of(view)
    thinned = view.isel(departure=slice(None, None, 7), arrival=slice(None, None, 7))
    texts = [text.get_text() for text, _ in placed_texts(draw_limit_map(thinned, shares))]
    assert all(percent(share.share) in texts for share in shares[3:])
    assert not np.isclose(np.mean(thinned["blocked_by"] == 8), shares[3].alone, rtol=1e-6)

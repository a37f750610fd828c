"""The path figure shows the flight where it is, to scale, and no label stands on another."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.colors import to_hex
from matplotlib.figure import Figure
from picture_routes import ROUTES, flight_of

from porkgrid.figures.itinerary import LEG_COLOURS
from porkgrid.figures.path import draw_path
from porkgrid.figures.style import save_figure
from porkgrid.physics.constants import AU_KM
from porkgrid.survey.pictures import RoutePicture, route_picture

_EVERY_DAY = ("direct", "one revolution", "elements", "jupiter", "neptune", "crowded")
EVERY_ROUTE = [pytest.param(name, marks=[pytest.mark.slow] * (name not in _EVERY_DAY)) for name in ROUTES]


@cache
def picture_of(name: str) -> RoutePicture:
    return route_picture(*flight_of(name).candidate)


@cache
def figure_of(name: str) -> Figure:
    return draw_path(picture_of(name))


def views(figure: Figure) -> tuple[Axes, Axes]:
    """The view from the pole and the one from the side; the sheet is first."""
    _, pole, side = figure.axes
    return pole, side


def lines_of(axes: Axes, color: str) -> list[np.ndarray]:
    """The lines (k, 2) of a colour, in the units of the axes."""
    return [np.column_stack(line.get_data()) for line in axes.lines if to_hex(line.get_color()) == color]


def inches_per_unit(axes: Axes) -> tuple[float, float]:
    box = axes.get_window_extent()
    (x0, x1), (y0, y1) = axes.get_xlim(), axes.get_ylim()
    return box.width / (x1 - x0), box.height / (y1 - y0)


@pytest.mark.parametrize("name", EVERY_ROUTE)
def test_no_label_stands_on_another_or_leaves_the_slide(
    name: str, placed_texts: Callable, overlapping: Callable
) -> None:
    figure = figure_of(name)
    placed = placed_texts(figure)
    assert overlapping(placed) == []
    assert min(text.get_fontsize() for text, _ in placed) >= 8.0
    width, height = figure.bbox.size
    outside = [t.get_text() for t, b in placed if b.x0 < 0 or b.y0 < 0 or b.x1 > width or b.y1 > height]
    assert outside == []


@pytest.mark.parametrize("name", EVERY_ROUTE)
def test_every_encounter_is_named_and_dated_in_the_view_and_in_the_column(
    name: str, placed_texts: Callable
) -> None:
    texts = [text.get_text() for text, _ in placed_texts(figure_of(name))]
    for n, encounter in enumerate(picture_of(name).encounters, start=1):
        assert texts.count(f"{n} {encounter.title}, {encounter.kind}") == 2
        assert texts.count(encounter.date) == 2
        assert texts.count(str(n)) >= 1  # in the view from the side


@pytest.mark.parametrize("name", EVERY_ROUTE)
def test_the_view_from_the_pole_has_one_scale_and_the_side_shares_its_y(name: str) -> None:
    pole, side = views(figure_of(name))
    x_scale, y_scale = inches_per_unit(pole)
    assert x_scale == pytest.approx(y_scale, rel=1e-9)
    assert side.get_ylim() == pytest.approx(pole.get_ylim(), rel=1e-12)
    assert inches_per_unit(side)[1] == pytest.approx(y_scale, rel=1e-9)


@pytest.mark.parametrize("name", ["direct", "mars", "neptune", "comet"])
def test_the_axis_of_the_side_view_says_how_much_it_enlarges(name: str) -> None:
    _, side = views(figure_of(name))
    across, up = inches_per_unit(side)
    times, _, rest = side.get_xlabel().removeprefix("z (au), ").partition(" × ")
    factor = float(times) if rest else 1.0
    assert across / up == pytest.approx(factor, rel=1e-9)


@pytest.mark.parametrize("name", EVERY_ROUTE)
def test_every_arc_lies_inside_both_views(name: str) -> None:
    for axes, sides in zip(views(figure_of(name)), ((0, 1), (2, 1)), strict=True):
        limits = axes.get_xlim(), axes.get_ylim()
        for arc in picture_of(name).arcs:
            for side, (low, high) in zip(sides, limits, strict=True):
                assert low < (arc.path[side] / AU_KM).min()
                assert (arc.path[side] / AU_KM).max() < high


def test_each_leg_has_its_colour_in_both_views_and_in_the_column(placed_texts: Callable) -> None:
    figure, picture = figure_of("jupiter"), picture_of("jupiter")
    for k, arc in enumerate(picture.arcs):
        for axes, sides in zip(views(figure), ([0, 1], [2, 1]), strict=True):
            (drawn,) = lines_of(axes, LEG_COLOURS[k])
            assert np.allclose(drawn, (arc.path[sides] / AU_KM).T)
        assert len(lines_of(figure.axes[0], LEG_COLOURS[k])) == 1
    texts = "\n".join(text.get_text() for text, _ in placed_texts(figure))
    assert "leg 3: 1\u2009179 days, 139.5° round the Sun" in texts


def test_the_column_tells_revolutions(placed_texts: Callable) -> None:
    texts = "\n".join(text.get_text() for text, _ in placed_texts(figure_of("one revolution")))
    assert "round the Sun and 1 revolution" in texts
    texts = "\n".join(text.get_text() for text, _ in placed_texts(figure_of("direct")))
    assert "revolution" not in texts


@pytest.mark.parametrize("name", ["direct", "one revolution", "neptune"])
def test_arrow_heads_point_along_the_flight(name: str) -> None:
    figure, picture = figure_of(name), picture_of(name)
    pole, _ = views(figure)
    for k, arc in enumerate(picture.arcs):
        color, path = LEG_COLOURS[k], (arc.path[:2] / AU_KM).T
        heads = [patch.get_xy() for patch in figure.axes[0].patches if to_hex(patch.get_facecolor()) == color]
        on_pole = [xy for xy in heads if xy[:, 0].max() < 6.8]
        assert on_pole
        for tip, left, right, *_ in on_pole:
            back = 0.5 * (left + right)
            ends = pole.transData.inverted().transform(np.array([back, tip]) * figure.dpi)
            nearest = [int(np.argmin(np.linalg.norm(path - end, axis=1))) for end in ends]
            ahead = path[min(nearest[0] + 5, len(path) - 1)] - path[max(nearest[0] - 5, 0)]
            assert ahead @ (ends[1] - ends[0]) > 0.9 * np.linalg.norm(ahead) * np.linalg.norm(
                ends[1] - ends[0]
            )


def test_orbits_much_larger_than_the_flight_do_not_shrink_it() -> None:
    pole, _ = views(figure_of("jupiter"))
    flown = max(
        np.ptp(np.concatenate([arc.path[side] for arc in picture_of("jupiter").arcs])) for side in (0, 1)
    )
    assert np.ptp(pole.get_xlim()) < 1.5 * flown / AU_KM
    whole = next(orbit for orbit in picture_of("jupiter").orbits if orbit.title == "Jupiter")
    assert np.ptp(whole.path[0]) / AU_KM > np.ptp(pole.get_xlim())


@pytest.mark.slow
def test_a_route_too_long_for_the_column_says_how_much_is_left_out(
    placed_texts: Callable, overlapping: Callable
) -> None:
    picture = picture_of("neptune")
    first, *flybys, last = picture.encounters
    long = replace(picture, encounters=(first, *flybys * 8, last), arcs=picture.arcs[:1] * 25)
    placed = placed_texts(draw_path(long))
    column = [(text, box) for text, box in placed if text.get_position()[0] > 9.3]
    assert overlapping(column) == []
    rest = next(t.get_text() for t, _ in column if t.get_text().startswith("… and"))
    named = sum(t.get_text().endswith((", flyby", ", departure", ", arrival")) for t, _ in column)
    assert rest == f"… and {26 - named} more encounters"


def test_a_path_is_written_in_every_format_and_the_same_each_time(tmp_path: Path) -> None:
    first = save_figure(draw_path(picture_of("mars")), tmp_path / "a", ["png", "svg", "pdf"])
    second = save_figure(draw_path(picture_of("mars")), tmp_path / "b", ["png", "svg", "pdf"])
    for one, other in zip(first, second, strict=True):
        assert one.stat().st_size > 10_000
        assert one.read_bytes() == other.read_bytes()

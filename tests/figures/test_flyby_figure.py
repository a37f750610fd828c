"""The flyby figure draws velocities and passage to scale, and no label stands on another."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest
from matplotlib.colors import to_hex
from matplotlib.figure import Figure
from matplotlib.patches import Circle, Polygon
from picture_routes import WITH_FLYBYS, flight_of

from porkgrid.figures.flyby import draw_flyby
from porkgrid.figures.style import INK, save_figure
from porkgrid.figures.vectors import AFTER, BEFORE, flyby_axes, out_of_plane_deg
from porkgrid.survey.pictures import FlybyPicture, flyby_picture

_EVERY_DAY = [("mars", 1), ("mercury", 1), ("jupiter", 2), ("neptune", 1), ("neptune", 3), ("crowded", 2)]
EVERY_FLYBY = [
    pytest.param(*flyby, marks=[pytest.mark.slow] * (flyby not in _EVERY_DAY)) for flyby in WITH_FLYBYS
]
_PASSAGE_LEFT_IN = 9.38  # the passage stands right of this, the vectors left


@cache
def picture_of(name: str, n: int) -> FlybyPicture:
    return flyby_picture(*flight_of(name).candidate, n)


@cache
def figure_of(name: str, n: int) -> Figure:
    return draw_flyby(picture_of(name, n))


def heads(figure: Figure, color: str) -> list[np.ndarray]:
    """Tips of the arrows of a colour in the vector diagram, inches; the view square to the plane is upper."""
    found = [
        patch.get_xy()[0]
        for patch in figure.axes[0].patches
        if isinstance(patch, Polygon) and to_hex(patch.get_facecolor()) == color
    ]
    return sorted((tip for tip in found if tip[0] < _PASSAGE_LEFT_IN), key=lambda tip: -tip[1])


def shafts(figure: Figure, color: str, width_pt: float) -> list[np.ndarray]:
    """Lines (2, 2) of a colour and width in the vector diagram, the upper view's first."""
    found = [
        np.column_stack(line.get_data())
        for line in figure.axes[0].lines
        if to_hex(line.get_color()) == color and line.get_linewidth() == width_pt
    ]
    return sorted((line for line in found if line[0, 0] < _PASSAGE_LEFT_IN), key=lambda line: -line[0, 1])


def inches_per_km_s(figure: Figure, placed: list) -> float:
    """Read the scale bar of the vector diagram."""
    text, box = next((t, b) for t, b in placed if t.get_text().endswith("km/s") and t.get_text()[0].isdigit()
                     and t.get_position()[0] < _PASSAGE_LEFT_IN)  # fmt: skip
    bars = [line for line in shafts(figure, INK, 1.4) if abs(line[0, 1] - line[1, 1]) < 1e-9]
    bar = min(bars, key=lambda line: abs(line[0, 1] * figure.dpi - box.y0))
    return float(np.ptp(bar[:, 0])) / float(text.get_text().split()[0])


@pytest.mark.parametrize(("name", "n"), EVERY_FLYBY)
def test_no_label_stands_on_another_or_leaves_the_slide(
    name: str, n: int, placed_texts: Callable, overlapping: Callable
) -> None:
    figure = figure_of(name, n)
    placed = placed_texts(figure)
    assert overlapping(placed) == []
    assert min(text.get_fontsize() for text, _ in placed) >= 8.0
    width, height = figure.bbox.size
    outside = [t.get_text() for t, b in placed if b.x0 < 0 or b.y0 < 0 or b.x1 > width or b.y1 > height]
    assert outside == []


@pytest.mark.parametrize(("name", "n"), EVERY_FLYBY)
def test_the_axes_hold_both_excess_velocities_in_their_plane(name: str, n: int) -> None:
    picture = picture_of(name, n)
    axes = flyby_axes(picture)
    assert np.allclose(axes.rows @ axes.rows.T, np.eye(3), atol=1e-12)
    assert np.linalg.det(axes.rows) == pytest.approx(1.0)
    assert axes.rows[2, 2] >= 0.0  # seen from the north
    for v_inf in (picture.v_inf_in, picture.v_inf_out):
        assert axes.turned(v_inf)[2] == pytest.approx(0.0, abs=1e-9)
    body = axes.turned(picture.body_velocity)
    assert body[0] > 0.0
    assert body[1] == pytest.approx(0.0, abs=1e-9)
    assert np.degrees(np.arcsin(body[2] / np.linalg.norm(body))) == pytest.approx(
        out_of_plane_deg(picture, axes)
    )


@pytest.mark.parametrize(("name", "n"), [("mars", 1), ("mercury", 1), ("jupiter", 1), ("neptune", 1)])
def test_the_arrows_of_v_infinity_have_the_length_and_the_angle_that_the_scale_says(
    name: str, n: int, placed_texts: Callable
) -> None:
    figure, picture = figure_of(name, n), picture_of(name, n)
    scale = inches_per_km_s(figure, placed_texts(figure))
    tail = shafts(figure, BEFORE, 2.2)[0][0]
    assert np.allclose(tail, shafts(figure, AFTER, 2.2)[0][0])
    arrows = []
    for color, v_inf in ((BEFORE, picture.v_inf_in), (AFTER, picture.v_inf_out)):
        length = scale * np.linalg.norm(v_inf)
        tip = min(heads(figure, color), key=lambda tip: abs(np.hypot(*(tip - tail)) - length))
        assert np.hypot(*(tip - tail)) == pytest.approx(length, rel=1e-6)
        arrows.append(tip - tail)
    before, after = arrows
    angle = np.arctan2(before[0] * after[1] - before[1] * after[0], before @ after)
    assert abs(angle) == pytest.approx(picture.turn_rad, rel=1e-6)
    assert np.sign(angle) == flyby_axes(picture).turns


@pytest.mark.parametrize(("name", "n"), [("mars", 1), ("mercury", 1), ("neptune", 2)])
def test_both_views_together_give_the_true_speed_of_the_body(
    name: str, n: int, placed_texts: Callable
) -> None:
    figure, picture = figure_of(name, n), picture_of(name, n)
    scale = inches_per_km_s(figure, placed_texts(figure))
    square, edge = shafts(figure, BEFORE, 2.2)[0][0], shafts(figure, AFTER, 2.2)[-1][0]
    origin_square, origin_edge = shafts(figure, INK, 2.2)[0][0], shafts(figure, INK, 2.2)[-1][0]
    texts = [text.get_text() for text, _ in placed_texts(figure)]
    reduced = 0.5 if any("at half the scale" in text for text in texts) else 1.0
    assert (edge - origin_edge)[0] == pytest.approx(reduced * (square - origin_square)[0], rel=1e-6)
    along, across, out = *(square - origin_square), (edge - origin_edge)[1] / reduced
    assert np.sqrt(along**2 + across**2 + out**2) / scale == pytest.approx(
        np.linalg.norm(picture.body_velocity), rel=1e-6
    )


@pytest.mark.parametrize(
    ("name", "n"), [("mars", 1), ("mercury", 1), ("jupiter", 1), ("neptune", 1), ("saturn", 1)]
)
def test_periapsis_and_disc_are_to_scale_and_the_path_keeps_its_distance(name: str, n: int) -> None:
    figure, picture = figure_of(name, n), picture_of(name, n)
    (disc,) = figure.axes[0].findobj(Circle)
    per_km = disc.get_radius() / picture.body_radius_km
    branches = [
        np.column_stack(line.get_data())
        for color in (BEFORE, AFTER)
        for line in figure.axes[0].lines
        if to_hex(line.get_color()) == color and line.get_linewidth() == 1.8
    ]
    assert len(branches) == 2
    for branch in branches:
        distance = np.hypot(*(branch - np.array(disc.center)).T) / per_km
        assert distance[0] == pytest.approx(picture.periapsis_km, rel=1e-9)
        assert distance.min() == pytest.approx(picture.periapsis_km, rel=1e-9)
    # flown in along the first branch, which starts at periapsis, and out along the second: the same sense
    (before, after), turns = branches, flyby_axes(picture).turns
    for branch, way in ((before, -1.0), (after, 1.0)):
        r, step = branch[1] - np.array(disc.center), branch[1] - branch[0]
        assert np.sign(r[0] * step[1] - r[1] * step[0]) * way == turns


def test_the_path_far_out_runs_along_the_excess_velocity() -> None:
    picture = picture_of("neptune", 1)
    figure, axes = figure_of("neptune", 1), flyby_axes(picture)
    out = next(
        np.column_stack(line.get_data())
        for line in figure.axes[0].lines
        if to_hex(line.get_color()) == AFTER and line.get_linewidth() == 1.8
    )
    (disc,) = figure.axes[0].findobj(Circle)
    radius = np.hypot(*(out[-1] - np.array(disc.center))) / disc.get_radius() * picture.body_radius_km
    # what is left to turn: the half-turn 1/sin, less what the velocity has turned at this true anomaly
    e = picture.eccentricity_out
    anomaly = np.arccos((picture.periapsis_km * (1.0 + e) / radius - 1.0) / e)
    flight_path = np.arctan2(e * np.sin(anomaly), 1.0 + e * np.cos(anomaly))
    turned = anomaly - flight_path  # of the velocity since periapsis
    left = np.arcsin(1.0 / e) - turned
    heading, v = out[-1] - out[-2], axes.turned(picture.v_inf_out)[:2]
    angle = np.arccos(heading @ v / np.linalg.norm(heading) / np.linalg.norm(v))
    assert angle == pytest.approx(left, abs=0.01)


@pytest.mark.parametrize(("name", "n"), [("mars", 1), ("mercury", 1)])
def test_the_numbers_stand_beside_the_drawing(name: str, n: int, placed_texts: Callable) -> None:
    picture = picture_of(name, n)
    texts = [text.get_text() for text, _ in placed_texts(figure_of(name, n))]
    text = "\n".join(texts)
    assert f"flyby {n}: {picture.body} on {picture.date}" in text
    assert f"Flyby {n}: {picture.body}, {picture.date}" in texts
    for speed in (picture.speed_in_km_s, picture.speed_out_km_s, np.linalg.norm(picture.v_inf_in)):
        assert f"{speed:.3f} km/s" in texts
    assert f"v∞ before {np.linalg.norm(picture.v_inf_in):.3f} km/s" in texts
    assert f"{np.degrees(picture.turn_rad):.1f}°" in texts
    assert f"{picture.altitude_km:,.0f} km".replace(",", "\u2009") in texts
    assert f"{picture.gain_km_s:+.3f} km/s".replace("-", "−") in texts


def test_the_table_says_which_way_the_burn_goes(placed_texts: Callable) -> None:
    faster = picture_of("mercury", 1)
    slower = replace(faster, v_inf_in=faster.v_inf_out, v_inf_out=faster.v_inf_in)
    for picture, way in ((faster, "against"), (slower, "along")):
        texts = [text.get_text() for text, _ in placed_texts(draw_flyby(picture))]
        assert f"burn at periapsis, {way} the velocity" in texts


@pytest.mark.parametrize("periapsis", [np.inf, 0.0, np.nan])
def test_a_flyby_without_a_periapsis_says_so(
    periapsis: float, placed_texts: Callable, overlapping: Callable
) -> None:
    usual = picture_of("mars", 1)
    straight = replace(usual, v_inf_out=usual.v_inf_in.copy(), turn_rad=0.0, periapsis_km=periapsis,
                       altitude_km=periapsis, eccentricity_in=np.inf, eccentricity_out=np.inf)  # fmt: skip
    placed = placed_texts(draw_flyby(straight))
    assert "no periapsis to draw" in " ".join(text.get_text() for text, _ in placed).replace("\n", " ")
    assert overlapping(placed) == []


def test_a_flyby_is_written_in_every_format_and_the_same_each_time(tmp_path: Path) -> None:
    first = save_figure(draw_flyby(picture_of("mars", 1)), tmp_path / "a", ["png", "svg", "pdf"])
    second = save_figure(draw_flyby(picture_of("mars", 1)), tmp_path / "b", ["png", "svg", "pdf"])
    for one, other in zip(first, second, strict=True):
        assert one.stat().st_size > 10_000
        assert one.read_bytes() == other.read_bytes()

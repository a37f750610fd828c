"""The velocities of a flyby as arrows to scale: square to the plane of the flyby, and on its edge."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes

from porkgrid.figures.callouts import Drawing, draw_callout
from porkgrid.figures.levels import round_step
from porkgrid.figures.marks import add_line, add_rectangle
from porkgrid.figures.numbers import number_text
from porkgrid.figures.placement import Box, Room
from porkgrid.figures.plane import Plane, draw_arrow, extent
from porkgrid.figures.style import INK, SMALL_PT, SOFT_INK
from porkgrid.figures.text import put
from porkgrid.survey.pictures import FlybyPicture

BEFORE, AFTER, BODY_INK = "#0072b2", "#d55e00", INK  # Okabe and Ito (2008), "Color Universal Design"

_X, _Y, _Z = range(3)
_THICK_PT, _THIN_PT = 2.2, 1.2
_PAD_IN = 0.42  # for labels, above and below the arrows
_LEFT_IN, _RIGHT_IN = 0.30, 1.20  # and beside them: v∞ is on the right
_GAP_IN = 0.42  # between the two views
_ARC_SHARE = 0.35  # of the shorter arrow, for the radius of the turn's arc
_ANCHORS = (0.5, 0.44, 0.56, 0.38, 0.62, 0.32, 0.68, 0.26, 0.74, 0.2, 0.8, 0.14, 0.86)
_ARROW_WEIGHT = 3  # to labels, which should rather stand off than hide an arrow
_BESIDE_IN, _AWAY_IN = 0.15, 2.0  # where a name may stand from its arrow: first beside it
_APART_IN = 0.18  # from other arrows, where an arrow is best named
_REDUCTIONS = {1.0: "", 0.5: ", at half the scale", 0.25: ", at a quarter of the scale"}
_LEAST_FILLED = 0.8  # of what the view square to the plane could fill by itself
_LEAST_SINE = 1e-9


@dataclass(frozen=True, eq=False)
class FlybyAxes:
    """Axes of a flyby, rows x, y, z: z square to its plane on the north side of the ecliptic, x along what
    lies in the plane of the body's motion. `turns` is +1 where the turn is anticlockwise seen from z.
    """

    rows: np.ndarray
    turns: float

    def turned(self, vector: np.ndarray) -> np.ndarray:
        """Return the components (3,) of an ecliptic vector in these axes."""
        return self.rows @ vector


def flyby_axes(picture: FlybyPicture) -> FlybyAxes:
    """Lay axes in the plane of v∞ in and out; without a turn, in that of v∞ and the body's motion."""
    a, b = _unit(picture.v_inf_in), _unit(picture.v_inf_out)
    normal = np.cross(a, b)
    if np.linalg.norm(normal) < _LEAST_SINE:
        normal = np.cross(a, picture.body_velocity)
    if np.linalg.norm(normal) < _LEAST_SINE * np.linalg.norm(picture.body_velocity):
        normal = np.cross(a, np.eye(3)[int(np.argmin(np.abs(a)))])
    normal = _unit(normal)
    turns = 1.0 if normal[_Z] >= 0.0 else -1.0
    z = turns * normal
    along = picture.body_velocity - (picture.body_velocity @ z) * z
    if np.linalg.norm(along) < _LEAST_SINE * np.linalg.norm(picture.body_velocity):
        along = a
    x = _unit(along)
    return FlybyAxes(np.stack([x, np.cross(z, x), z]), turns)


@dataclass(frozen=True, eq=False)
class _Arrow:
    """An arrow from tail to tip, (3,) km/s in the flyby's axes."""

    tail: np.ndarray
    tip: np.ndarray
    color: str
    width_pt: float
    text: str


def draw_vectors(sheet: Axes, box: Box, picture: FlybyPicture, axes: FlybyAxes) -> None:
    """Fill a box of the slide with the two views, one above the other."""
    arrows = list(_arrows(picture, axes))
    low, high = extent([np.column_stack([arrow.tail, arrow.tip]) for arrow in arrows])
    square, edge = _planes(box, low, high)
    _frame(sheet, square.box, "Seen square to the plane of the flyby, the body's motion to the right")
    angle = number_text(abs(out_of_plane_deg(picture, axes)), "deg")
    smaller = _REDUCTIONS[edge.x_scale / square.x_scale]
    leaves = f"the body's motion leaves it at {angle}"
    _frame(sheet, edge.box, f"Seen on the edge of that plane{smaller}: {leaves}")

    drawing = _draw_arrows(sheet, square, arrows, (_X, _Y))
    _draw_turn(sheet, square, drawing, arrows[1], arrows[2], picture.turn_rad * axes.turns)
    _draw_scale(sheet, square, drawing)
    for arrow in sorted(arrows, key=_length):  # short ones have the fewest places for their names
        _name(sheet, square, drawing, arrow, arrows, (_X, _Y), arrow.text)
    drawing = _draw_arrows(sheet, edge, arrows, (_X, _Z))
    _name(sheet, edge, drawing, arrows[0], arrows, (_X, _Z), f"{picture.body}'s velocity")


def _length(arrow: _Arrow) -> float:
    return float(np.hypot(*(arrow.tip - arrow.tail)[[_X, _Y]]))


def _arrows(picture: FlybyPicture, axes: FlybyAxes) -> Iterator[_Arrow]:
    """The body's velocity, v∞ before and after on its tip, and the sums of them."""
    origin, body = np.zeros(3), axes.turned(picture.body_velocity)
    speed = np.linalg.norm
    yield _Arrow(origin, body, BODY_INK, _THICK_PT,
                 f"{picture.body}'s velocity {_km_s(speed(picture.body_velocity))}")  # fmt: skip
    for v_inf, v, when, color in (
        (picture.v_inf_in, picture.v_in, "before", BEFORE),
        (picture.v_inf_out, picture.v_out, "after", AFTER),
    ):
        yield _Arrow(body, axes.turned(v), color, _THICK_PT, f"v∞ {when} {_km_s(speed(v_inf))}")
    for v, when, color in ((picture.v_in, "before", BEFORE), (picture.v_out, "after", AFTER)):
        yield _Arrow(origin, axes.turned(v), color, _THIN_PT, f"heliocentric {when} {_km_s(speed(v))}")


def _km_s(speed: np.floating) -> str:
    return number_text(float(speed), "km/s")


def out_of_plane_deg(picture: FlybyPicture, axes: FlybyAxes) -> float:
    """Return the angle of the body's velocity to the plane of the flyby, positive to the north."""
    return float(np.degrees(np.arcsin(np.clip(axes.turned(_unit(picture.body_velocity))[_Z], -1.0, 1.0))))


def _planes(box: Box, low: np.ndarray, high: np.ndarray) -> tuple[Plane, Plane]:
    """Share a box between the views by the heights of what they show.

    The view on the edge is reduced where it would otherwise make the other one small.
    """
    width, height = box.right - box.left, box.top - box.bottom
    x, y, z = high - low
    free = height - _GAP_IN - 4.0 * _PAD_IN
    widest = min((width - _LEFT_IN - _RIGHT_IN) / x, free / max(y, _LEAST_SINE * x))
    for reduced in _REDUCTIONS:
        tall = y + reduced * z
        scale = float(min(widest, free / max(tall, _LEAST_SINE * x)))
        if scale >= _LEAST_FILLED * widest:
            break
    share = reduced * z / max(tall, _LEAST_SINE * x)
    edge_height = share * free + 2.0 * _PAD_IN
    middle = 0.5 * (low + high)
    aside, small = 0.5 * (_RIGHT_IN - _LEFT_IN), reduced * scale
    upper = Box(box.left, box.bottom + edge_height + _GAP_IN, box.right, box.top)
    lower = Box(box.left, box.bottom, box.right, box.bottom + edge_height)
    return (
        Plane(upper, float(middle[_X]) + aside / scale, float(middle[_Y]), scale, scale),
        Plane(lower, float(middle[_X]) + aside / small, float(middle[_Z]), small, small),
    )


def _frame(sheet: Axes, box: Box, caption: str) -> None:
    frame = {"fill": False, "edgecolor": SOFT_INK, "linewidth": 0.6}
    add_rectangle(sheet, box.left, box.bottom, box.right - box.left, box.top - box.bottom, **frame)
    put(sheet, box.left, box.top + 0.06, caption, SMALL_PT, color=SOFT_INK)


def _draw_arrows(sheet: Axes, plane: Plane, arrows: list[_Arrow], sides: tuple[int, int]) -> Drawing:
    """Draw arrows, the long thin ones first; return what labels must keep clear of."""
    drawing = Drawing(Room(plane.box))
    for arrow in sorted(arrows, key=lambda arrow: arrow.width_pt):
        start, end = (np.array(plane.point(*end[list(sides)])) for end in (arrow.tail, arrow.tip))
        draw_arrow(sheet, start, end, arrow.color, arrow.width_pt)
        drawing.add_line(np.stack([start, end]), _ARROW_WEIGHT)
    return drawing


def _name(
    sheet: Axes,
    plane: Plane,
    drawing: Drawing,
    arrow: _Arrow,
    arrows: list[_Arrow],
    sides: tuple[int, int],
    text: str,
) -> None:
    """Write a text along an arrow, where it runs apart from the others if it does."""
    tail, tip = arrow.tail[list(sides)], arrow.tip[list(sides)]
    anchors = [plane.point(*(tail + share * (tip - tail))) for share in _ANCHORS]
    others = [
        [np.array(plane.point(*end[list(sides)])) for end in (other.tail, other.tip)]
        for other in arrows
        if other is not arrow
    ]
    apart = [
        anchor for anchor in anchors if all(_distance(np.array(anchor), *ends) > _APART_IN for ends in others)
    ]
    for reach in (_BESIDE_IN, _AWAY_IN):
        if draw_callout(sheet, drawing, apart or anchors, [text], SMALL_PT, arrow.color, reach_in=reach):
            return


def _distance(point: np.ndarray, start: np.ndarray, end: np.ndarray) -> float:
    """Return the distance of a point from the line between two others."""
    step = end - start
    share = np.clip((point - start) @ step / max(float(step @ step), 1e-12), 0.0, 1.0)
    return float(np.hypot(*(point - start - share * step)))


def _draw_turn(
    sheet: Axes, plane: Plane, drawing: Drawing, before: _Arrow, after: _Arrow, turn_rad: float
) -> None:
    """Draw the arc from v∞ before to v∞ after about their common tail, with the angle."""
    ray = (before.tip - before.tail)[[_X, _Y]]
    radius = _ARC_SHARE * min(float(np.linalg.norm(arrow.tip - arrow.tail)) for arrow in (before, after))
    angles = np.arctan2(ray[1], ray[0]) + np.linspace(0.0, turn_rad, 60)
    x, y = plane.at(before.tail[_X] + radius * np.cos(angles), before.tail[_Y] + radius * np.sin(angles))
    add_line(sheet, x, y, color=INK, linewidth=0.9)
    drawing.add_line(np.column_stack([x, y]))
    text = number_text(float(np.degrees(abs(turn_rad))), "deg")
    draw_callout(sheet, drawing, [(float(x[30]), float(y[30]))], [text], SMALL_PT, INK, "bold")


def _draw_scale(sheet: Axes, plane: Plane, drawing: Drawing) -> None:
    """Draw a bar of a round speed in the lower right corner."""
    speed = round_step(1.0 / plane.x_scale, 1)
    length = speed * plane.x_scale
    right, y = plane.box.right - 0.2, plane.box.bottom + 0.16
    add_line(sheet, [right - length, right], [y, y], color=INK, linewidth=1.4, solid_capstyle="butt")
    for x in (right - length, right):
        add_line(sheet, [x, x], [y - 0.03, y + 0.03], color=INK, linewidth=1.0)
    put(sheet, right - 0.5 * length, y + 0.05, f"{speed:g} km/s", SMALL_PT, ha="center")
    drawing.room.taken.append(Box(right - length - 0.1, plane.box.bottom, plane.box.right, y + 0.22))


def _unit(vector: np.ndarray) -> np.ndarray:
    return vector / np.linalg.norm(vector)

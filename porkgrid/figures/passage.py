"""How a flyby passes its body: the hyperbola in its plane, periapsis and disc to scale."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.patches import Circle, Rectangle
from matplotlib.patheffects import withStroke

from porkgrid.figures.callouts import Drawing, draw_callout
from porkgrid.figures.levels import round_step
from porkgrid.figures.marks import add_line, add_rectangle
from porkgrid.figures.numbers import number_text
from porkgrid.figures.placement import Box, Room
from porkgrid.figures.plane import ARROW_IN, Plane, draw_arrow, draw_arrow_head, inside_pieces
from porkgrid.figures.style import INK, SMALL_PT, SOFT_INK
from porkgrid.figures.text import POINTS_PER_INCH, put, width_in, wrap
from porkgrid.figures.vectors import AFTER, BEFORE, FlybyAxes
from porkgrid.survey.pictures import FlybyPicture

_SHOWN_RADII = 2.3  # half the height of the view, in periapsis radii
_DISC_FACE = "#dfe3e8"
_SUN_INK = "#a87b00"
_DOT_PT = 4.5
_LEAST_DISC_IN = 0.03  # for labels; the disc itself is drawn to scale however small
_NAME_INSIDE_IN = 0.30  # a disc of this radius has room for the body's name
_POINTER_IN, _SCALE_IN = 0.34, 0.75
_CORNER_IN = 1.65, 1.05  # width and height of the corners that scale and pointers stand in


def draw_passage(sheet: Axes, box: Box, picture: FlybyPicture, axes: FlybyAxes) -> None:
    """Fill a box of the slide with the passage, seen as the vectors square to the plane are."""
    frame = {"fill": False, "edgecolor": SOFT_INK, "linewidth": 0.6}
    add_rectangle(sheet, box.left, box.bottom, box.right - box.left, box.top - box.bottom, **frame)
    put(sheet, box.left, box.top + 0.06, "The passage, seen square to its plane", SMALL_PT, color=SOFT_INK)
    if not (np.isfinite(picture.periapsis_km) and picture.periapsis_km > 0.0):
        _say_why_not(sheet, box, picture)
        return
    size = max(picture.periapsis_km, picture.body_radius_km)  # less than the body's only where none can fly
    scale = 0.5 * (box.top - box.bottom) / (_SHOWN_RADII * size)
    to_periapsis, onward = _apsis_axes(picture, axes)
    centre = 0.35 * picture.periapsis_km * to_periapsis
    plane = Plane(box, float(centre[0]), float(centre[1]), scale, scale)
    drawing = Drawing(Room(box))

    _draw_disc(sheet, plane, drawing, picture)
    farthest = 3.0 * _SHOWN_RADII * size
    for sign, eccentricity, color in (
        (-1.0, picture.eccentricity_in, BEFORE),
        (1.0, picture.eccentricity_out, AFTER),
    ):
        branch = _branch(picture.periapsis_km, eccentricity, farthest, sign, to_periapsis, onward)
        _draw_branch(sheet, plane, drawing, branch, sign, color)
    corners = _corners(box)
    pointed = min(corners, key=drawing.hidden)
    _draw_pointers(sheet, pointed, axes.turned(picture.sunward))
    measured = min((corner for corner in corners if corner != pointed), key=drawing.hidden)
    _draw_scale(sheet, plane, measured)
    drawing.room.taken += [pointed, measured]
    _draw_periapsis(sheet, plane, drawing, picture, to_periapsis)
    _name_body(sheet, plane, drawing, picture)


def _apsis_axes(picture: FlybyPicture, axes: FlybyAxes) -> tuple[np.ndarray, np.ndarray]:
    """Return the directions (2,) of periapsis and of the motion there, in the plane.

    v∞ in, turned by the half-turn before periapsis (sin δ₁ = 1/e), is the direction of motion at periapsis;
    the turn goes towards the body.
    """
    v_in = axes.turned(picture.v_inf_in)[:2]
    half_turn = axes.turns * np.arcsin(1.0 / picture.eccentricity_in)
    heading = np.arctan2(v_in[1], v_in[0]) + half_turn
    onward = np.array([np.cos(heading), np.sin(heading)])
    return axes.turns * np.array([onward[1], -onward[0]]), onward


def _branch(
    periapsis: float, e: float, farthest: float, sign: float, to_periapsis: np.ndarray, onward: np.ndarray
) -> np.ndarray:
    """Return the branch (k, 2) in km from periapsis (first) out to a distance, before (−1) or after (+1)."""
    p = periapsis * (1.0 + e)
    distance = periapsis + (farthest - periapsis) * np.linspace(0.0, 1.0, 400) ** 2
    anomaly = sign * np.arccos(np.clip((p / distance - 1.0) / e, -1.0, 1.0))
    return distance[:, None] * (np.cos(anomaly)[:, None] * to_periapsis + np.sin(anomaly)[:, None] * onward)


def _draw_branch(
    sheet: Axes, plane: Plane, drawing: Drawing, branch: np.ndarray, sign: float, color: str
) -> None:
    """Draw one branch as far as the box shows it, with an arrow along the flight."""
    for piece in inside_pieces(plane.box, np.column_stack(plane.at(*branch.T)))[:1]:
        add_line(sheet, *piece.T, color=color, linewidth=1.8)
        drawing.add_line(piece)
        along = np.concatenate(([0.0], np.cumsum(np.hypot(*np.diff(piece, axis=0).T))))
        tail, tip = (
            np.array([np.interp(0.62 * along[-1] + shift, along, side) for side in piece.T])
            for shift in (-sign * 0.5 * ARROW_IN, sign * 0.5 * ARROW_IN)
        )
        draw_arrow_head(sheet, tip, tip - tail, ARROW_IN, color)


def _draw_disc(sheet: Axes, plane: Plane, drawing: Drawing, picture: FlybyPicture) -> None:
    x, y = plane.point(0.0, 0.0)
    radius = picture.body_radius_km * plane.x_scale
    disc = Circle((x, y), radius, facecolor=_DISC_FACE, edgecolor=SOFT_INK, linewidth=0.7)
    sheet.add_artist(disc)
    box = plane.box
    window = Rectangle((box.left, box.bottom), box.right - box.left, box.top - box.bottom)
    disc.set_clip_path(window.get_path(), window.get_transform() + sheet.transData)
    drawing.keep_clear(x, y, max(radius, _LEAST_DISC_IN))


def _name_body(sheet: Axes, plane: Plane, drawing: Drawing, picture: FlybyPicture) -> None:
    """Write the body's name in its disc, or beside one that is too small."""
    x, y = plane.point(0.0, 0.0)
    radius = picture.body_radius_km * plane.x_scale
    if radius >= max(_NAME_INSIDE_IN, 0.5 * width_in(picture.body, SMALL_PT) + 0.05):
        halo = [withStroke(linewidth=3.0, foreground=_DISC_FACE)]
        middle = {"ha": "center", "va": "center_baseline", "path_effects": halo}
        put(sheet, x, y, picture.body, SMALL_PT, **middle)
        return
    edges = [(x + radius * np.cos(angle), y + radius * np.sin(angle)) for angle in np.linspace(0.0, 5.5, 8)]
    draw_callout(sheet, drawing, edges, [picture.body], SMALL_PT)


def _draw_periapsis(
    sheet: Axes, plane: Plane, drawing: Drawing, picture: FlybyPicture, to_periapsis: np.ndarray
) -> None:
    """Mark the periapsis, with its radius as a line from the body's centre."""
    x, y = plane.point(*(picture.periapsis_km * to_periapsis))
    centre = plane.point(0.0, 0.0)
    add_line(sheet, [centre[0], x], [centre[1], y], color=SOFT_INK, linewidth=0.7, linestyle=(0, (3, 2)))
    drawing.add_line(np.array([centre, (x, y)]))
    dot = {"linestyle": "", "marker": "o", "markersize": _DOT_PT, "markeredgewidth": 0.0}
    add_line(sheet, [x], [y], color=INK, **dot)
    drawing.keep_clear(x, y, 0.5 * _DOT_PT / POINTS_PER_INCH)
    text = ["periapsis", number_text(picture.periapsis_km, "km")]
    draw_callout(sheet, drawing, [(x, y)], text, SMALL_PT)


def _corners(box: Box) -> list[Box]:
    """Return the corners of a box, from the lower left one, each large enough for scale or pointers."""
    width, height = _CORNER_IN
    return [
        Box(left, bottom, left + width, bottom + height)
        for left in (box.left, box.right - width)
        for bottom in (box.bottom, box.top - height)
    ]


def _draw_scale(sheet: Axes, plane: Plane, corner: Box) -> None:
    """Draw a bar of a round distance in a corner."""
    distance = round_step(_SCALE_IN / plane.x_scale, 1)
    if distance * plane.x_scale > _CORNER_IN[0] - 0.2:
        distance = round_step(0.5 * _SCALE_IN / plane.x_scale, 1)
    length, text = distance * plane.x_scale, number_text(distance, "km")
    left = corner.left + 0.12 if corner.left == plane.box.left else corner.right - 0.12 - length
    y = corner.bottom + 0.13 if corner.bottom == plane.box.bottom else corner.top - 0.30
    add_line(sheet, [left, left + length], [y, y], color=INK, linewidth=1.4, solid_capstyle="butt")
    for x in (left, left + length):
        add_line(sheet, [x, x], [y - 0.03, y + 0.03], color=INK, linewidth=1.0)
    put(sheet, left + 0.5 * length, y + 0.06, text, SMALL_PT, ha="center")


def _draw_pointers(sheet: Axes, corner: Box, sunward: np.ndarray) -> None:
    """Point, in a corner, along the body's motion and towards the Sun, as seen in the plane."""
    start = np.array([corner.left + 0.42 * (corner.right - corner.left), 0.5 * (corner.bottom + corner.top)])
    drawing = Drawing(Room(corner))
    ends = []
    for direction, color in ((np.array([1.0, 0.0]), INK), (sunward[:2], _SUN_INK)):
        end = start + _POINTER_IN * direction
        draw_arrow(sheet, start, end, color, 1.2)
        drawing.add_line(np.stack([start, end]))
        ends.append((float(end[0]), float(end[1])))
    draw_callout(sheet, drawing, ends[:1], ["motion"], SMALL_PT, INK)
    draw_callout(sheet, drawing, ends[1:], ["to the Sun"], SMALL_PT, _SUN_INK)


def _say_why_not(sheet: Axes, box: Box, picture: FlybyPicture) -> None:
    text = f"{picture.body} does not turn this flight: there is no periapsis to draw."
    lines = wrap(text, box.right - box.left - 0.4, SMALL_PT, 3)
    x, y = 0.5 * (box.left + box.right), 0.5 * (box.bottom + box.top)
    put(sheet, x, y, "\n".join(lines), SMALL_PT, color=SOFT_INK, ha="center", va="center")

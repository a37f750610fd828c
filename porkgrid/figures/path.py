"""The path of a candidate about the Sun: from the pole of the ecliptic, from the side, and in numbers."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patheffects import withStroke

from porkgrid.figures.callouts import Drawing, draw_callout
from porkgrid.figures.frame import draw_made_with, draw_titles
from porkgrid.figures.itinerary import LEG_COLOURS, draw_itinerary
from porkgrid.figures.key import Column
from porkgrid.figures.levels import Numbers
from porkgrid.figures.marks import add_line
from porkgrid.figures.placement import Box, Room, place_on_line
from porkgrid.figures.plane import ARROW_IN, Plane, draw_arrow_head, extent, fitted, inside_pieces
from porkgrid.figures.style import BODY_PT, FAINT_INK, INK, SMALL_PT, SOFT_INK, axes_at, new_slide
from porkgrid.figures.text import POINTS_PER_INCH, put, width_in
from porkgrid.physics.constants import AU_KM
from porkgrid.survey.pictures import RoutePicture

_POLE_BOX = Box(0.80, 0.98, 6.80, 6.20)
_SIDE_BOX = Box(7.02, 0.98, 8.97, 6.20)
_COLUMN = (9.38, 13.08, 6.34, 0.55)
_NOTE = (
    "Path about the Sun in the ecliptic and equinox of J2000: two-body arcs between encounters, "
    "and the bodies' orbits as of their first encounter"
)

_X, _Y, _Z = range(3)
_ORBIT_INK = "#8b949e"
_SUN_FACE = "#f2c230"
_DOT_PT, _SUN_PT = 5.5, 8.0
_ARROWS_APART_IN = 3.0
_ARC_WEIGHT = 3  # to labels, which should rather hide an orbit than an arc
_LEAST_TICKS, _MOST_TICKS = 3, 8
_NEAR_IN = 0.15  # the Sun needs no name that is farther from it

_CROP_FROM = 1.6  # how many times larger than the flight alone whole orbits may make the view
_CROP_HEIGHTS_FROM = 2.5
_MARGIN = 0.06
_SIDE_MARGIN = 0.12
_ENLARGEMENTS = (0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0)


def draw_path(picture: RoutePicture) -> Figure:
    """Draw the path of a candidate on a 16:9 slide.

    Left the view from the north pole of the ecliptic, x towards the equinox. Beside it, sharing y, the view
    along x on the edge of the ecliptic, heights enlarged as its axis says. Right the numbers.
    """
    figure, sheet = new_slide()
    first, last = picture.encounters[0], picture.encounters[-1]
    dates = f"leaving {first.date}, arriving {last.date}"
    draw_titles(sheet, picture.title, [picture.route, dates], [_NOTE])
    draw_made_with(sheet, picture.kernel, picture.version, [picture.caution])

    scene = _scene_of(picture)
    pole = fitted(_POLE_BOX, *_frame(scene), _MARGIN)
    side, enlarged = _side_plane(scene, pole)
    _draw_from_the_pole(figure, sheet, scene, pole)
    _draw_from_the_side(figure, sheet, scene, side, enlarged)
    draw_itinerary(Column(sheet, *_COLUMN), picture)
    return figure


def draw_pole_view(figure: Figure, sheet: Axes, picture: RoutePicture, box: Box) -> None:
    """Draw the view from the north pole of the ecliptic alone into a box of a slide."""
    scene = _scene_of(picture)
    _draw_from_the_pole(figure, sheet, scene, fitted(box, *_frame(scene), _MARGIN))


@dataclass(frozen=True, eq=False)
class _Scene:
    """What both views show, in au: lines (3, k), points (3,), with the words beside them."""

    arcs: list[np.ndarray]
    orbits: list[tuple[str, np.ndarray]]
    points: list[np.ndarray]
    words: list[list[str]]


def _scene_of(picture: RoutePicture) -> _Scene:
    return _Scene(
        arcs=[arc.path / AU_KM for arc in picture.arcs],
        orbits=[(orbit.title, orbit.path / AU_KM) for orbit in picture.orbits],
        points=[encounter.position / AU_KM for encounter in picture.encounters],
        words=[
            [f"{n} {encounter.title}, {encounter.kind}", encounter.date]
            for n, encounter in enumerate(picture.encounters, start=1)
        ],
    )


def _frame(scene: _Scene) -> tuple[np.ndarray, np.ndarray]:
    """Return the least and greatest x, y to show: flight and Sun, and orbits that are not much larger."""
    sun = np.zeros((3, 1))
    low, high = (side[:2] for side in extent([*scene.arcs, sun]))
    most = _CROP_FROM * float((high - low).max())
    for _, path in scene.orbits:
        orbit_low, orbit_high = (side[:2] for side in extent([path]))
        whole = np.minimum(low, orbit_low), np.maximum(high, orbit_high)
        if float((whole[1] - whole[0]).max()) <= most:
            low, high = whole
    return low, high


def _side_plane(scene: _Scene, pole: Plane) -> tuple[Plane, float]:
    """Return the plane of the side view, which shares y with the view from the pole, and its enlargement."""
    (x_low, x_high), (y_low, y_high) = pole.limits
    height = max(float(np.abs(path[_Z]).max()) for path in scene.arcs)
    most = _CROP_HEIGHTS_FROM * height
    for _, (x, y, z) in scene.orbits:
        seen = (x >= x_low) & (x <= x_high) & (y >= y_low) & (y <= y_high)
        orbit_height = float(np.abs(z[seen]).max(initial=0.0))
        height = max(height, orbit_height if orbit_height <= most else 0.0)
    room = (0.5 - _SIDE_MARGIN) * (_SIDE_BOX.right - _SIDE_BOX.left)
    fitting = [each for each in _ENLARGEMENTS if each * height * pole.y_scale <= room]
    enlarged = fitting[-1] if fitting else _ENLARGEMENTS[0]
    return Plane(_SIDE_BOX, 0.0, pole.y0, enlarged * pole.y_scale, pole.y_scale), enlarged


def _draw_from_the_pole(figure: Figure, sheet: Axes, scene: _Scene, plane: Plane) -> None:
    """Draw the main view, with every encounter named and dated."""
    axes = _axes_of(figure, plane)
    _mark(axes, plane)
    axes.set_xlabel("x (au)", fontsize=BODY_PT, labelpad=2.0)
    axes.set_ylabel("y (au)", fontsize=BODY_PT, labelpad=2.0)
    _caption(sheet, plane.box, "seen from the north pole of the ecliptic")

    drawing = _draw_lines(axes, sheet, scene, plane, (_X, _Y))
    for words, point in zip(scene.words, scene.points, strict=True):
        draw_callout(sheet, drawing, [plane.point(point[_X], point[_Y])], words, SMALL_PT, INK, "bold")
    draw_callout(sheet, drawing, [plane.point(0.0, 0.0)], ["Sun"], SMALL_PT, SOFT_INK, reach_in=_NEAR_IN)
    for title, path in scene.orbits:
        _name_orbit(sheet, drawing.room, plane, title, path)


def _draw_from_the_side(figure: Figure, sheet: Axes, scene: _Scene, plane: Plane, enlarged: float) -> None:
    """Draw the view along x, encounters by number."""
    axes = _axes_of(figure, plane)
    _mark(axes, plane)
    axes.set_yticklabels([])
    times = "" if enlarged == 1.0 else f"{enlarged:g} × "
    axes.set_xlabel(f"z (au), {times}the scale of y", fontsize=BODY_PT, labelpad=2.0)
    _caption(sheet, plane.box, "seen along +x, edge on")
    axes.axvline(0.0, color=FAINT_INK, linewidth=0.6, linestyle=(0, (5, 3)))

    drawing = _draw_lines(axes, sheet, scene, plane, (_Z, _Y))
    for n, point in enumerate(scene.points, start=1):
        draw_callout(sheet, drawing, [plane.point(point[_Z], point[_Y])], [str(n)], SMALL_PT, INK, "bold")


def _axes_of(figure: Figure, plane: Plane) -> Axes:
    box = plane.box
    axes = axes_at(figure, box.left, box.bottom, box.right - box.left, box.top - box.bottom)
    axes.set(xlim=plane.limits[0], ylim=plane.limits[1])
    return axes


def _mark(axes: Axes, plane: Plane) -> None:
    """Put round distances on both axes, about one an inch, three at least."""
    lengths = plane.box.right - plane.box.left, plane.box.top - plane.box.bottom
    for axis, limits, length in zip((axes.xaxis, axes.yaxis), plane.limits, lengths, strict=True):
        for most in range(max(3, round(length)), _MOST_TICKS + 1):
            ticks, texts = Numbers(1.0).ticks(*limits, most)
            if len(ticks) >= _LEAST_TICKS:
                break
        axis.set_ticks(ticks, labels=texts)


def _caption(sheet: Axes, box: Box, text: str) -> None:
    put(sheet, box.left, box.top + 0.06, text, SMALL_PT, color=SOFT_INK)


def _draw_lines(axes: Axes, sheet: Axes, scene: _Scene, plane: Plane, sides: tuple[int, int]) -> Drawing:
    """Draw orbits, arcs with arrows, the Sun and a dot per encounter; return what labels must keep clear of.

    sides: which coordinates run right and up.
    """
    drawing = Drawing(Room(plane.box))
    for _, path in scene.orbits:
        _draw_line(axes, drawing, plane, path[list(sides)], 1, color=_ORBIT_INK, linewidth=0.8)
    for k, path in enumerate(scene.arcs):
        color = LEG_COLOURS[k % len(LEG_COLOURS)]
        _draw_line(axes, drawing, plane, path[list(sides)], _ARC_WEIGHT, color=color, linewidth=1.7)
        _draw_direction(sheet, np.column_stack(plane.at(*path[list(sides)])), color)
    round_mark = {"linestyle": "", "marker": "o", "markeredgecolor": INK, "markeredgewidth": 0.6}
    add_line(axes, [0.0], [0.0], color=_SUN_FACE, markersize=_SUN_PT, **round_mark)
    drawing.keep_clear(*plane.point(0.0, 0.0), 0.5 * _SUN_PT / POINTS_PER_INCH)
    for point in scene.points:
        x, y = point[list(sides)]
        add_line(axes, [x], [y], color=INK, markersize=_DOT_PT, zorder=4, **round_mark)
        drawing.keep_clear(*plane.point(x, y), 0.5 * _DOT_PT / POINTS_PER_INCH)
    return drawing


def _draw_line(
    axes: Axes, drawing: Drawing, plane: Plane, line: np.ndarray, weight: int, **style: object
) -> None:
    add_line(axes, line[0], line[1], solid_joinstyle="round", **style)
    for piece in inside_pieces(plane.box, np.column_stack(plane.at(*line))):
        drawing.add_line(piece, weight)


def _draw_direction(sheet: Axes, line: np.ndarray, color: str) -> None:
    """Put arrow heads along a line (k, 2) in inches, in the direction of flight."""
    along = np.concatenate(([0.0], np.cumsum(np.hypot(*np.diff(line, axis=0).T))))
    head = min(ARROW_IN, 0.2 * along[-1])
    count = max(1, round(along[-1] / _ARROWS_APART_IN))
    for middle in (np.arange(count) + 0.5) / count * along[-1]:
        tail, tip = (
            np.array([np.interp(at, along, side) for side in line.T])
            for at in (middle - 0.5 * head, middle + 0.5 * head)
        )
        draw_arrow_head(sheet, tip, tip - tail, head, color)


def _name_orbit(sheet: Axes, room: Room, plane: Plane, title: str, path: np.ndarray) -> None:
    """Write a body's title on its orbit where there is a free and nearly straight piece of it."""
    pieces: Sequence[np.ndarray] = inside_pieces(plane.box, np.column_stack(plane.at(path[_X], path[_Y])))
    for piece in sorted(pieces, key=len, reverse=True):
        place = place_on_line(piece, width_in(title, SMALL_PT), SMALL_PT / POINTS_PER_INCH, room)
        if place is not None:
            x, y, angle = place
            halo = [withStroke(linewidth=2.2, foreground="white")]
            turned = {"rotation": angle, "rotation_mode": "anchor", "ha": "center", "va": "center_baseline"}
            put(sheet, x, y, title, SMALL_PT, color=SOFT_INK, path_effects=halo, **turned)
            return

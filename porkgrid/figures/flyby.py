"""One flyby: its velocities as vectors to scale, the passage of the body to scale, and the numbers."""

from __future__ import annotations

import numpy as np
from matplotlib.figure import Figure

from porkgrid.figures.frame import draw_made_with, draw_titles
from porkgrid.figures.key import Column
from porkgrid.figures.numbers import Pair, draw_list, number_text
from porkgrid.figures.passage import draw_passage
from porkgrid.figures.placement import Box
from porkgrid.figures.style import new_slide
from porkgrid.figures.vectors import draw_vectors, flyby_axes, out_of_plane_deg
from porkgrid.physics.flyby import turn_angle
from porkgrid.survey.pictures import FlybyPicture

_VECTORS_BOX = Box(0.30, 0.62, 8.97, 6.20)
_PASSAGE_BOX = Box(9.38, 3.02, 13.08, 6.20)
_COLUMN = (9.38, 13.08, 2.90, 0.55)
_NOTE = (
    "Patched conics: velocities relative to the body at infinity (v∞) and about the Sun, "
    "as arrows to one scale; B-plane to the pole of the ecliptic of J2000"
)


def draw_flyby(picture: FlybyPicture) -> Figure:
    """Draw one flyby of a candidate on a 16:9 slide.

    Left the vector diagram to scale, square to the plane of the flyby, where v∞ and the turn are seen in
    true size, and on its edge. Right the hyperbola with the body's disc to scale, and the numbers.
    """
    figure, sheet = new_slide()
    draw_titles(sheet, picture.title, [picture.route, *_headline(picture)], [_NOTE])
    draw_made_with(sheet, picture.kernel, picture.version, [picture.caution])
    axes = flyby_axes(picture)
    draw_vectors(sheet, _VECTORS_BOX, picture, axes)
    draw_passage(sheet, _PASSAGE_BOX, picture, axes)
    column = Column(sheet, *_COLUMN)
    column.heading(f"Flyby {picture.number}: {picture.body}, {picture.date}")
    draw_list(column, _pairs(picture, out_of_plane_deg(picture, axes)))
    return figure


def _headline(picture: FlybyPicture) -> list[str]:
    altitude = number_text(picture.altitude_km, "km")
    turn = number_text(float(np.degrees(picture.turn_rad)), "deg")
    return [
        f"flyby {picture.number}: {picture.body} on {picture.date}",
        f"turns v∞ by {turn} at {altitude} altitude",
        f"heliocentric speed {_signed(picture.gain_km_s, 'km/s')}",
    ]


def _pairs(picture: FlybyPicture, out_of_plane: float) -> list[Pair]:
    """Return the rows of the table."""
    radius = number_text(picture.body_radius_km, "km")
    burn = number_text(picture.burn_km_s, "km/s")
    faster = np.linalg.norm(picture.v_inf_out) > np.linalg.norm(picture.v_inf_in)
    way = "along" if faster else "against"
    e_in, e_out = (f"{e:.3f}" for e in (picture.eccentricity_in, picture.eccentricity_out))
    heliocentric_turn = float(np.degrees(turn_angle(picture.v_in, picture.v_out)))
    speeds = (
        (f"{picture.body}'s speed about the Sun", float(np.linalg.norm(picture.body_velocity))),
        ("v∞ before", float(np.linalg.norm(picture.v_inf_in))),
        ("v∞ after", float(np.linalg.norm(picture.v_inf_out))),
        ("heliocentric speed before", picture.speed_in_km_s),
        ("heliocentric speed after", picture.speed_out_km_s),
    )
    return [
        *(Pair(label, number_text(speed, "km/s")) for label, speed in speeds),
        Pair("gain of heliocentric speed", _signed(picture.gain_km_s, "km/s")),
        Pair("turn of v∞", number_text(float(np.degrees(picture.turn_rad)), "deg")),
        Pair("turn of the heliocentric velocity", number_text(heliocentric_turn, "deg")),
        Pair("periapsis radius", number_text(picture.periapsis_km, "km")),
        Pair(f"altitude over {radius}", number_text(picture.altitude_km, "km")),
        Pair(f"burn at periapsis, {way} the velocity", burn),
        Pair("eccentricity before, after", f"{e_in}, {e_out}"),
        Pair("B·T, B·R", f"{number_text(picture.b_t_km, 'km')}, {number_text(picture.b_r_km, 'km')}"),
        Pair(f"{picture.body}'s motion out of the plane", number_text(out_of_plane, "deg")),
    ]


def _signed(value: float, unit: str) -> str:
    text = number_text(value, unit)
    return f"+{text}" if value > 0.0 else text

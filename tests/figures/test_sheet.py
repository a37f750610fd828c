"""The one-page sheet shows the flight over time as it is, and no text stands on another."""

from __future__ import annotations

import xml.etree.ElementTree as ET
from collections.abc import Callable
from dataclasses import replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest
from handoff_flights import candidate_of, trajectory_of
from matplotlib.figure import Figure
from matplotlib.patches import Rectangle
from picture_routes import flight_of

from porkgrid.figures.overtime import SheetBurn
from porkgrid.figures.sheet import CheckRow, ReviewSheet, SheetCheck, draw_sheet
from porkgrid.figures.style import save_figure
from porkgrid.handoff.conicpath import patched_trajectory
from porkgrid.handoff.sunpath import sun_path
from porkgrid.handoff.trajectory import Trajectory
from porkgrid.physics.constants import AU_KM
from porkgrid.survey.candidates import Picked
from porkgrid.survey.legs import LegOption
from porkgrid.survey.pictures import Number, RoutePicture, route_picture
from porkgrid.survey.sightlines import CONJUNCTION_RAD, Sightlines, conjunctions, sightlines

HANDED_OFF = ["direct", "bare", "one flyby", "two flybys"]
OTHERS = ["one revolution", "elements", "mercury", "neptune", "crowded"]
UNIX_EPOCH_JD = 2_440_587.5


@cache
def flown(name: str) -> tuple[RoutePicture, Sightlines, Trajectory]:
    if name in HANDED_OFF:
        (plan, picked), trajectory = candidate_of(name), trajectory_of(name)
    else:
        flight = flight_of(name)
        ways = (LegOption(revs, way > 0) for revs, way in zip(flight.revs, flight.branches, strict=True))
        plan, picked = flight.plan, Picked(flight.epochs, tuple(ways))
        trajectory = patched_trajectory(plan, picked, (), ())
    options = [each.revs for each in picked.options], [each.branch for each in picked.options]
    picture = route_picture(plan, picked.epochs, *options)
    return picture, sightlines(plan.ephemeris, *sun_path(trajectory)), trajectory


def burns_of(name: str) -> list[SheetBurn]:
    return [SheetBurn(each.label, each.jd_tdb, each.size_km_s) for each in flown(name)[2].burns]


MASSES = [Number("propellant", 6703.4, "kg"), Number("mass in low orbit", 7603.0, "kg")]


CHECK = SheetCheck(
    "confirmed with changes",
    (
        CheckRow("$C_3$", 14.0316, 14.0646, "km²/s²"),
        CheckRow("DLA", 31.84, 31.98, "deg"),
        CheckRow("flyby 1 altitude", 5737.4, 5416.8, "km"),
        CheckRow(r"arrival $v_\infty$", 5.5765, 5.5785, "km/s"),
        CheckRow(r"total $\Delta v$", 6.6965, 6.7026, "km/s"),
    ),
)


@cache
def sheet_of(name: str) -> Figure:
    picture, seen, trajectory = flown(name)
    masses, check = (MASSES, CHECK) if name in ("one flyby", "crowded") else ([], None)
    return draw_sheet(ReviewSheet(picture, seen, burns_of(name), masses, trajectory.model, check))


def texts_of(figure: Figure, placed_texts: Callable) -> list[str]:
    return [text.get_text() for text, _ in placed_texts(figure)]


@pytest.mark.parametrize("name", [*HANDED_OFF, *OTHERS])
def test_no_text_stands_on_another_or_leaves_the_slide(
    name: str, placed_texts: Callable, overlapping: Callable
) -> None:
    figure = sheet_of(name)
    placed = placed_texts(figure)
    assert overlapping(placed) == []
    assert min(text.get_fontsize() for text, _ in placed) >= 8.0
    width, height = figure.bbox.size
    outside = [t.get_text() for t, b in placed if b.x0 < 0 or b.y0 < 0 or b.x1 > width or b.y1 > height]
    assert outside == []


@pytest.mark.parametrize("name", HANDED_OFF)
def test_the_strips_draw_the_distances_and_the_angle(name: str) -> None:
    _, seen, _ = flown(name)
    _, _, distances, angle = sheet_of(name).axes
    drawn = [
        np.asarray(line.get_ydata()) for line in distances.lines if len(line.get_xdata()) == len(seen.jd_tdb)
    ]
    assert len(drawn) == 2
    assert np.allclose(drawn[0], seen.sun_km / AU_KM)
    assert np.allclose(drawn[1], seen.earth_km / AU_KM)
    (curve,) = [line for line in angle.lines if len(line.get_xdata()) == len(seen.jd_tdb)]
    assert np.allclose(curve.get_ydata(), np.degrees(seen.angle_rad), equal_nan=True)
    assert np.allclose(curve.get_xdata(), seen.jd_tdb - UNIX_EPOCH_JD)


@pytest.mark.parametrize("name", HANDED_OFF)
def test_both_strips_share_the_time_axis_and_hold_all_that_they_draw(name: str) -> None:
    _, seen, _ = flown(name)
    _, _, distances, angle = sheet_of(name).axes
    assert distances.get_xlim() == angle.get_xlim()
    low, high = angle.get_xlim()
    assert low < seen.jd_tdb[0] - UNIX_EPOCH_JD
    assert seen.jd_tdb[-1] - UNIX_EPOCH_JD < high
    assert distances.get_ylim()[0] == 0.0
    assert distances.get_ylim()[1] > max(seen.sun_km.max(), seen.earth_km.max()) / AU_KM


@pytest.mark.parametrize("name", ["direct", "two flybys", "one revolution"])
def test_conjunctions_are_shaded_where_they_are_and_listed(name: str, placed_texts: Callable) -> None:
    near = conjunctions(flown(name)[1], CONJUNCTION_RAD)
    angle = sheet_of(name).axes[-1]
    shades = sorted(
        (each for each in angle.patches if isinstance(each, Rectangle) and each.get_alpha() == 0.25),
        key=lambda each: each.get_x(),
    )
    assert len(shades) == len(near)
    for shade, each in zip(shades, near, strict=True):
        assert shade.get_x() <= each.first_jd - UNIX_EPOCH_JD + 1e-9
        assert shade.get_x() + shade.get_width() >= each.last_jd - UNIX_EPOCH_JD - 1e-9
    texts = texts_of(sheet_of(name), placed_texts)
    least = [f"{np.degrees(each.least_rad):.1f}°" for each in near]
    assert all(text in texts for text in least)
    assert any(text.startswith("within 3° of the Sun" if near else "never within 3°") for text in texts)


def test_some_of_these_flights_have_conjunctions() -> None:
    assert len(conjunctions(flown("two flybys")[1], CONJUNCTION_RAD)) > 3
    assert conjunctions(flown("direct")[1], CONJUNCTION_RAD) == []


@pytest.mark.parametrize("name", HANDED_OFF)
def test_encounters_and_burns_stand_on_the_time_line(name: str, placed_texts: Callable) -> None:
    figure, (picture, _, trajectory) = sheet_of(name), flown(name)
    placed = [(text.get_text(), text.get_position()[0]) for text, _ in placed_texts(figure)]
    strip = figure.axes[-1]
    (low, high), box = strip.get_xlim(), strip.get_window_extent()
    left, right = box.x0 / figure.dpi, box.x1 / figure.dpi

    def expected(jd: float) -> float:
        return left + (jd - UNIX_EPOCH_JD - low) / (high - low) * (right - left)

    marks = [(f"{n} {each.title}", k.jd_tdb) for n, (each, k) in enumerate(
        zip(picture.encounters, trajectory.encounters, strict=True), start=1
    )]  # fmt: skip
    marks += [(f"{burn.size_km_s:.3f}", burn.jd_tdb) for burn in trajectory.burns]
    for text, jd in marks:
        (x,) = [x for said, x in placed if said == text]
        assert x == pytest.approx(expected(jd), abs=0.35)  # those at the ends are moved inwards


def test_burns_and_masses_are_listed(placed_texts: Callable) -> None:
    texts = texts_of(sheet_of("one flyby"), placed_texts)
    for burn in burns_of("one flyby"):
        assert any(text.startswith(f"{burn.label}, 20") for text in texts)
    assert "propellant" in texts
    assert "6\u2009703 kg" in texts
    assert "Burns and masses" in texts
    assert any("no burn that is counted" in text for text in texts_of(sheet_of("bare"), placed_texts))


def test_the_check_is_in_the_headline_and_compared_where_there_is_room(placed_texts: Callable) -> None:
    texts = texts_of(sheet_of("one flyby"), placed_texts)
    assert any(text.endswith("full-force check: confirmed with changes") for text in texts)
    for said in ("C3", "14.03 km²/s²", "14.06 km²/s²", "5\u2009737 km", "5\u2009417 km", "31.8°", "32.0°"):
        assert said in texts
    assert not any("full-force" in text for text in texts_of(sheet_of("direct"), placed_texts))
    crowded = texts_of(sheet_of("crowded"), placed_texts)
    assert any(text.endswith("full-force check: confirmed with changes") for text in crowded)


def test_what_has_no_room_is_counted(placed_texts: Callable, overlapping: Callable) -> None:
    picture, seen, trajectory = flown("two flybys")
    many = [replace(burns_of("two flybys")[0], label=f"Trim {n}") for n in range(30)]
    placed = placed_texts(draw_sheet(ReviewSheet(picture, seen, many, MASSES, trajectory.model)))
    texts = [text.get_text() for text, _ in placed]
    listed = sum(text.startswith("Trim") for text in texts)
    assert f"… and {32 - listed} more in the target sheet" in texts
    assert 0 < listed < 10


def test_the_sheet_says_its_model_and_the_caution(placed_texts: Callable) -> None:
    picture, _, trajectory = flown("direct")
    texts = texts_of(sheet_of("direct"), placed_texts)
    assert f"Model: {trajectory.model}" in texts
    assert picture.caution in " ".join(texts)


def test_pdf_and_svg_are_whole_and_the_same_each_time(tmp_path: Path) -> None:
    picture, seen, trajectory = flown("direct")
    review = ReviewSheet(picture, seen, burns_of("direct"), [], trajectory.model)
    first, second = (save_figure(draw_sheet(review), tmp_path / stem, ["pdf", "svg"]) for stem in "ab")
    assert [path.suffix for path in first] == [".pdf", ".svg"]
    assert first[0].read_bytes().startswith(b"%PDF-")
    assert first[0].read_bytes().rstrip().endswith(b"%%EOF")
    assert ET.parse(first[1]).getroot().tag.endswith("svg")
    for one, other in zip(first, second, strict=True):
        assert one.read_bytes() == other.read_bytes()

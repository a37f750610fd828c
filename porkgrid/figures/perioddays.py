"""The days of a launch period one by one: panels of cost, departure, arrival, burns and mass."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import partial
from typing import Any

import numpy as np
import pandas as pd
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from porkgrid.figures.dates import date_ticks, dates_from_iso, days_from_dates
from porkgrid.figures.marks import add_line, add_rectangle
from porkgrid.figures.periodaxis import mark_measure, mark_values, measure_text, reach
from porkgrid.figures.placement import Box
from porkgrid.figures.style import ACCENT, BODY_PT, SMALL_PT, SOFT_INK, axes_at
from porkgrid.figures.text import put, width_in
from porkgrid.survey.measures import Measure
from porkgrid.survey.period import LaunchPeriod

DAY_INK = "#2b59c3"
_SECOND_INK = "#b35900"  # with hollow squares, so that it is told apart without colour and hides nothing
_BAND = "#eef2fb"
# Okabe and Ito (2008), "Color Universal Design": departure, flybys in turn, and capture
_DEPARTURE_COLOUR, _CAPTURE_COLOUR = "#0072b2", "#009e73"
_FLYBY_COLOURS = ("#e69f00", "#cc79a7", "#f0e442", "#56b4e9")
_GAP_IN = 0.30  # between panels; burns are named in it
_TICK_ROOM_IN = 0.95
_MASSES = ("delivered_mass_kg", "low_orbit_mass_kg")
_FAINT = 0.35
_DOT_PT, _RING_PT = 3.8, 9.0
_BAR = 0.78  # of the distance between days
_SWATCH_IN = 0.12


@dataclass(frozen=True, eq=False)
class _Scene:
    """What a panel shows: days (k,) since 1970 with their rows of the tables, and its place in inches.

    own: (k,) where a day is of the period. pitch: distance between days.
    """

    sheet: Axes
    axes: Axes
    box: Box
    x: np.ndarray
    rows: pd.DataFrame
    own: np.ndarray
    pitch: float


def draw_days(
    figure: Figure,
    sheet: Axes,
    box: Box,
    measures: Mapping[str, Measure],
    period: LaunchPeriod,
    neighbours: pd.DataFrame,
) -> None:
    """Draw panels over the same departure dates, one above the other, of what the route has."""
    rows = pd.concat([period.table, neighbours]) if len(neighbours) else period.table
    x = days_from_dates(dates_from_iso(rows["departure"]))
    own = np.arange(len(rows)) < len(period.table)
    pitch = float(np.diff(np.sort(x)).min()) if len(x) > 1 else 1.0
    panels = _panels(measures, period)
    height = (box.top - box.bottom - (len(panels) - 1) * _GAP_IN) / len(panels)
    for n, draw in enumerate(panels):
        top = box.top - n * (height + _GAP_IN)
        place = Box(box.left, top - height, box.right, top)
        axes = axes_at(figure, place.left, place.bottom, place.right - place.left, height)
        axes.set_xlim(x.min() - pitch, x.max() + pitch)
        mark_period(axes, x[own], pitch)
        ticks, labels = date_ticks(*axes.get_xlim(), most=int((box.right - box.left) / _TICK_ROOM_IN))
        axes.set_xticks(ticks, labels if n == len(panels) - 1 else [""] * len(labels))
        draw(_Scene(sheet, axes, place, x, rows, own, pitch))
    axes.set_xlabel("departure date (TDB)", fontsize=BODY_PT, labelpad=2.0)


def mark_period(axes: Axes, x: np.ndarray, pitch: float) -> None:
    """Tint the span of the days of a period."""
    first, last = x.min() - 0.5 * pitch, x.max() + 0.5 * pitch
    add_rectangle(
        axes,
        first,
        0.0,
        last - first,
        1.0,
        color=_BAND,
        linewidth=0,
        zorder=0,
        transform=axes.get_xaxis_transform(),
    )


def _panels(measures: Mapping[str, Measure], period: LaunchPeriod) -> list[Callable[[_Scene], None]]:
    """The panels that a route has: the measure chosen, departure, arrival, burns, and a mass."""
    by, c3 = measures[period.by], measures["c3_km2_s2"]
    panels: list[Callable[[_Scene], None]] = []
    worst = period.table["departure"].tolist().index(period.worst_on)
    if by.name != c3.name:
        panels.append(partial(_draw_measure, measure=by, worst=worst))
    dla = measures.get("dla_deg")
    panels.append(partial(_draw_departure, c3=c3, dla=dla, worst=worst if by.name == c3.name else None))
    panels.append(partial(_draw_arrival, arrival=measures["arrival_epoch_jd_tdb"]))
    burns = _burns(measures)
    if burns:
        panels.append(partial(_draw_burns, burns=burns))
    mass = next((measures[name] for name in _MASSES if name in measures and name != by.name), None)
    if mass is not None:
        panels.append(partial(_draw_measure, measure=mass, worst=None))
    return panels


def _burns(measures: Mapping[str, Measure]) -> list[tuple[str, str, str]]:
    """Name, words and colour of each manoeuvre's burn, in flying order."""
    found = [("dv_departure_km_s", "departure", _DEPARTURE_COLOUR)]
    found += [
        (f"flyby{n}_burn_km_s", f"flyby {n}", colour) for n, colour in enumerate(_FLYBY_COLOURS, start=1)
    ]
    found += [("dv_capture_km_s", "capture", _CAPTURE_COLOUR)]
    there = [each for each in found if each[0] in measures]
    return there if any(name.startswith("dv_") for name, _, _ in there) else []


def _draw_measure(scene: _Scene, measure: Measure, worst: int | None) -> None:
    values = mark_measure(scene.axes, scene.rows[measure.name].to_numpy(), scene.box, measure)
    _dots(scene.axes, scene, values, DAY_INK, "o")
    if worst is not None:
        _ring(scene, values, worst, measure)


def _draw_departure(scene: _Scene, c3: Measure, dla: Measure | None, worst: int | None) -> None:
    """C3 on the left, and the declination of the asymptote on the right."""
    _draw_measure(scene, c3, worst)
    if dla is None:
        return
    right = scene.axes.twinx()
    right.set_autoscale_on(False)
    right.tick_params(
        labelsize=SMALL_PT, color=SOFT_INK, labelcolor=_SECOND_INK, length=3, width=0.6, pad=2.5
    )
    for spine in right.spines.values():
        spine.set_visible(False)
    values = scene.rows[dla.name].to_numpy()
    mark_values(right, reach(values), scene.box, f"□ {dla.symbol}", dla.unit)
    right.yaxis.label.set_color(_SECOND_INK)
    scene.axes.yaxis.label.set_text(f"● {scene.axes.yaxis.label.get_text()}")
    scene.axes.yaxis.label.set_color(DAY_INK)
    right.grid(False)
    _dots(right, scene, values, _SECOND_INK, "s")


def _draw_arrival(scene: _Scene, arrival: Measure) -> None:
    epochs = scene.rows[arrival.name].to_numpy()
    _dots(scene.axes, scene, mark_measure(scene.axes, epochs, scene.box, arrival), DAY_INK, "o")


def _draw_burns(scene: _Scene, burns: list[tuple[str, str, str]]) -> None:
    """The burns of each day stacked in flying order from the bottom; named above the panel."""
    base = np.zeros(len(scene.x))
    values = [scene.rows[name].to_numpy() for name, _, _ in burns]
    top = float(np.nansum(values, axis=0).max())
    mark_values(scene.axes, (0.0, 1.08 * top), scene.box, "Δv", "km/s")
    for (_, _, colour), height in zip(burns, values, strict=True):
        for x, bottom, tall, own in zip(scene.x, base, height, scene.own, strict=True):
            width = _BAR * scene.pitch
            alpha = 1.0 if own else _FAINT
            add_rectangle(
                scene.axes,
                x - 0.5 * width,
                bottom,
                width,
                tall,
                facecolor=colour,
                alpha=alpha,
                linewidth=0,
                zorder=2,
            )
        base = base + height
    left = scene.box.left
    for _, words, colour in burns:
        y = scene.box.top + 0.07
        add_rectangle(scene.sheet, left, y, _SWATCH_IN, _SWATCH_IN, facecolor=colour, linewidth=0)
        put(scene.sheet, left + _SWATCH_IN + 0.06, y + 0.01, words, SMALL_PT)
        left += _SWATCH_IN + 0.06 + width_in(words, SMALL_PT) + 0.22


def _dots(axes: Axes, scene: _Scene, values: np.ndarray, colour: str, marker: str) -> None:
    for which, alpha in ((~scene.own, _FAINT), (scene.own, 1.0)):
        face = colour if marker == "o" else "none"
        style = {"linestyle": "none", "marker": marker, "markersize": _DOT_PT, "markerfacecolor": face}
        add_line(axes, scene.x[which], values[which], color=colour, alpha=alpha, zorder=3, **style)


def _ring(scene: _Scene, values: np.ndarray, worst: int, measure: Measure) -> None:
    """Ring the worst day, and name it above the panel."""
    ring: dict[str, Any] = {"marker": "o", "markersize": _RING_PT, "markerfacecolor": "none"}
    at = [scene.x[worst]], [values[worst]]
    add_line(scene.axes, *at, linestyle="none", markeredgecolor=ACCENT, markeredgewidth=1.4, zorder=4, **ring)
    row = scene.rows.iloc[worst]
    text = f"worst day: {row['departure']}, {measure_text(measure, row[measure.name])}"
    put(scene.sheet, scene.box.right, scene.box.top + 0.06, text, SMALL_PT, color=ACCENT, ha="right")

"""Routes side by side: burns stacked in flying order, flight time, arrival speed and masses, a row each."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patheffects import withStroke

from porkgrid.figures.frame import LEFT_IN, NOTE_PT, RIGHT_IN, TITLE_SIZES_PT, draw_footer, draw_titles
from porkgrid.figures.levels import Numbers
from porkgrid.figures.marks import add_line, add_rectangle
from porkgrid.figures.numbers import number_text
from porkgrid.figures.palette import LIMIT_COLOURS
from porkgrid.figures.style import BODY_PT, FAINT_INK, INK, SMALL_PT, SOFT_INK, new_slide
from porkgrid.figures.text import line_height_in, one_line, put, shorten, width_in, wrap
from porkgrid.survey.compare import Comparison, Entry, burn_split

_TOP, _BOTTOM = 5.90, 0.95  # of the rows
_KEY_Y = 6.26
_NAMES_RIGHT = 3.55
_PANELS_LEFT, _GAP = 3.75, 0.34
_WIDE = 2.6  # the first panel against one of the others
_MOST_ROWS = 12
_HIGHEST_ROW = 1.15
_BAR, _THICKEST_IN = 0.5, 0.34  # of a row's height, and at most
_VALUE_ROOM = 0.58  # behind a bar, for its value
_MOST_TICKS, _LEAST_TICK_ROOM = 5, 0.28
_LINE = line_height_in(SMALL_PT)
_BOLD = 1.18  # width of bold letters against plain ones
_BAR_OF_SURVEY, _BAR_OF_BASELINE = "#4a6d8c", "#c3cad2"
_TOTAL = "dv_total_km_s"
_HALO = [withStroke(linewidth=2.0, foreground="white")]  # of a value that stands on a line of the scale

# Okabe and Ito's colours: told apart by colour-blind readers, and by lightness in grey print.
_COLOURS = {
    "departure": LIMIT_COLOURS[1],
    "flyby": LIMIT_COLOURS[0],
    "deep space": LIMIT_COLOURS[2],
    "capture": LIMIT_COLOURS[5],
}
_KINDS = {
    "departure": "departure",
    "flyby": "flyby burns",
    "deep space": "deep-space burn",
    "capture": "capture",
}
_TITLES = {
    _TOTAL: "Δv by manoeuvre",
    "c3_km2_s2": "C3",
    "tof_days": "flight time",
    "v_inf_arrival_km_s": "arrival v∞",
    "propellant_kg": "propellant",
    "delivered_mass_kg": "delivered",
    "low_orbit_mass_kg": "in low orbit",
    "injected_mass_kg": "injected",
}
_MOST_MASSES = 2


@dataclass(frozen=True)
class _Row:
    """A route of the figure: its name and lines under it, the measures of its best dates, what it is.

    dearest: total Δv on the dearest day of its launch period, or None.
    """

    name: str
    lines: tuple[str, ...]
    measures: Mapping[str, Any]
    survey: bool
    dearest: float | None = None


@dataclass(frozen=True)
class _Panel:
    """A panel of bars: its measure and unit, its place in inches, and how much of the measure an inch is."""

    name: str
    unit: str
    left: float
    right: float
    per_inch: float


def draw_comparison(comparison: Comparison) -> Figure:
    """Draw a comparison on a 16:9 slide: a row for each survey, then for each baseline."""
    figure, sheet = new_slide()
    every = _rows(comparison)
    rows = every[:_MOST_ROWS]
    height = min((_TOP - _BOTTOM) / len(rows), _HIGHEST_ROW)
    days = f"{comparison.days} day{'s' if comparison.days > 1 else ''}"
    headline = f"best candidate of each, and its best launch period of {days}"
    draw_titles(sheet, _title(comparison), [headline], _notes(comparison))
    draw_footer(sheet, comparison.entries[0].survey.grid)
    panels = _panels(comparison, rows)
    for panel in panels:
        _draw_panel(sheet, panel, rows, height)
    for number, row in enumerate(rows):
        _draw_name(sheet, row, _TOP - number * height, height)
    _draw_rule(sheet, rows, height)
    _draw_key(sheet, panels[0], rows)
    if len(every) > len(rows):
        rest = f"… and {len(every) - len(rows)} more in comparison.csv"
        put(sheet, LEFT_IN, _BOTTOM - 0.22, rest, SMALL_PT, color=SOFT_INK)
    return figure


def _title(comparison: Comparison) -> str:
    """The names of the routes, or how many they are where a line does not hold the names."""
    names = " · ".join(one_line(entry.name) for entry in comparison.entries)
    fits = width_in(names, TITLE_SIZES_PT[-1], "bold") <= RIGHT_IN - LEFT_IN
    return names if fits else f"{len(comparison.entries)} routes side by side"


def _rows(comparison: Comparison) -> list[_Row]:
    rows = [_survey_row(entry) for entry in comparison.entries]
    for yardstick in comparison.yardsticks:
        for each in yardstick.baselines:
            dates = "" if each.departure is None else f"{each.departure[:10]} → {(each.arrival or '')[:10]}"
            name = f"{each.title[:1].upper()}{each.title[1:]}, {yardstick.route}"
            lines = tuple(line for line in (dates, each.meaning) if line)
            rows.append(_Row(name, lines, each.measures, survey=False))
    return rows


def _survey_row(entry: Entry) -> _Row:
    route = entry.survey.plan.route
    if entry.best is None:
        return _Row(entry.name, ("no dates are allowed", route), {}, survey=True)
    dates = f"{str(entry.best['departure'])[:10]} → {str(entry.best['arrival'])[:10]}"
    if entry.period is None:
        return _Row(entry.name, (dates, f"launch period: {entry.no_period}", route), entry.best, survey=True)
    period = f"launch period {entry.period.first[:10]} – {entry.period.last[:10]}"
    dearest = float(entry.period.table[_TOTAL].max()) if _TOTAL in entry.period.table else None
    return _Row(entry.name, (dates, period, route), entry.best, survey=True, dearest=dearest)


def _notes(comparison: Comparison) -> list[str]:
    """As many of the sentences of answer as have a line each."""
    room = RIGHT_IN - LEFT_IN
    return [shorten(one_line(each), room, NOTE_PT) for each in comparison.sentences[:2]]


def _panels(comparison: Comparison, rows: Sequence[_Row]) -> list[_Panel]:
    """The panels side by side: burns (or C3 where no route has any), flight time, arrival speed, masses."""
    burns = any(_known(row.measures.get(_TOTAL)) for row in rows)
    names = [_TOTAL if burns else "c3_km2_s2", "tof_days", "v_inf_arrival_km_s"]
    masses = [name for name in _TITLES if name.endswith("_kg")]
    names += [name for name in masses if any(_known(row.measures.get(name)) for row in rows)][:_MOST_MASSES]
    room = (RIGHT_IN - _PANELS_LEFT - _GAP * (len(names) - 1)) / (_WIDE + len(names) - 1)
    panels, left = [], _PANELS_LEFT
    for name in names:
        right = left + room * (_WIDE if name == names[0] else 1.0)
        ends = [_end(row, name) for row in rows]
        per_inch = (max((end for end in ends if end is not None), default=0.0) or 1.0) / (
            right - left - _VALUE_ROOM
        )
        panels.append(_Panel(name, comparison.units[name], left, right, per_inch))
        left = right + _GAP
    return panels


def _known(value: Any) -> bool:
    return value is not None and math.isfinite(value)


def _end(row: _Row, name: str) -> float | None:
    """How far a row's bar and its mark reach."""
    value = row.measures.get(name)
    if not _known(value):
        return None
    return max(float(value), row.dearest or 0.0) if name == _TOTAL else float(value)  # type: ignore[arg-type]


def _draw_panel(sheet: Axes, panel: _Panel, rows: Sequence[_Row], height: float) -> None:
    """Draw a panel's title, its scale and its bars."""
    title = f"{_TITLES[panel.name]} ({panel.unit})"
    put(sheet, panel.left, _TOP + 0.10, title, BODY_PT, weight="bold")
    bottom = _TOP - len(rows) * height
    _draw_scale(sheet, panel, bottom)
    thick = min(_BAR * height, _THICKEST_IN)
    for number, row in enumerate(rows):
        middle = _TOP - (number + 0.5) * height
        end = _end(row, panel.name)
        if end is None:
            put(sheet, panel.left + 0.06, middle, "–", SMALL_PT, color=SOFT_INK, va="center")
            continue
        value = float(row.measures[panel.name])
        if panel.name == _TOTAL:
            _stack(sheet, panel, middle, thick, row)
        else:
            colour = _BAR_OF_SURVEY if row.survey else _BAR_OF_BASELINE
            length = value / panel.per_inch
            add_rectangle(sheet, panel.left, middle - thick / 2, length, thick, color=colour, linewidth=0)
        text = number_text(value, panel.unit).removesuffix(f" {panel.unit}")
        put(
            sheet,
            panel.left + end / panel.per_inch + 0.07,
            middle,
            text,
            SMALL_PT,
            va="center",
            path_effects=_HALO,
        )
    add_line(sheet, [panel.left, panel.left], [bottom, _TOP], color=SOFT_INK, linewidth=0.6)


def _draw_scale(sheet: Axes, panel: _Panel, bottom: float) -> None:
    room = panel.right - panel.left - _VALUE_ROOM
    most = max(1, min(_MOST_TICKS, int(room / _LEAST_TICK_ROOM)))
    for mark, text in zip(*Numbers(1.0).ticks(0.0, room * panel.per_inch, most), strict=True):
        x = panel.left + mark / panel.per_inch
        add_line(sheet, [x, x], [bottom, _TOP], color=FAINT_INK, linewidth=0.4, alpha=0.6, zorder=0.5)
        put(sheet, x, bottom - 0.05, text, SMALL_PT, color=SOFT_INK, ha="center", va="top")


def _stack(sheet: Axes, panel: _Panel, middle: float, thick: float, row: _Row) -> None:
    """Stack the burns of a row in flying order, with their values where they fit; mark the dearest day."""
    left = panel.left
    for title, value in burn_split(dict(row.measures)):
        length = value / panel.per_inch
        kind = title.rstrip("0123456789 ")
        look = {"facecolor": _COLOURS[kind], "edgecolor": "white", "linewidth": 0.8 if length > 0.04 else 0.0}
        add_rectangle(sheet, left, middle - thick / 2, length, thick, **look)
        text = f"{value:.2f}"
        if length > width_in(text, SMALL_PT) + 0.08:
            ink = "white" if kind == "departure" else INK
            centred: Any = {"color": ink, "ha": "center", "va": "center"}
            put(sheet, left + length / 2, middle, text, SMALL_PT, **centred)
        left += length
    if row.dearest is not None:
        x = panel.left + row.dearest / panel.per_inch
        add_line(sheet, [x, x], [middle - 0.75 * thick, middle + 0.75 * thick], color=INK, linewidth=1.4)


def _draw_name(sheet: Axes, row: _Row, top: float, height: float) -> None:
    """Write a row's name and as many of the lines under it as its height has room for."""
    room = _NAMES_RIGHT - LEFT_IN
    lines = int((height - 0.06) / _LINE)
    # wrapped by the width of plain letters, and bold ones are wider
    name = wrap(one_line(row.name), room / _BOLD if row.survey else room, BODY_PT, 2 if lines > 2 else 1)
    small = [shorten(one_line(line), room, SMALL_PT) for line in row.lines[: max(lines - len(name), 0)]]
    y = top - 0.5 * (height - (len(name) + len(small)) * _LINE) - 0.8 * _LINE
    for text in name:
        put(sheet, LEFT_IN, y, text, BODY_PT, weight="bold" if row.survey else "normal")
        y -= _LINE
    for text in small:
        put(sheet, LEFT_IN, y, text, SMALL_PT, color=SOFT_INK)
        y -= _LINE


def _draw_rule(sheet: Axes, rows: Sequence[_Row], height: float) -> None:
    """Set the baselines apart from the surveys."""
    y = _TOP - sum(row.survey for row in rows) * height
    add_line(sheet, [LEFT_IN, RIGHT_IN], [y, y], color=SOFT_INK, linewidth=0.8, linestyle=(0, (4, 3)))


def _draw_key(sheet: Axes, panel: _Panel, rows: Sequence[_Row]) -> None:
    """Name the colours of the burns that occur, and the mark of the dearest day, over the panels."""
    if panel.name != _TOTAL:
        return
    kinds = {title.rstrip("0123456789 ") for row in rows for title, _ in burn_split(dict(row.measures))}
    x = panel.left
    for kind in (each for each in _KINDS if each in kinds):
        add_rectangle(sheet, x, _KEY_Y - 0.02, 0.22, 0.13, facecolor=_COLOURS[kind], linewidth=0)
        put(sheet, x + 0.28, _KEY_Y, _KINDS[kind], SMALL_PT)
        x += 0.28 + width_in(_KINDS[kind], SMALL_PT) + 0.25
    if any(row.dearest is not None for row in rows):
        add_line(sheet, [x + 0.05, x + 0.05], [_KEY_Y - 0.05, _KEY_Y + 0.14], color=INK, linewidth=1.4)
        put(sheet, x + 0.15, _KEY_Y, "dearest day of the launch period", SMALL_PT)

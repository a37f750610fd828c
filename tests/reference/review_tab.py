"""What tests ask of an open review page, in terms of the survey."""

from __future__ import annotations

from typing import Any

import numpy as np

_PLACE = """([i, j]) => {
  const chart = document.getElementById("chart");
  const plot = chart.querySelector(".nsewdrag").getBoundingClientRect();
  const time = (date) => Date.parse(String(date).replace(" ", "T").replace(/(T.*)$/, "$1Z"));
  const share = (axis, date) => {
    const [first, last] = axis.range.map(time);
    return (time(date) - first) / (last - first);
  };
  const [ground] = chart.data;
  return [
    plot.left + share(chart.layout.xaxis, ground.x[i]) * plot.width,
    plot.bottom - share(chart.layout.yaxis, ground.y[j]) * plot.height,
  ];
}"""
_DRAWN = """() => document.getElementById("chart").data[1].z.map(
  (row) => Array.from(row, (value) => Number.isNaN(value) ? null : value))"""
_ROWS = """() => Array.from(document.querySelectorAll("#table tbody tr"), (row) => ({
  key: row.dataset.key,
  cells: Object.fromEntries(Array.from(row.cells, (cell) => [cell.dataset.column, cell.textContent])),
}))"""
_READINGS = """(column) => Object.fromEntries(
  Array.from(document.querySelectorAll("#readings [data-measure]"), (row) => {
    const cell = row.querySelector(`.${column}`);
    return [row.dataset.measure, [cell.textContent, cell.dataset.value]];
  }))"""
_POINTED = """([i, j]) => {
  const stops = document.querySelectorAll("#readings .stop .here");
  const [ground] = document.getElementById("chart").data;
  return stops[0].textContent === ground.x[i] && stops[stops.length - 1].textContent === ground.y[j];
}"""
_NEXT_FRAMES = """() => new Promise((done) =>
  requestAnimationFrame(() => requestAnimationFrame(() => setTimeout(done, 30))))"""


def place_of(tab: Any, i: int, j: int) -> tuple[float, float]:
    """Where a cell of the chart, departure i and arrival j, is on the screen."""
    x, y = tab.evaluate(_PLACE, [i, j])
    return x, y


def point_at(tab: Any, i: int, j: int) -> None:
    """Move the pointer to a cell, and wait until the crosshair has followed."""
    tab.mouse.move(*place_of(tab, i, j), steps=2)
    tab.wait_for_function(_POINTED, arg=[i, j])


def settled(tab: Any) -> None:
    """Let the page draw what was asked of it."""
    tab.evaluate(_NEXT_FRAMES)


def drawn(tab: Any) -> np.ndarray:
    """The values drawn in colour, (arrivals, departures), NaN where nothing is."""
    return np.array(tab.evaluate(_DRAWN), dtype=float)


def rows(tab: Any) -> list[dict[str, Any]]:
    """The rows of the candidates' table as they stand: key, and texts by column."""
    return list(tab.evaluate(_ROWS))


def readings(tab: Any, column: str) -> dict[str, tuple[str, str]]:
    """What the reading shows of each measure, as text and in full; column "here" or "chosen"."""
    return dict(tab.evaluate(_READINGS, column))


def set_limit(tab: Any, measure: str, end: str, value: float) -> None:
    """Type a number into a limit."""
    box = tab.locator(f'#sliders [data-limit="{measure}"] .end:has([data-end="{end}"]) input[type="number"]')
    box.fill(str(value))
    box.press("Enter")
    settled(tab)


def stored(survey, name: str) -> np.ndarray:
    """A stored variable as (departures, arrivals)."""
    grid = survey.grid
    return grid[name].broadcast_like(grid["blocked_by"]).transpose("departure", "arrival").values

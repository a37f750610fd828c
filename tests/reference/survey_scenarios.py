"""Scenarios of a few thousand cells that the tests of the engine share; all missions are invented."""

from __future__ import annotations

from pathlib import Path

import pytest

from porkgrid.survey import plan

# Every measure a direct route to Mars can have, limits that cut in different places, and some arrival dates
# before departure dates.
ROOK = """
name = "Rook to Mars"

[[encounter]]
body = "earth"
first = 2028-09-01
last = 2029-04-01
step_days = 5.0
parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 300, inclination_deg = 28.5 }

[[encounter]]
body = "mars"
first = 2029-02-15
last = 2030-03-31
step_days = 7.0
capture = { periapsis_altitude_km = 400, apoapsis_altitude_km = 33000 }

[limits]
c3_km2_s2 = { max = 25 }
dla_deg = { min = -28.5, max = 28.5 }
v_inf_arrival_km_s = { max = 4.5 }
arrival_sep_deg = { min = 30 }

[rank]
apart_days = 5
"""

# The same with a few measures in the store, which is what a small sweep spends its time on.
LEAN = 'measures = ["c3_km2_s2"]\n' + ROOK

# Flights long enough for a revolution, where all three options exist in part of the grid.
LOOPS = """
name = "Loon to Mars the long way"

[[encounter]]
body = "earth"
first = 2028-09-01
last = 2029-08-27
step_days = 18.0

[[encounter]]
body = "mars"
first = 2029-08-01
last = 2032-02-15
step_days = 23.0

[[leg]]
max_revs = 1

[limits]
c3_km2_s2 = { max = 40 }
sun_min_au = { min = 0.9 }
"""

# Mars to Earth, for declinations to a pole that is not that of the axes.
PETREL = """
name = "Petrel home"

[[encounter]]
body = "mars"
first = 2032-12-01
last = 2033-08-31
step_days = 20.0
parking = { periapsis_altitude_km = 350, apoapsis_altitude_km = 350 }

[[encounter]]
body = "earth"
first = 2033-06-01
last = 2034-06-30
step_days = 20.0
"""


def changed(text: str, *pairs: tuple[str, str]) -> str:
    """The text with every first of a pair, which must be there, replaced by the second."""
    for old, new in pairs:
        assert old in text, old
        text = text.replace(old, new)
    return text


def limited(text: str, limits: str) -> str:
    """The text with other limits; "" for none."""
    head, _, rest = text.partition("[limits]")
    _, bracket, tail = rest.partition("\n[")
    return head + (f"[limits]\n{limits}\n" if limits else "") + bracket + tail


def written(folder: Path, text: str) -> Path:
    """The file that holds the text."""
    folder.mkdir(parents=True, exist_ok=True)
    path = folder / "scenario.toml"
    path.write_text(text, encoding="utf-8")
    return path


def shrink_tiles(patch: pytest.MonkeyPatch) -> None:
    """Make tiles of 8 × 32 cells, so that a small grid has many."""
    patch.setattr(plan, "TILE_COLUMNS", 32)
    patch.setattr(plan, "TILE_CELLS", 256)

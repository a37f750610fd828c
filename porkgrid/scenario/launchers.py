"""A launcher as the user's tables give it: injected mass against C3, and what a steep DLA takes from it."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from functools import cached_property
from itertools import pairwise
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike

from porkgrid.scenario.faults import Fault
from porkgrid.scenario.tables import Row, fault_lines, read_rows

if TYPE_CHECKING:
    from scipy.interpolate import PchipInterpolator

CAPABILITY_HEADER = ("c3_km2_s2", "injected_mass_kg")
PENALTY_HEADER = ("dla_deg", "mass_factor")
CLOSEST = 1e-6  # between rows, in the first column: nearer rows are a typing error, and slopes overflow


@dataclass(frozen=True)
class Capability:
    """Injected mass against C3. Equal and of one hash where the numbers are, wherever the file lies."""

    name: str = field(compare=False)  # the file's, without its suffix
    path: Path = field(compare=False)
    c3_km2_s2: tuple[float, ...]  # increasing, two or more
    injected_mass_kg: tuple[float, ...]  # decreasing; only the last may be zero

    def mass_kg(self, c3_km2_s2: ArrayLike) -> np.ndarray:
        """Injected mass at each C3 (any shape): through the rows, nowhere rising; NaN outside the table."""
        return _between(self._curve, c3_km2_s2, self.injected_mass_kg)

    @cached_property
    def _curve(self) -> PchipInterpolator:
        return _monotone(self.c3_km2_s2, self.injected_mass_kg)


@dataclass(frozen=True)
class DlaPenalty:
    """Part of the injected mass that is left at a declination. Equal where the numbers are."""

    name: str = field(compare=False)
    path: Path = field(compare=False)
    dla_deg: tuple[float, ...]  # from 0, increasing, at most 90
    mass_factor: tuple[float, ...]  # in (0, 1], never increasing

    def factor(self, dla_deg: ArrayLike) -> np.ndarray:
        """Factor on the injected mass at each declination, north as south; NaN beyond the table."""
        return _between(self._curve, np.abs(dla_deg), self.mass_factor)

    @cached_property
    def _curve(self) -> PchipInterpolator:
        return _monotone(self.dla_deg, self.mass_factor)


def read_capability(path: Path) -> tuple[Capability | None, list[str]]:
    """The launcher of a CSV table `c3_km2_s2,injected_mass_kg`, or None and its faults, a line each."""
    rows, faults = read_rows(path, CAPABILITY_HEADER)
    faults += _steps_up(rows, "c3_km2_s2")
    for row in rows:
        if row.values[1] < 0.0:
            faults.append(row.fault(f"injected_mass_kg must be 0 or more, not {row.values[1]:.12g}"))
    for before, row in pairwise(rows):
        high, low = before.values[1], row.values[1]
        if low >= high:
            what = f"injected_mass_kg {low:.12g} is not less than the {high:.12g} of line {before.line}"
            faults.append(row.fault(f"{what}; mass must fall as C3 grows"))
    if faults:
        return None, fault_lines(path, faults)
    c3, mass = zip(*(row.values for row in rows), strict=True)
    return Capability(path.stem, path, c3, mass), []


def read_dla_penalty(path: Path) -> tuple[DlaPenalty | None, list[str]]:
    """The penalty of a CSV table `dla_deg,mass_factor`, or None and its faults, a line each."""
    rows, faults = read_rows(path, PENALTY_HEADER)
    faults += [*_penalty_bounds(rows), *_steps_up(rows, "dla_deg")]
    for before, row in pairwise(rows):
        high, low = before.values[1], row.values[1]
        if low > high:
            what = f"mass_factor {low:.12g} is more than the {high:.12g} of line {before.line}"
            faults.append(row.fault(f"{what}; the factor must not rise as the declination grows"))
    if faults:
        return None, fault_lines(path, faults)
    dla, factor = zip(*(row.values for row in rows), strict=True)
    return DlaPenalty(path.stem, path, dla, factor), []


def _steps_up(rows: list[Row], name: str) -> Iterator[Fault]:
    for before, row in pairwise(rows):
        low, high = before.values[0], row.values[0]
        if high <= low:
            what = f"{name} {high:.12g} is not more than the {low:.12g} of line {before.line}"
            yield row.fault(f"{what}; rows must go up in {name}")
        elif high - low < CLOSEST:
            yield row.fault(f"{name} must be at least {CLOSEST:g} above that of line {before.line}")


def _penalty_bounds(rows: list[Row]) -> Iterator[Fault]:
    if rows and rows[0].values[0] > 0.0:
        yield rows[0].fault(f"the first row must be at dla_deg 0, not {rows[0].values[0]:.12g}")
    for row in rows:
        dla, factor = row.values
        if not 0.0 <= dla <= 90.0:
            yield row.fault(f"dla_deg must be 0 to 90, one row for north and south, not {dla:.12g}")
        if not 0.0 < factor <= 1.0:
            yield row.fault(f"mass_factor must be above 0 and at most 1, not {factor:.12g}")


def _monotone(xs: tuple[float, ...], ys: tuple[float, ...]) -> PchipInterpolator:
    """Piecewise cubic that rises and falls only where the rows do (Fritsch and Carlson 1980)."""
    from scipy.interpolate import PchipInterpolator

    return PchipInterpolator(xs, ys, extrapolate=False)


def _between(curve: PchipInterpolator, at: ArrayLike, falling: tuple[float, ...]) -> np.ndarray:
    values = np.asarray(curve(at))
    return np.clip(values, falling[-1], falling[0], out=values)  # rounding at the ends; NaN stays

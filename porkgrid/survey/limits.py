"""What forbids a cell: the limits of the scenario, and the reasons for which a leg cannot be flown.

Each cell gets a word of bits, `blocked_by`; the cell is allowed where the word is 0.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numba import njit

from porkgrid.physics.lambert import BAD_INPUT, NO_PLANE, NO_TRANSFER, NOT_AFTER
from porkgrid.physics.timeflight import ROW
from porkgrid.scenario import Limit
from porkgrid.survey.cells import Cells
from porkgrid.survey.measures import Measure

# Bits 0 to 2 say why there is no flight at all; the limits follow in the scenario's order.
REASONS = {
    "arrival_before_departure": "arrival not after departure",
    "plane_undefined": "transfer plane undefined (0° or 180°)",
    "no_transfer": "no such transfer",
}
REASON_OF_STATUS = {NOT_AFTER: 0, NO_PLANE: 1, NO_TRANSFER: 2, BAD_INPUT: 2}
_REASON_WORDS = np.zeros(1 + max(REASON_OF_STATUS), dtype=np.uint32)  # by status
for _status, _bit in REASON_OF_STATUS.items():
    _REASON_WORDS[_status] = 1 << _bit
_ANY_REASON = np.uint32((1 << len(REASONS)) - 1)

BITS = 32  # of the word


@dataclass(frozen=True)
class Bound:
    """A limit on one measure; either end may be open. Those that no [limits] entry gives have own names."""

    measure: Measure
    least: float | None
    most: float | None
    own_name: str = ""
    own_title: str = ""

    @property
    def name(self) -> str:
        """The flag's name: the measure's, or its own."""
        return self.own_name or self.measure.name

    @property
    def title(self) -> str:
        """The limit in words, such as "C3 at most 25 km²/s²"."""
        if self.own_title:
            return self.own_title
        return f"{_plain(self.measure)} {self._range().replace('-', '−')}{_unit(self.measure)}"

    @property
    def range(self) -> tuple[float, float]:
        """Least and most, infinite where open."""
        return (
            -math.inf if self.least is None else self.least,
            math.inf if self.most is None else self.most,
        )

    def _range(self) -> str:
        if self.least is None:
            return f"at most {self.most:g}"
        if self.most is None:
            return f"at least {self.least:g}"
        return f"{self.least:g} to {self.most:g}"

    def forbids(self, values: np.ndarray) -> np.ndarray:
        """Where values lie outside; NaN is never inside."""
        inside = np.ones(values.shape, dtype=bool)
        if self.least is not None:
            inside &= values >= self.least
        if self.most is not None:
            inside &= values <= self.most
        return ~inside

    def excess(self, values: np.ndarray) -> np.ndarray:
        """How far values lie outside, in the measure's unit; 0 inside."""
        below = 0.0 if self.least is None else np.maximum(self.least - values, 0.0)
        above = 0.0 if self.most is None else np.maximum(values - self.most, 0.0)
        return np.maximum(below, above)


def bounds_of(limits: Mapping[str, Limit], measures: Mapping[str, Measure]) -> tuple[Bound, ...]:
    """The scenario's limits, each with the measure it bounds."""
    return tuple(Bound(measures[name], limit.min, limit.max) for name, limit in limits.items())


def flag_names(bounds: tuple[Bound, ...]) -> list[str]:
    """Names of the bits of `blocked_by`, lowest first."""
    return [*REASONS, *(bound.name for bound in bounds)]


def flag_titles(bounds: tuple[Bound, ...]) -> list[str]:
    """The bits of `blocked_by` in words, lowest first."""
    return [*REASONS.values(), *(bound.title for bound in bounds)]


def blocked_by(cells: Cells, bounds: tuple[Bound, ...]) -> np.ndarray:
    """(n, m) uint32: a bit per reason or limit that forbids the cell.

    A cell with no flight has the bit of its reason only: its measures are not numbers to be limited.
    """
    word = _REASON_WORDS[cells.status]
    for bit, bound in enumerate(bounds, start=len(REASONS)):
        values = np.broadcast_to(bound.measure.compute(cells), word.shape)
        _mark(np.ascontiguousarray(values, dtype=np.float64), *bound.range, np.uint32(1 << bit), word)
    return word


@njit(**ROW)
def _mark(values, least, most, flag, word):
    """Add `flag` where a flown cell's value is outside; values and word are (n, m)."""
    for i in range(word.shape[0]):
        for j in range(word.shape[1]):
            outside = not (least <= values[i, j] <= most)
            grounded = (word[i, j] & _ANY_REASON) != 0
            word[i, j] |= flag if outside and not grounded else np.uint32(0)


def _plain(measure: Measure) -> str:
    """The symbol as plain text."""
    text = measure.symbol
    for mathtext, plain in (("$C_3$", "C3"), (r"$v_\infty$", "v∞"), (r"$\Delta v$", "Δv"), ("$L_s$", "Ls")):
        text = text.replace(mathtext, plain)
    return text


def _unit(measure: Measure) -> str:
    if measure.unit == "1":
        return ""
    return "°" if measure.unit == "deg" else f" {measure.unit}"

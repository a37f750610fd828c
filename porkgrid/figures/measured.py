"""A measure of a survey as a figure needs it: its values on the whole grid, its name and its unit."""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
import xarray as xr

from porkgrid.figures.text import one_line

_EPOCH = "_epoch_jd_tdb"  # the names of all measures that are epochs end so
_JULIAN = " (JD TDB)"  # and so their symbols
_SIGNS = {r"\Delta ": "Δ", r"\Delta": "Δ", r"\infty": "∞", r"\oplus": "⊕", r"\odot": "☉"}


@dataclass(frozen=True, eq=False)
class Measured:
    """A measure on a grid.

    values: (departure, arrival) float, NaN where unknown. label: as on axes, "C3". unit: "km²/s²", or "" if
    it has none; of an epoch its time scale.
    """

    name: str
    values: np.ndarray
    label: str
    unit: str

    @property
    def is_date(self) -> bool:
        """Tell whether the values are epochs, to be written as calendar dates."""
        return self.name.endswith(_EPOCH)

    @property
    def title(self) -> str:
        """Return label and unit for an axis."""
        return f"{self.label} ({self.unit})" if self.unit else self.label

    @property
    def caption(self) -> str:
        """Return the title for narrow places: a date is known for one without its time scale."""
        return self.label if self.is_date else self.title

    def with_unit(self, number: str) -> str:
        """Return a number followed by the unit."""
        return f"{number} {self.unit}" if self.unit and not self.is_date else number


def read_measure(view: xr.Dataset, name: str) -> Measured:
    """Take a measure out of a grid, spread over both dates where it depends on one only.

    Raises KeyError if the grid has no such variable.
    """
    variable = view[name]
    shape = (view.sizes["departure"], view.sizes["arrival"])
    values = variable.values
    if variable.dims == ("departure",):
        values = values[:, None]
    elif variable.dims == ("arrival", "departure"):
        values = values.T
    values = np.broadcast_to(values, shape)
    values = np.where(np.isfinite(values), values, np.nan)
    unit = one_line(variable.attrs.get("units", ""))
    label = plain_symbol(variable.attrs.get("symbol", name))
    if name.endswith(_EPOCH):
        return Measured(name, values, f"{label.removesuffix(_JULIAN)} date", "TDB")
    return Measured(name, values, label, "" if unit == "1" else unit)


def plain_symbol(symbol: str) -> str:
    r"""Return a mathtext symbol as plain letters: ``total $\\Delta v$`` as "total Δv", ``$C_3$`` as "C3".

    Setting one symbol as mathematics takes longer than all the other text of a figure.
    """
    text = symbol
    for command, sign in _SIGNS.items():
        text = text.replace(command, sign)
    return one_line(re.sub(r"\$([^$]*)\$", lambda m: re.sub(r"[{}_^\\]", "", m.group(1)), text))

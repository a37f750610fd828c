"""What a picture of a survey is drawn from, at the full resolution of its grid."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True, eq=False)
class DayBests:
    """The best allowed value of one measure on each departure date and on each arrival date.

    departure, arrival: datetime64 arrays (n,) and (m,), ascending, TDB calendar.
    departure_best, arrival_best: float arrays of the same lengths; NaN where no cell of that date is allowed.
    """

    departure: np.ndarray
    departure_best: np.ndarray
    arrival: np.ndarray
    arrival_best: np.ndarray


@dataclass(frozen=True)
class FlagShare:
    """What one flag costs: the share of the grid (0 to 1) it forbids, and the share that it alone forbids."""

    title: str
    share: float
    alone: float

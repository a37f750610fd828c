"""What a first scenario proposes: windows, steps and limits, with the optimum they are drawn around."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

_FAIR_SHARE = 0.25  # a few days of it are what another year's season leaves over


@dataclass(frozen=True)
class Window:
    """Dates at a body, `first` to `last` inclusive by `step_days`, and the period of its orbit."""

    body: str
    first: date
    last: date
    step_days: float
    period_days: float


@dataclass(frozen=True)
class Optimum:
    """The least sum of burns of a season on the grid that it was looked for on."""

    dates: tuple[date, ...]  # at every encounter
    c3_km2_s2: float
    v_inf_arrival_km_s: float
    tof_days: float
    dv_total_km_s: float
    burns_km_s: tuple[float, ...]  # at the flybys


@dataclass(frozen=True)
class Limits:
    """The largest values allowed."""

    c3_km2_s2: float
    v_inf_arrival_km_s: float
    tof_days: float
    burns_km_s: tuple[float, ...]  # at the flybys


@dataclass(frozen=True)
class Proposal:
    """A scenario to start from. Seasons: dates of the least of each that was seen, in order."""

    year: int  # that was asked for; the season taken may start later
    windows: tuple[Window, ...]
    optimum: Optimum
    limits: Limits
    slack_km_s: float  # the limits let in every date whose total is that near the least
    closing: tuple[date, date]  # first and last departure that the limits allow
    seasons: tuple[date, ...]
    cut: bool  # the season goes on beyond the windows: seasons run into each other
    synodic_days: float | None  # None for a route with flybys, whose seasons have no one period

    @property
    def belongs_to_year(self) -> bool:
        """Whether the season is one of the year that was asked for."""
        return self.optimum.dates[0].year == self.year or reaches(*self.closing, self.year)


def reaches(first: date, last: date, year: int) -> bool:
    """Whether a fair share of the departures of a season is in a year."""
    inside = min(last, date(year, 12, 31)) - max(first, date(year, 1, 1))
    return inside.days + 1 >= _FAIR_SHARE * ((last - first).days + 1)

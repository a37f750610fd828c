"""Propose a scenario for a route and a year: find the season, and lay windows and limits around it.

The route is flown over coarse dates of the year and the seasons beside it (Lambert's problem for every pair,
by the sweep's own functions); the least sum of burns of each season is its optimum. Then the season taken is
flown over finer dates. Limits let in every date whose sum is near the least, and windows reach past the last
date that the limits allow.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import date
from itertools import pairwise

import numpy as np

from porkgrid.errors import RequestError
from porkgrid.scenario.proposal import Proposal, Window, reaches
from porkgrid.sky.bodies import Body
from porkgrid.sky.epochs import jd_from_date
from porkgrid.sky.kernel import Ephemeris, open_ephemeris
from porkgrid.survey.lookout import Sight, look
from porkgrid.survey.orbitsizes import OrbitSize, hohmann_days, orbit_size, synodic_days
from porkgrid.survey.seasonlimits import (
    STEPS_PER_WINDOW,
    coverage,
    day_of,
    optimum_at,
    season_around,
    slack_km_s,
    windows_within,
)

# Flight times looked at, as shares of Hohmann's: fast flights by the short way to slow ones by the long way.
_FASTEST, _SLOWEST = 0.35, 1.45
# Missions hardly wait longer (practice), but for the farthest bodies they must.
_LONGEST_DAYS, _SLOWEST_FAR = 15.0 * 365.25, 0.6
_SAME_SEASON = 0.6  # of a synodic period; the seasons of eccentric planets come up to a tenth off the mean
_BESIDE = 1.1  # synodic periods looked at before and after the year, so that the seasons beside it show
_COARSE_STEPS = 150  # per revolution of the body
_STEPS_PER_SEASON = 40
# Routes with flybys, whose seasons have no one period and whose searches are dear
_BESIDE_FLYBYS_DAYS, _APART_FLYBYS_DAYS = 120.0, 60.0
_COARSE_STEPS_FLYBYS, _FINEST_FLYBYS_DAYS, _COARSEST_FLYBYS_DAYS = 75, 2.0, 20.0
_YEARS_AHEAD = 12
_MAX_BURN_KM_S = 1.5  # coarse dates miss a flyby by more than fine ones
_NEAR_STEPS = 5  # the optimum on finer dates is that near the one on coarse dates
_LOOKS = 4  # at windows that the season turns out to be wider than


def suggest(route: Sequence[Body], year: int) -> Proposal:
    """Propose a scenario whose season starts in a year, or in the nearest later one that has a season.

    The route: two bodies or more, no two in a row the same. Raises RequestError for a year outside the
    ephemeris and for a route with flybys that has no season within a dozen years.
    """
    ephemeris = open_ephemeris()
    orbits = [orbit_size(ephemeris, body, _jd_in(year, ephemeris, route)) for body in route]
    for tried in range(year, year + _YEARS_AHEAD):
        found = (_season_direct if len(route) == 2 else _season_by_flybys)(orbits, tried, ephemeris)
        proposal = None if found is None else _closer(orbits, found, ephemeris)
        if found is not None and proposal is not None:
            seen, starts = found.seen.departures_jd, found.starts
            seasons = tuple(sorted(day_of(seen[each]) for each in starts))
            return replace(proposal, year=year, seasons=seasons)
    bodies = " to ".join(body.title for body in route)
    raise RequestError(
        f"no route {bodies} with burns up to {_MAX_BURN_KM_S:g} km/s at flybys departs from {year} to "
        f"{year + _YEARS_AHEAD - 1}; give another year, or other flybys"
    )


@dataclass(frozen=True, eq=False)
class _Found:
    """Seasons on coarse dates: departures at the optimum of each, least first, and the one that is taken."""

    seen: Sight
    starts: list[int]
    taken: int
    apart_days: float


def _closer(orbits: Sequence[OrbitSize], found: _Found, ephemeris: Ephemeris) -> Proposal | None:
    """Fly the season taken over finer dates; None where it turns out to be the tail of a better one."""
    seen, apart = found.seen, found.apart_days
    reach = _NEAR_STEPS * (seen.departures_jd[1] - seen.departures_jd[0])
    season = season_around(orbits, seen, found.taken, apart, ephemeris)
    for _ in range(_LOOKS):
        close = look([_finer(each) for each in season.windows], _MAX_BURN_KM_S)
        best = _best_near(close, seen.departures_jd[found.taken], reach)
        optimum = optimum_at(close, best)
        slack = slack_km_s(optimum.dv_total_km_s)
        if _best_by_departure(close).min() < optimum.dv_total_km_s - slack:
            return None
        season = season_around(orbits, close, best, apart, ephemeris)
        if not season.cut:
            break
    return Proposal(
        year=optimum.dates[0].year,
        windows=season.windows,
        optimum=optimum,
        limits=season.limits,
        slack_km_s=slack,
        closing=season.closing,
        seasons=(),
        cut=season.cut,
        synodic_days=synodic_days(orbits[0], orbits[1]) if len(orbits) == 2 else None,
    )


def _finer(window: Window) -> Window:
    """A window with steps that are quick to fly."""
    span = (window.last - window.first).days
    return replace(window, step_days=max(2.0 * window.step_days, span / STEPS_PER_WINDOW))


def _jd_in(year: int, ephemeris: Ephemeris, route: Sequence[Body]) -> float:
    """The middle of a year that the ephemeris has for every body."""
    first, last = coverage(ephemeris, route)
    if not 1 <= year <= 9998 or not first <= jd_from_date(date(year, 7, 1)) <= last:
        span = f"{day_of(first).year + 1} to {day_of(last).year - 1}"
        raise RequestError(f"--year {year}: outside what {ephemeris.label} covers; give a year from {span}")
    return jd_from_date(date(year, 7, 1))


def _season_direct(orbits: Sequence[OrbitSize], year: int, ephemeris: Ephemeris) -> _Found:
    """Look at a year and the seasons beside it; where the year has none the next is taken."""
    synodic = synodic_days(orbits[0], orbits[1])
    finest = synodic / _STEPS_PER_SEASON
    steps = [min(each.period_days / _COARSE_STEPS, finest) for each in orbits]
    seen = look(_reach(orbits, year, _BESIDE * synodic, steps, ephemeris), _MAX_BURN_KM_S)
    starts = _least_of_seasons(seen, _SAME_SEASON * synodic)
    taken = _season_of_year(orbits, seen, starts, year, synodic, ephemeris)
    if taken is None:
        later = [each for each in starts if day_of(seen.departures_jd[each]).year > year]
        taken = min(later) if later else _best_day(seen, year)
    return _Found(seen, starts, taken, synodic)


def _season_by_flybys(orbits: Sequence[OrbitSize], year: int, ephemeris: Ephemeris) -> _Found | None:
    """Look at a year; None where it has no season."""
    steps = [
        float(np.clip(each.period_days / _COARSE_STEPS_FLYBYS, _FINEST_FLYBYS_DAYS, _COARSEST_FLYBYS_DAYS))
        for each in orbits
    ]
    apart = orbits[0].period_days
    seen = look(_reach(orbits, year, _BESIDE_FLYBYS_DAYS, steps, ephemeris), _MAX_BURN_KM_S)
    starts = _least_of_seasons(seen, _APART_FLYBYS_DAYS)
    taken = _season_of_year(orbits, seen, starts, year, apart, ephemeris)
    return None if taken is None else _Found(seen, starts, taken, apart)


def _season_of_year(
    orbits: Sequence[OrbitSize],
    seen: Sight,
    starts: Sequence[int],
    year: int,
    apart_days: float,
    ephemeris: Ephemeris,
) -> int | None:
    """The best season with its optimum in the year, else the best whose allowed dates reach into it."""
    within = [each for each in starts if day_of(seen.departures_jd[each]).year == year]
    if within:
        return within[0]
    for each in starts:
        if reaches(*season_around(orbits, seen, each, apart_days, ephemeris).closing, year):
            return each
    return None


def _best_day(seen: Sight, year: int) -> int:
    """The best departure of a year without seasons: from far out one waits for none."""
    within = np.array([day_of(each).year == year for each in seen.departures_jd])
    best = np.where(within, _best_by_departure(seen), np.inf)
    if not np.isfinite(best).any():
        raise RequestError(f"--year {year}: no flight within the ephemeris; give another year")
    return int(np.argmin(best))


def _reach(
    orbits: Sequence[OrbitSize],
    year: int,
    beside_days: float,
    steps: Sequence[float],
    ephemeris: Ephemeris,
) -> list[Window]:
    """Windows around a year: departures in it and beside it, and all that flights near Hohmann's reach."""
    first = jd_from_date(date(year, 1, 1)) - beside_days
    last = jd_from_date(date(year, 12, 31)) + beside_days
    spans = [(first, last)]
    for one, other in pairwise(orbits):
        flight = hohmann_days(one, other)
        slowest = max(min(_SLOWEST * flight, _LONGEST_DAYS), _SLOWEST_FAR * flight)
        first, last = first + _FASTEST * flight, last + slowest
        spans.append((first, last))
    return windows_within(orbits, spans, steps, ephemeris)


def _best_by_departure(seen: Sight) -> np.ndarray:
    """Least sum of burns of every departure date, (n,), infinite where there is no flight."""
    return np.where(np.isfinite(seen.dv_total_km_s), seen.dv_total_km_s, np.inf).min(axis=1)


def _least_of_seasons(seen: Sight, apart_days: float) -> list[int]:
    """Departures of local least sums, apart and with a ridge between, least first; none at the edges."""
    best, jd = _best_by_departure(seen), seen.departures_jd
    around = np.lib.stride_tricks.sliding_window_view(np.pad(best, 2, constant_values=np.inf), 5)
    lowest = np.isfinite(best) & (best <= around.min(axis=1))
    taken: list[int] = []
    for index in np.argsort(best, kind="stable").tolist():
        if lowest[index] and all(
            abs(jd[index] - jd[other]) >= apart_days and _ridge_between(best, index, other) for other in taken
        ):
            taken.append(index)
    return [each for each in taken if 2 <= each < len(jd) - 2]


def _ridge_between(best: np.ndarray, index: int, other: int) -> bool:
    """Whether the sums between two departures rise above what the season of the dearer one lets in."""
    between = best[min(index, other) : max(index, other) + 1]
    return bool(between.max() > best[index] + slack_km_s(best[index]))


def _best_near(seen: Sight, jd: float, days: float) -> int:
    """The departure of the least sum among those near a date."""
    near = np.abs(seen.departures_jd - jd) <= days
    return int(np.argmin(np.where(near, _best_by_departure(seen), np.inf)))

"""Limits and windows around the optimum of a season: what lets it in, and where it is seen to close."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from datetime import date

import numpy as np

from porkgrid.errors import RequestError
from porkgrid.scenario.proposal import Limits, Optimum, Window
from porkgrid.sky.bodies import Body
from porkgrid.sky.epochs import jd_from_date
from porkgrid.sky.kernel import Ephemeris
from porkgrid.survey.lookout import Sight
from porkgrid.survey.orbitsizes import OrbitSize

_SLACK_SHARE, _LEAST_SLACK_KM_S = (
    0.08,
    0.3,
)  # of the least sum of burns: what a launch period costs (practice)
_LONGEST_FLIGHT = 1.5  # of the optimum's
_MISSED_KM_S = 0.2  # quick dates miss a flyby by so much more than the dates of the sweep will
_STEPS_DAYS = (0.1, 0.25, 0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0, 200.0, 500.0)
_STEPS_PER_REVOLUTION, STEPS_PER_WINDOW = 350, 150
_JD_OF_ORDINAL_ZERO = 1_721_424.5


@dataclass(frozen=True)
class Season:
    """Windows and limits of a season and its first and last allowed departure.

    cut: the dates looked at end before the season does, so that its windows may have to be wider.
    """

    windows: tuple[Window, ...]
    limits: Limits
    closing: tuple[date, date]
    cut: bool


def season_around(
    orbits: Sequence[OrbitSize], seen: Sight, best: int, apart_days: float, ephemeris: Ephemeris
) -> Season:
    """Limits that let in what is near the optimum of a season, and windows that show where they close it.

    best: index of the optimum's departure. Seasons are `apart_days` from each other.
    """
    optimum = optimum_at(seen, best)
    jd = seen.departures_jd
    rows = (np.abs(jd - jd[best]) <= 0.5 * apart_days)[:, None]
    near = rows & (seen.dv_total_km_s <= optimum.dv_total_km_s + slack_km_s(optimum.dv_total_km_s))
    near &= seen.tof_days <= _LONGEST_FLIGHT * optimum.tof_days
    limits = _limits(seen, near, optimum)
    allowed = rows & _within(seen, limits)
    first, last = _run_about(allowed.any(axis=1), best)
    allowed[:first], allowed[last + 1 :] = False, False
    reach = np.flatnonzero(rows)
    edges = (allowed[reach[0]], allowed[reach[-1]], allowed[:, 0], allowed[:, -1])
    return Season(
        windows=_wide_windows(orbits, seen, allowed, ephemeris),
        limits=limits,
        closing=(day_of(jd[first]), day_of(jd[last])),
        cut=any(each.any() for each in edges),
    )


def _limits(seen: Sight, near: np.ndarray, optimum: Optimum) -> Limits:
    """Limits that let in the cells (n, m) near the optimum, in numbers that one would write."""
    return Limits(
        c3_km2_s2=_rounded_up(float(seen.c3_km2_s2[near].max()), _energy_unit),
        v_inf_arrival_km_s=_rounded_up(float(seen.v_inf_arrival_km_s[near].max()), _speed_unit),
        tof_days=_rounded_up(float(seen.tof_days[near].max()), _flight_unit),
        burns_km_s=tuple(max(_rounded_up(burn + 0.1, _burn_unit), 0.2) for burn in optimum.burns_km_s),
    )


def _within(seen: Sight, limits: Limits) -> np.ndarray:
    """Cells (n, m) that the limits let in, or will with the finer dates of a sweep."""
    allowed = seen.c3_km2_s2 <= limits.c3_km2_s2
    allowed &= seen.v_inf_arrival_km_s <= limits.v_inf_arrival_km_s
    allowed &= seen.tof_days <= limits.tof_days
    for burn, most in zip(seen.burns_km_s, limits.burns_km_s, strict=True):
        allowed &= burn <= most + _MISSED_KM_S
    return allowed


def _wide_windows(
    orbits: Sequence[OrbitSize], seen: Sight, allowed: np.ndarray, ephemeris: Ephemeris
) -> tuple[Window, ...]:
    """Windows around all dates of the allowed cells."""
    departures = seen.departures_jd[allowed.any(axis=1)]
    arrivals = seen.arrivals_jd[allowed.any(axis=0)]
    dates = [departures, *(each[allowed] for each in seen.flybys_jd), arrivals]
    spans = [
        _widened(float(each.min()), float(each.max()), orbit.period_days)
        for each, orbit in zip(dates, orbits, strict=True)
    ]
    fastest = min(each.period_days for each in orbits)
    steps = [
        _step(end - start, each.period_days, fastest)
        for (start, end), each in zip(spans, orbits, strict=True)
    ]
    return tuple(windows_within(orbits, spans, steps, ephemeris))


def _run_about(allowed: np.ndarray, best: int) -> tuple[int, int]:
    """First and last index of the unbroken run of allowed days that holds the best one."""
    closed = np.flatnonzero(~allowed)
    before, after = closed[closed < best], closed[closed > best]
    return (
        int(before[-1]) + 1 if before.size else 0,
        int(after[0]) - 1 if after.size else len(allowed) - 1,
    )


def _widened(first: float, last: float, period_days: float) -> tuple[float, float]:
    """A span with room on both sides in which the season is seen to close, out to days one would write."""
    room = max(0.15 * (last - first), min(period_days / 36.0, 60.0))
    start, end = math.floor(first - room) + 0.5, math.ceil(last + room) + 0.5
    if end - start < 100.0:
        return start, end
    return _month_before(start), _month_after(end)


def _month_before(jd: float) -> float:
    day = day_of(jd)
    return jd_from_date(day.replace(day=15 if day.day >= 15 else 1))


def _month_after(jd: float) -> float:
    day = day_of(jd)
    if day.day <= 15:
        return jd_from_date(day.replace(day=15))
    return jd_from_date(date(day.year + day.month // 12, day.month % 12 + 1, 1))


def _step(span_days: float, period_days: float, fastest_days: float) -> float:
    """A customary step: a share of the body's revolution, finer where its window would have few dates.

    No finer than what the fastest body of the route asks for: nothing changes quicker than that.
    """
    own, fastest = (_customary(each / _STEPS_PER_REVOLUTION) for each in (period_days, fastest_days))
    return min(own, max(_customary(span_days / STEPS_PER_WINDOW), fastest))


def _customary(most_days: float) -> float:
    return max((each for each in _STEPS_DAYS if each <= most_days), default=_STEPS_DAYS[0])


def optimum_at(seen: Sight, best: int) -> Optimum:
    """The least sum of burns of a departure, by its index."""
    column = int(np.nanargmin(seen.dv_total_km_s[best]))
    cell = best, column
    flybys = [float(each[cell]) for each in seen.flybys_jd]
    epochs = [float(seen.departures_jd[best]), *flybys, float(seen.arrivals_jd[column])]
    return Optimum(
        dates=tuple(map(day_of, epochs)),
        c3_km2_s2=float(seen.c3_km2_s2[cell]),
        v_inf_arrival_km_s=float(seen.v_inf_arrival_km_s[cell]),
        tof_days=float(seen.tof_days[cell]),
        dv_total_km_s=float(seen.dv_total_km_s[cell]),
        burns_km_s=tuple(float(each[cell]) for each in seen.burns_km_s),
    )


def slack_km_s(dv_total_km_s: float) -> float:
    """How much more than the least sum of burns dates of the same season may take."""
    return max(_SLACK_SHARE * dv_total_km_s, _LEAST_SLACK_KM_S)


def _rounded_up(value: float, unit_of: Callable[[float], float]) -> float:
    """The next multiple of the unit that one would write a number of this size in."""
    unit = unit_of(value)
    return round(math.ceil(value / unit - 1e-9) * unit, 6)


def _energy_unit(c3_km2_s2: float) -> float:
    """C3 is written to 1, 2 or 5 km²/s²."""
    return 1.0 if c3_km2_s2 < 30.0 else 2.0 if c3_km2_s2 < 60.0 else 5.0


def _speed_unit(v_inf_km_s: float) -> float:
    """Excess speeds are written to a tenth or half a km/s."""
    return 0.1 if v_inf_km_s < 3.0 else 0.5


def _burn_unit(_burn_km_s: float) -> float:
    """Burns at flybys are written to a tenth of a km/s."""
    return 0.1


def _flight_unit(tof_days: float) -> float:
    """Flight times are written to ten days, or to fifty, or to half a thousand."""
    return 10.0 if tof_days < 600.0 else 50.0 if tof_days < 3000.0 else 500.0


def windows_within(
    orbits: Sequence[OrbitSize],
    spans: Sequence[tuple[float, float]],
    steps: Sequence[float],
    ephemeris: Ephemeris,
) -> list[Window]:
    """Windows of these spans of TDB Julian dates, within the ephemeris; RequestError where it has none."""
    earliest, latest = coverage(ephemeris, [each.body for each in orbits])
    windows = []
    for each, (first, last), step in zip(orbits, spans, steps, strict=True):
        start, end = max(first, earliest + 1.0), min(last, latest - 1.0)
        if start >= end:
            raise RequestError(
                f"{each.body.name}: reached after {day_of(first)}, which is outside what {ephemeris.label} "
                "covers; give an earlier year"
            )
        windows.append(Window(each.body.name, day_of(start), day_of(end), step, each.period_days))
    return windows


def coverage(ephemeris: Ephemeris, route: Sequence[Body]) -> tuple[float, float]:
    """First and last TDB Julian date that the ephemeris has for every body of a route."""
    spans = [ephemeris.coverage(body) for body in route]
    return max(first for first, _ in spans), min(last for _, last in spans)


def day_of(jd: float) -> date:
    """The calendar day whose midnight is nearest to a Julian date."""
    return date.fromordinal(round(float(jd) - _JD_OF_ORDINAL_ZERO))

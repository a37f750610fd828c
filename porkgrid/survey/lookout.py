"""A quick look at a route over coarse windows: the engine's own cells, with what a proposal needs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from porkgrid.scenario import Capture, Encounter, Flyby, Leg, Parking, Rank, Scenario
from porkgrid.scenario.proposal import Window
from porkgrid.scenario.usualorbits import CAPTURE, PARKING
from porkgrid.survey.plan import Plan, make_plan
from porkgrid.survey.store import BLOCKED_BY
from porkgrid.survey.tiles import compute_tile

_KEPT = ("c3_km2_s2", "v_inf_arrival_km_s", "tof_days", "dv_total_km_s")


@dataclass(frozen=True, eq=False)
class Sight:
    """What a look shows: departures (n,), arrivals (m,) TDB Julian dates; the rest (n, m), NaN: no flight."""

    departures_jd: np.ndarray
    arrivals_jd: np.ndarray
    c3_km2_s2: np.ndarray
    v_inf_arrival_km_s: np.ndarray
    tof_days: np.ndarray
    dv_total_km_s: np.ndarray
    flybys_jd: tuple[np.ndarray, ...]  # (n, m) for every flyby
    burns_km_s: tuple[np.ndarray, ...]


def look(windows: Sequence[Window], max_burn_km_s: float) -> Sight:
    """Fly a route over these windows, flybys with burns up to `max_burn_km_s`; errors as of make_plan."""
    plan = make_plan(_scenario(windows, max_burn_km_s))
    kept = {name: np.full(plan.shape, np.nan) for name in _names(plan)}
    for tile in plan.tiles:
        values, _ = compute_tile(plan, tile)
        flown = values[BLOCKED_BY] == 0
        for name, whole in kept.items():
            whole[tile.rows, tile.columns] = np.where(flown, values[name], np.nan)
    numbers = range(1, plan.flybys + 1)
    return Sight(
        departures_jd=plan.tables[0].jd,
        arrivals_jd=plan.tables[-1].jd,
        **{name: kept[name] for name in _KEPT},
        flybys_jd=tuple(kept[f"flyby{n}_epoch_jd_tdb"] for n in numbers),
        burns_km_s=tuple(kept[f"flyby{n}_burn_km_s"] for n in numbers),
    )


def _names(plan: Plan) -> list[str]:
    flybys = range(1, plan.flybys + 1)
    return [*_KEPT, *(f"flyby{n}_{what}" for n in flybys for what in ("epoch_jd_tdb", "burn_km_s"))]


def _scenario(windows: Sequence[Window], max_burn_km_s: float) -> Scenario:
    last = len(windows) - 1
    encounters = [
        Encounter(
            body=window.body,
            first=window.first,
            last=window.last,
            step_days=window.step_days,
            parking=_parking(window.body) if index == 0 else None,
            flyby=Flyby(max_burn_km_s=max_burn_km_s) if 0 < index < last else None,
            capture=_capture(window.body) if index == last else None,
        )
        for index, window in enumerate(windows)
    ]
    burns = tuple(f"flyby{n}_burn_km_s" for n in range(1, last))
    return Scenario(
        name="look",
        description="",
        encounters=tuple(encounters),
        legs=(Leg(),) * last,
        limits={},
        rank=Rank(by="dv_total_km_s"),
        kernels=(),
        bodies={},
        measures=(*_KEPT, *burns),
        path=Path("look"),
        text="",
    )


def _parking(body: str) -> Parking:
    orbit = PARKING[body]
    return Parking(
        periapsis_altitude_km=orbit.periapsis_altitude_km, apoapsis_altitude_km=orbit.apoapsis_altitude_km
    )


def _capture(body: str) -> Capture:
    orbit = CAPTURE[body]
    return Capture(
        periapsis_altitude_km=orbit.periapsis_altitude_km, apoapsis_altitude_km=orbit.apoapsis_altitude_km
    )

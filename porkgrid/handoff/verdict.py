"""Judge a full-force solution against the thresholds of the report."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

import numpy as np

from porkgrid.handoff.report import (
    CHANGED,
    CONFIRMED,
    FAILED,
    LARGEST_C3_CHANGE_PERCENT,
    LARGEST_EXTRA_DV_M_S,
    LARGEST_MISS_KM,
    LARGEST_SHIFT_DAYS,
)
from porkgrid.handoff.stops import Pass, Stop
from porkgrid.survey.cells import Cells
from porkgrid.survey.limits import Bound

# A radius that is held at the least allowed meets it to its tolerance only.
_RADIUS_ROUNDING = 1e-6


def keeps_altitudes(stops: Sequence[Stop], cells: Cells) -> list[bool]:
    """Whether each flyby passes at its least allowed radius or above."""
    passes = [stop for stop in stops if isinstance(stop, Pass)]
    return [
        flyby.periapsis_km.item() >= stop.least_radius_km * (1.0 - _RADIUS_ROUNDING)
        for stop, flyby in zip(passes, cells.flybys, strict=True)
    ]


def extra_dv_m_s(before: Cells, after: Cells) -> float:
    """How much more the full-force trajectory burns than the patched one, m/s.

    Departure burn where there is a parking orbit, flybys, and capture where there is a capture orbit.
    """
    return 1000.0 * (_burns(after) - _burns(before))


def judge(
    ended: str,
    converged: bool,
    misses_km: Sequence[float],
    stops: Sequence[Stop],
    before: Cells,
    after: Cells,
    bounds: Sequence[Bound],
) -> tuple[str, tuple[str, ...]]:
    """The verdict and the reasons for it, one sentence each."""
    failures = []
    if not converged:
        failures.append(f"the legs could not be joined: {ended}")
    for leg, miss in enumerate(misses_km, start=1):
        if not miss < LARGEST_MISS_KM:
            failures.append(f"leg {leg} flown in one arc misses its target by {miss:.3g} km")
    for n, kept in enumerate(keeps_altitudes(stops, after), start=1):
        if not kept:
            altitude = after.flybys[n - 1].periapsis_km.item() - (after.flybys[n - 1].body.radius_km or 0.0)
            failures.append(
                f"flyby {n} would pass at {altitude:.0f} km altitude, under the least allowed, "
                "between these dates of departure and arrival"
            )
    found = [*changes(before, after), *_broken(bounds, before, after)]
    if failures:
        return FAILED, (*failures, *found)
    return (CHANGED, tuple(found)) if found else (CONFIRMED, ())


def changes(before: Cells, after: Cells) -> Iterator[str]:
    """What differs by more than a confirmation allows, one sentence each."""
    c3, new = before.c3.item(), after.c3.item()
    if new > c3 * (1.0 + 0.01 * LARGEST_C3_CHANGE_PERCENT):
        yield f"C3 grows from {c3:.2f} to {new:.2f} km²/s²"
    extra = extra_dv_m_s(before, after)
    if extra > LARGEST_EXTRA_DV_M_S:
        yield f"the burns grow by {extra:.0f} m/s"
    flybys = zip(before.legs[:-1], after.legs[:-1], strict=True)
    for n, (leg, flown) in enumerate(flybys, start=1):
        shift = float(flown.jd2.item() - leg.jd2.item())
        if abs(shift) > LARGEST_SHIFT_DAYS:
            yield f"flyby {n} moves by {shift:+.2f} days"


def _broken(bounds: Sequence[Bound], before: Cells, after: Cells) -> Iterator[str]:
    for bound in bounds:
        if bound.measure.name.endswith("altitude_km"):
            continue  # `keeps_altitudes` has looked at these
        old, new = (float(np.ravel(bound.measure.compute(cells))[0]) for cells in (before, after))
        broken = bool(bound.forbids(np.array([new]))[0]) and not math.isnan(new)
        if broken and not bool(bound.forbids(np.array([old]))[0]):
            yield f"limit broken: {bound.title}; patched {old:.6g}, full-force {new:.6g}"


def _burns(cells: Cells) -> float:
    total = sum(flyby.burn_km_s.item() for flyby in cells.flybys)
    if cells.parking is not None:
        total += cells.dv_departure.item()
    if cells.capture is not None:
        total += cells.dv_capture.item()
    return total

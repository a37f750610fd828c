"""What the flybys of a scenario allow, as limits like any other; and what a search cannot do."""

from __future__ import annotations

import os
from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING

from porkgrid.errors import RequestError
from porkgrid.scenario import Scenario
from porkgrid.sky.bodies import Body
from porkgrid.survey.chains import memory_bytes
from porkgrid.survey.limits import BITS, REASONS, Bound
from porkgrid.survey.measures import EVERY_LEG, FLYBY, SUM, Measure

if TYPE_CHECKING:
    from porkgrid.survey.plan import Plan

_MEMORY_SHARE = 0.6  # of the machine's memory that a search may take


def with_flyby_bounds(
    bounds: Sequence[Bound], scenario: Scenario, bodies: Sequence[Body], measures: dict[str, Measure]
) -> tuple[Bound, ...]:
    """The limits with each flyby's least altitude and largest burn; the tighter where both are given."""
    merged = {bound.measure.name: bound for bound in bounds}
    for n, (encounter, body) in enumerate(zip(scenario.encounters[1:-1], bodies[1:-1], strict=True), start=1):
        assert encounter.flyby is not None  # the scenario gives every encounter between the ends one
        lowest = encounter.flyby.min_altitude_km
        lowest = (body.min_flyby_altitude_km or 0.0) if lowest is None else lowest
        for bound in (
            Bound(measures[f"flyby{n}_altitude_km"], lowest, None),
            Bound(measures[f"flyby{n}_burn_km_s"], None, encounter.flyby.max_burn_km_s),
        ):
            name = bound.measure.name
            merged[name] = _tighter(merged[name], bound) if name in merged else bound
    return tuple(merged.values())


def _tighter(a: Bound, b: Bound) -> Bound:
    least = [bound.least for bound in (a, b) if bound.least is not None]
    most = [bound.most for bound in (a, b) if bound.most is not None]
    return Bound(a.measure, max(least, default=None), min(most, default=None))


def refuse_unsearchable(plan: Plan) -> None:
    """Raise RequestError with everything in a scenario with flybys that a search cannot honour exactly."""
    faults = [
        *_rank_faults(plan),
        *_limit_faults(plan),
        *_burn_faults(plan),
        *_count_faults(plan),
        *_memory_faults(plan),
    ]
    if faults:
        raise RequestError(*(f"{plan.scenario.path}: {fault}" for fault in faults))


def _rank_faults(plan: Plan) -> Iterator[str]:
    if plan.measures[plan.rank_by].scope in (EVERY_LEG, FLYBY):
        yield (
            f"rank, by: {plan.rank_by!r} does not add up over legs and burns, so flyby dates cannot be "
            "searched by it; rank by dv_total_km_s or a measure of one leg, and limit it instead"
        )


def _limit_faults(plan: Plan) -> Iterator[str]:
    for bound in plan.bounds:
        name = bound.measure.name
        if bound.measure.scope == EVERY_LEG:
            wrong = bound.most if name == "sun_min_au" else bound.least
            if wrong is not None:
                end, other = ("max", "min") if name == "sun_min_au" else ("min", "max")
                yield (
                    f"limits, {name}: {end} asks that some leg comes that near or far, which a search of "
                    f"legs cannot know; give {other}, or limit one leg, such as leg1_{name}"
                )
        if bound.measure.scope == SUM and plan.flybys > 1 and plan.objective.name != name:
            yield (
                f"limits, {name}: with several flybys it can be honoured only where {name} is what is "
                f"ranked; rank by {name}, or limit dv_departure_km_s and the burns"
            )


def _burn_faults(plan: Plan) -> Iterator[str]:
    for bound in plan.bounds:
        if bound.measure.scope == FLYBY and "burn" in bound.measure.name and bound.most == 0.0:
            yield (
                f"encounter {bound.measure.number + 1}, flyby, max_burn_km_s: on a grid of dates no "
                "unpowered flyby matches exactly, so 0 allows none; give what it may miss by, such as 0.2"
            )


def _count_faults(plan: Plan) -> Iterator[str]:
    most = BITS - len(REASONS)
    if len(plan.bounds) > most:
        own = len(plan.bounds) - len(plan.scenario.limits)
        yield (
            f"limits: {len(plan.scenario.limits)} limits with {own} of the flybys' own are more than the "
            f"{most} that a cell can tell apart; leave out {len(plan.bounds) - most}"
        )


def _memory_faults(plan: Plan) -> Iterator[str]:
    need = memory_bytes(plan, plan.chunks[0])
    there = _MEMORY_SHARE * os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES")
    if need > there:
        factor = (need / there) ** 0.5  # legs are pairs of dates
        steps = ", ".join(f"{1.05 * factor * each.step_days:.2g}" for each in plan.scenario.encounters)
        yield (
            f"encounter, step_days: legs between flybys take {need / 1e9:.1f} GB, and {there / 1e9:.1f} GB "
            f"may be used; steps of {steps} days would fit"
        )

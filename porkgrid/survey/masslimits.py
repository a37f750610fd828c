"""What launcher, tank and stages allow, as limits like any other, named after what forbids."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

from porkgrid.scenario import Scenario
from porkgrid.survey.limits import Bound
from porkgrid.survey.masses import stage_reach_km_s
from porkgrid.survey.measures import Measure


def with_mass_bounds(
    bounds: Sequence[Bound], scenario: Scenario, measures: Mapping[str, Measure]
) -> tuple[Bound, ...]:
    """The limits with those of launcher tables, tank and stages."""
    return (*bounds, *_launcher_bounds(scenario, measures), *_own_bounds(scenario, measures))


def _launcher_bounds(scenario: Scenario, measures: Mapping[str, Measure]) -> Iterator[Bound]:
    launcher = scenario.launcher
    if launcher is None:
        return
    first, last = launcher.c3_km2_s2[0], launcher.c3_km2_s2[-1]
    words = f"{launcher.name}'s table, C3 {first:g} to {last:g} km²/s²"
    yield Bound(measures["c3_km2_s2"], first, last, "launcher_c3", words)
    if launcher.dla_deg is not None and "dla_deg" in measures:
        most = launcher.dla_deg[-1]
        words = f"{launcher.name}'s table, DLA within ±{most:g}°"
        yield Bound(measures["dla_deg"], -most, most, "launcher_dla", words)


def _own_bounds(scenario: Scenario, measures: Mapping[str, Measure]) -> Iterator[Bound]:
    craft = scenario.spacecraft
    if craft is not None and craft.tank_kg is not None and craft.dry_mass_kg is not None:
        words = f"tank of {craft.tank_kg:g} kg"
        yield Bound(measures["propellant_kg"], None, craft.tank_kg, "spacecraft_tank", words)
    if scenario.stack is None:
        return
    for number, stage in enumerate(scenario.stack.stages, start=1):
        reach = stage_reach_km_s(stage)
        words = f"stage {number}, which reaches {reach:.2f} km/s"
        yield Bound(measures[f"stage{number}_dv_km_s"], None, reach, f"stage{number}_reach", words)

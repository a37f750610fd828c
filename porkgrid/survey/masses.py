"""Masses of every cell: what a launcher injects, what engines burn, what a stack must weigh in low orbit.

The rocket equation with the Δv split of the cell (physics.staging). A launcher makes the departure, so that
its spacecraft burns at flybys and at capture only; without one the spacecraft, or the stack, makes them all.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property, reduce
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from porkgrid.physics.burns import apsis_burn
from porkgrid.physics.staging import (
    mass_ratio,
    propellant_after,
    stage_dv_limit,
    stage_propellant,
    stage_structure,
)
from porkgrid.scenario import Launcher, Scenario, Spacecraft, Stack, Stage
from porkgrid.scenario.launchers import Capability, DlaPenalty
from porkgrid.sky.bodies import Body, gm_of
from porkgrid.survey.orbits import ApsisOrbit

if TYPE_CHECKING:
    from porkgrid.survey.cells import Cells

SAME_DV = 1e-12  # a stage's greatest Δv is out of reach itself: it would be all propellant


@dataclass(frozen=True, eq=False)
class Masses:
    """What flies a route: any of a launcher, a spacecraft and a stack."""

    capability: Capability | None = None
    dla_penalty: DlaPenalty | None = None
    spacecraft: Spacecraft | None = None
    stack: Stack | None = None

    @property
    def features(self) -> frozenset[str]:
        """Keys of measures.FEATURES."""
        ascent = [stage.ascent_dv_km_s > 0.0 for stage in self.stack.stages] if self.stack else None
        craft = self.spacecraft
        dry = None if craft is None else craft.dry_mass_kg is not None
        return mass_features(self.capability is not None, dry, ascent)


def mass_features(launcher: bool, dry: bool | None, ascent: list[bool] | None) -> frozenset[str]:
    """Keys of measures.FEATURES for what flies.

    `dry`: whether the spacecraft's dry mass is given, None without a spacecraft; `ascent`: whether each stage
    flies a part of the ascent, None without a stack.
    """
    stack, craft = ascent is not None, dry is not None
    has = {
        "launcher": launcher,
        "spacecraft": craft,
        "dry mass": bool(dry),
        "propellant": stack or bool(dry) or (launcher and craft),
        "low orbit": stack or (bool(dry) and not launcher),
        "ascent": any(ascent or ()),
    }
    stages = {f"stage {n}" for n in range(1, len(ascent or ()) + 1)}
    return frozenset(name for name, present in has.items() if present) | stages


def masses_of(scenario: Scenario) -> Masses:
    """The masses that a scenario gives."""
    launcher = scenario.launcher
    return Masses(
        None if launcher is None else _capability(launcher),
        None if launcher is None else _penalty(launcher),
        scenario.spacecraft,
        scenario.stack,
    )


def stage_reach_km_s(stage: Stage) -> float:
    """The Δv that a stage cannot reach whatever its size."""
    return float(stage_dv_limit(stage.isp_s, stage.structural_fraction)) * (1.0 - SAME_DV)


def stage_shortfalls(stack: Stack, parking: ApsisOrbit, body: Body) -> Iterator[tuple[int, float, float]]:
    """Stages that no date can satisfy: number, Δv it is asked for at least, and Δv that it cannot reach.

    A departure takes at least the burn that escapes; other burns may be nothing.
    """
    escape = float(apsis_burn(0.0, parking.periapsis_km, parking.apoapsis_km, gm_of(body)))
    for number, stage in enumerate(stack.stages, start=1):
        asked = stage.ascent_dv_km_s + (escape if "departure" in stage.flies else 0.0)
        reach = stage_reach_km_s(stage)
        if asked >= reach:
            yield number, asked, reach


class Budget:
    """The masses of the cells of a grid, (n, m) kg; each is computed when it is first asked for."""

    def __init__(self, masses: Masses, cells: Cells) -> None:
        self.masses = masses
        self.cells = cells

    @cached_property
    def injected_kg(self) -> np.ndarray:
        """What the launcher injects to the cell's C3 and declination; NaN outside its tables."""
        assert self.masses.capability is not None
        mass = self.masses.capability.mass_kg(self.cells.c3)
        if self.masses.dla_penalty is None:
            return mass
        return mass * self.masses.dla_penalty.factor(np.degrees(self.cells.departure_declination_rad))

    @cached_property
    def spacecraft_dv_km_s(self) -> np.ndarray:
        """Sum of the burns that the spacecraft's own engine makes."""
        own = self.cells.dv_after_departure
        return own if self.masses.capability is not None else self.cells.dv_departure + own

    @cached_property
    def _spent_per_kg(self) -> np.ndarray:
        """Propellant burnt for each kilogram left after the last burn."""
        return propellant_after(1.0, self.spacecraft_dv_km_s, self._spacecraft.isp_s)

    @cached_property
    def delivered_kg(self) -> np.ndarray:
        """What is left of the injected mass after the last burn; no more than a full tank can push there."""
        delivered = self.injected_kg / (1.0 + self._spent_per_kg)
        tank = self._spacecraft.tank_kg
        if tank is None:
            return delivered
        with np.errstate(divide="ignore"):  # a route without burns needs no tank
            return np.minimum(delivered, tank / self._spent_per_kg)

    @property
    def margin_kg(self) -> np.ndarray:
        """What could be delivered above the spacecraft's dry mass."""
        assert self._spacecraft.dry_mass_kg is not None
        return self.delivered_kg - self._spacecraft.dry_mass_kg

    @property
    def propellant_kg(self) -> np.ndarray:
        """All propellant: of the stages, or what the spacecraft burns to bring its dry mass there.

        Without a dry mass it is what the delivered mass has cost.
        """
        if self.masses.stack is not None:
            return reduce(np.add, [propellant for _, _, propellant in self._stack])
        dry = self._spacecraft.dry_mass_kg
        return (self.delivered_kg if dry is None else dry) * self._spent_per_kg

    @property
    def low_orbit_kg(self) -> np.ndarray:
        """Mass in the parking orbit before the departure burn."""
        if self.masses.stack is None:
            assert self._spacecraft.dry_mass_kg is not None
            return self._spacecraft.dry_mass_kg * (1.0 + self._spent_per_kg)
        number = next(n for n, stage in enumerate(self.masses.stack.stages, start=1) if stage.flies)
        stage = self.masses.stack.stages[number - 1]
        return self._gross_kg(number) / mass_ratio(stage.ascent_dv_km_s, stage.isp_s)

    @property
    def liftoff_kg(self) -> np.ndarray:
        """Mass on the ground of a stack that flies the ascent."""
        return self._gross_kg(1)

    def stage_dv_km_s(self, number: int) -> np.ndarray:
        """What stage `number` (from 1, the lowest) must give: its burns and its share of the ascent."""
        return self._stack[number - 1][0]

    def stage_propellant_kg(self, number: int) -> np.ndarray:
        """Propellant of stage `number` (from 1, the lowest); NaN where no size of it reaches its Δv."""
        return self._stack[number - 1][2]

    @property
    def _spacecraft(self) -> Spacecraft:
        assert self.masses.spacecraft is not None
        return self.masses.spacecraft

    def _gross_kg(self, number: int) -> np.ndarray:
        """Mass of stage `number` full, with all that it carries."""
        assert self.masses.stack is not None
        _, above, propellant = self._stack[number - 1]
        structure = stage_structure(propellant, self.masses.stack.stages[number - 1].structural_fraction)
        return above + propellant + structure

    @cached_property
    def _stack(self) -> list[tuple[np.ndarray, np.ndarray, np.ndarray]]:
        """Per stage from the lowest: its Δv, the mass above it, its propellant; sized from the top down."""
        assert self.masses.stack is not None
        above: np.ndarray = np.asarray(self.masses.stack.payload_kg)
        sized = []
        for stage in reversed(self.masses.stack.stages):
            dv = self._in_space_dv(stage) + stage.ascent_dv_km_s
            propellant = stage_propellant(above, dv, stage.isp_s, stage.structural_fraction)
            sized.append((dv, above, propellant))
            above = above + propellant + stage_structure(propellant, stage.structural_fraction)
        return sized[::-1]

    def _in_space_dv(self, stage: Stage) -> np.ndarray:
        burns = [self.cells.burn_named(name) for name in stage.flies]
        return reduce(np.add, burns, np.zeros(())) if len(burns) != 1 else burns[0]


def _capability(launcher: Launcher) -> Capability:
    return Capability(launcher.name, Path(), launcher.c3_km2_s2, launcher.injected_mass_kg)


def _penalty(launcher: Launcher) -> DlaPenalty | None:
    if launcher.dla_deg is None or launcher.mass_factor is None:
        return None
    return DlaPenalty(launcher.name, Path(), launcher.dla_deg, launcher.mass_factor)

"""What flies: a launcher by its table of injected mass, a spacecraft by its engine, or a stack of stages."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path
from typing import Any

from pydantic import Field

from porkgrid.scenario.faults import Fault, nearest, shown
from porkgrid.scenario.parts import Part

MAX_STAGES = 8  # practice: flown stacks have up to five


class LauncherFiles(Part):
    """A launcher's tables, CSV files beside the scenario."""

    table: str = Field(examples=['"launchers/kittiwake-medium.csv"'])
    dla_table: str | None = None
    name: str | None = None


class Launcher(Part):
    """Mass that a launcher injects: by C3, and what share of it is left at high declinations."""

    name: str
    c3_km2_s2: tuple[float, ...]  # ascending
    injected_mass_kg: tuple[float, ...]
    dla_deg: tuple[float, ...] | None = None  # of |DLA|, ascending
    mass_factor: tuple[float, ...] | None = None


class Spacecraft(Part):
    """A spacecraft by its engine, and what it weighs without propellant or how much its tank holds."""

    isp_s: float = Field(gt=0, le=10_000, examples=["320"])
    dry_mass_kg: float | None = Field(default=None, gt=0)
    tank_kg: float | None = Field(default=None, gt=0)


class Stage(Part):
    """One stage: structural_fraction is structure / (structure + propellant)."""

    isp_s: float = Field(gt=0, le=10_000, examples=["450"])
    structural_fraction: float = Field(ge=0, lt=1, examples=["0.1"])
    flies: list[str] = Field(default=[], examples=['["departure"]'])
    ascent_dv_km_s: float = Field(default=0.0, ge=0)  # its share of the way to the parking orbit


class Stack(Part):
    """Stages from the lowest up, and the payload on top of them."""

    payload_kg: float
    stages: tuple[Stage, ...]


def manoeuvres_of(encounters: int, capture: bool) -> list[str]:
    """Names of a route's burns in flying order: departure, flyby1, …, capture."""
    flybys = [f"flyby{n}" for n in range(1, max(encounters - 1, 1))]
    return ["departure", *flybys, *(["capture"] if capture else [])]


def stage_faults(stages: Sequence[Stage | None], manoeuvres: Sequence[str]) -> Iterator[Fault]:
    """Faults of who flies what: each burn of the route by one stage, lower stages first, the ascent too."""
    flown: dict[str, int] = {}
    latest, latest_stage = -1, 0
    in_space = 0
    for number, stage in enumerate(stages, start=1):
        if stage is None:
            continue
        key = f"stack.stage {number}, flies"
        if not stage.flies and not stage.ascent_dv_km_s:
            yield Fault(key, f"missing; name its burns ({', '.join(manoeuvres)}), or give ascent_dv_km_s")
        for name in stage.flies:
            if name not in manoeuvres:
                yield Fault(key, f"{shown(name)} is no burn of this route; {nearest(name, manoeuvres)}")
            elif name in flown:
                yield Fault(key, f"{name} is flown by stage {flown[name]} already; name it once")
            else:
                flown[name] = number
                if manoeuvres.index(name) < latest:
                    yield Fault(key, f"{name} comes before what stage {latest_stage} flies; list stages from "
                                "the lowest up")  # fmt: skip
                latest, latest_stage = max(latest, manoeuvres.index(name)), number
        if stage.ascent_dv_km_s and in_space:
            yield Fault(f"stack.stage {number}, ascent_dv_km_s", f"stage {in_space} below it flies in space "
                        "already; the ascent comes first")  # fmt: skip
        in_space = in_space or (number if stage.flies else 0)
    if None not in stages and (left := [name for name in manoeuvres if name not in flown]):
        yield Fault("stack", f"no stage flies {', '.join(left)}; name it in the flies of a stage")


def combination_faults(
    table: Mapping[str, Any], spacecraft: Spacecraft | None, parking: bool
) -> Iterator[Fault]:
    """Faults of launcher, spacecraft and stack beside each other."""
    launcher, stack = "launcher" in table, "stack" in table
    if launcher and stack:
        yield Fault("stack", "is given beside [launcher], which injects already; leave one of them out")
    if stack and "spacecraft" in table:
        yield Fault("spacecraft", "is given beside [stack]; make its engine the last [[stack.stage]]")
    if "spacecraft" in table and not launcher and spacecraft and spacecraft.dry_mass_kg is None:
        what = "missing, and there is no [launcher] to say what is injected; give one or the other"
        yield Fault("spacecraft.dry_mass_kg", what)
    if not parking and (stack or ("spacecraft" in table and not launcher)):
        key = "stack" if stack else "spacecraft"
        yield Fault(key, "needs a parking orbit to start from; give parking in the first encounter")


def read_launcher_tables(files: LauncherFiles, beside: Path) -> tuple[Launcher | None, list[Fault]]:
    """The launcher with the numbers of its tables."""
    from porkgrid.scenario.launchers import read_capability, read_dla_penalty

    capability, wrong = read_capability(beside / files.table)
    faults = [Fault("launcher.table", each) for each in wrong]
    penalty = None
    if files.dla_table is not None:
        penalty, wrong = read_dla_penalty(beside / files.dla_table)
        faults += [Fault("launcher.dla_table", each) for each in wrong]
    if capability is None or faults:
        return None, faults
    return Launcher(
        name=files.name or Path(files.table).stem,
        c3_km2_s2=capability.c3_km2_s2,
        injected_mass_kg=capability.injected_mass_kg,
        dla_deg=None if penalty is None else penalty.dla_deg,
        mass_factor=None if penalty is None else penalty.mass_factor,
    ), []

"""What the user asks for: a TOML file to validated objects, every fault of the file found at once."""

from __future__ import annotations

import unicodedata
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from pydantic import BaseModel, ConfigDict

from porkgrid.scenario import sections
from porkgrid.scenario.bodies import BodySpec, body_of
from porkgrid.scenario.faults import Fault
from porkgrid.scenario.parts import Capture, Encounter, Flyby, Leg, Limit, Orbit, Parking, Rank
from porkgrid.scenario.sections import Outline
from porkgrid.scenario.showing import scenario_html, scenario_line
from porkgrid.scenario.text import parse_toml, read_text
from porkgrid.scenario.vehicles import Launcher, Spacecraft, Stack, Stage
from porkgrid.sky.bodies import Body

__all__ = [
    "BodySpec",
    "Capture",
    "Draft",
    "Encounter",
    "Flyby",
    "Launcher",
    "Leg",
    "Limit",
    "Orbit",
    "Outline",
    "Parking",
    "Rank",
    "Scenario",
    "Spacecraft",
    "Stack",
    "Stage",
    "body_of",
    "draft_of",
    "read_scenario",
    "slug_of",
]

SLUG_LENGTH = 60  # characters, at most 240 bytes: file systems allow 255


def slug_of(name: str) -> str:
    """A name as a folder has it: lower case, accents dropped, hyphens between words."""
    plain = unicodedata.normalize("NFKD", name.lower())
    unaccented = "".join(each for each in plain if not unicodedata.combining(each))
    words = "".join(each if each.isalnum() else " " for each in unaccented).split()
    return "-".join(words)[:SLUG_LENGTH].strip("-")


class Scenario(BaseModel):
    """A faultless request. It came from the file `path` with this `text`.

    Fields are the tables of the file under the same names, with the same units: dates of the TDB calendar,
    steps in days, altitudes in km, masses in kg, limits in the unit that ends the measure's name. Encounters
    stand in flying order. A scenario cannot be changed; write another file.

    >>> scenario = porkgrid.load_scenario("scenarios/tern-to-mars.toml")
    >>> scenario.encounters[0].body, scenario.encounters[0].step_days, scenario.limits["c3_km2_s2"].max
    ('earth', 1.0, 25.0)
    """

    model_config = ConfigDict(frozen=True)

    name: str
    description: str
    encounters: tuple[Encounter, ...]  # in flying order; each between the ends has a flyby
    legs: tuple[Leg, ...]  # one fewer than encounters
    limits: dict[str, Limit]
    rank: Rank
    launcher: Launcher | None = None
    spacecraft: Spacecraft | None = None
    stack: Stack | None = None
    kernels: tuple[Path, ...]
    bodies: dict[str, BodySpec]
    measures: tuple[str, ...] | None  # to store; None: every one
    path: Path
    text: str

    @property
    def slug(self) -> str:
        """The name as a folder has it: lower case, accents dropped, hyphens between words.

        >>> porkgrid.load_scenario("scenarios/tern-to-mars.toml").slug
        'tern-to-mars'
        """
        return slug_of(self.name)

    @property
    def own_bodies(self) -> dict[str, Body]:
        """The bodies of the file's [bodies] tables, by name.

        >>> porkgrid.load_scenario("scenarios/tern-to-mars.toml").own_bodies
        {}
        """
        return {name: body_of(name, spec) for name, spec in self.bodies.items()}

    def __repr__(self) -> str:
        return scenario_line(self)

    __str__ = __repr__

    def _repr_html_(self) -> str:
        return scenario_html(self)


@dataclass(frozen=True)
class Draft:
    """What a file says as far as it can be understood, and all faults of its structure."""

    path: Path
    faults: tuple[Fault, ...]
    outlines: tuple[Outline, ...] = ()
    legs: tuple[Leg | None, ...] = ()
    limits: tuple[str, ...] = ()  # names of measures, whatever their bounds are worth
    rank_by: str | None = None
    vehicles: Mapping[str, Any] = field(default_factory=dict)  # the tables as given, right or wrong
    measures: tuple[str, ...] = ()
    kernels: tuple[Path, ...] = ()
    bodies: Mapping[str, BodySpec | None] = field(default_factory=dict)
    scenario: Scenario | None = None  # None where there are faults


def read_scenario(path: str | Path, beside: Path | None = None) -> Draft:
    """Read a scenario file and check its structure; faults of any kind are in the draft, none are raised.

    Relative paths of kernels count from the folder `beside`, by default the file's own.
    """
    path = Path(path)
    text, faults = read_text(path)
    if faults:
        return Draft(path, tuple(faults))
    return draft_of(text, path, path.parent if beside is None else beside)


def draft_of(text: str, path: Path, beside: Path) -> Draft:
    """The draft of a scenario's text, which is or might be in the file `path`."""
    table, faults = parse_toml(text)
    if faults:
        return Draft(path, tuple(faults))
    return _draft(path, text, table, beside)


def _draft(path: Path, text: str, table: dict[str, Any], beside: Path) -> Draft:
    heading, heading_faults = sections.read_heading(table)
    outlines, encounter_faults = sections.read_encounters(table)
    legs, leg_faults = sections.read_legs(table, len(outlines))
    limits, limit_faults = sections.read_limits(table)
    rank, rank_by, rank_faults = sections.read_rank(table)
    vehicles, vehicle_faults = sections.read_vehicles(table, outlines, beside)
    bodies, body_faults = sections.read_bodies(table)
    kernel_names, kernel_faults = sections.read_texts(table, "kernels", '["heron.bsp"]')
    measures, measure_faults = sections.read_texts(table, "measures", '["c3_km2_s2", "tof_days"]')
    faults = [*sections.unknown_keys(table), *heading_faults, *encounter_faults, *leg_faults, *limit_faults]
    faults += [*rank_faults, *vehicle_faults, *kernel_faults, *body_faults, *measure_faults]
    kernels = tuple(beside / each for each in kernel_names or ())  # absolute paths stay as they are
    scenario = None
    if heading is not None and not faults:
        scenario = Scenario(
            name=heading.name,
            description=heading.description,
            encounters=tuple(each.whole for each in outlines if each.whole),
            legs=tuple(leg for leg in legs if leg),
            limits={name: limit for name, limit in limits.items() if limit},
            rank=rank or Rank(),
            launcher=vehicles.launcher,
            spacecraft=vehicles.spacecraft,
            stack=vehicles.stack,
            kernels=kernels,
            bodies={name: body for name, body in bodies.items() if body},
            measures=None if measures is None else tuple(measures),
            path=path,
            text=text,
        )
    return Draft(
        path=path,
        faults=tuple(faults),
        outlines=tuple(outlines),
        legs=tuple(legs),
        limits=tuple(limits),
        rank_by=rank_by,
        vehicles={key: table[key] for key in ("launcher", "spacecraft", "stack") if key in table},
        measures=tuple(measures or ()),
        kernels=kernels,
        bodies=bodies,
        scenario=scenario,
    )

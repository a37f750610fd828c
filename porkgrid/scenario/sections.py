"""The sections of a scenario's table, each read on its own, so that a fault in one hides none in another.

Every reader takes the whole table and returns what it could validate, None in the place of what it could
not, and the faults.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date
from pathlib import Path
from typing import Any, TypeVar

from pydantic import Field, ValidationError, field_validator

from porkgrid.scenario.bodies import BodySpec, combination_faults
from porkgrid.scenario.faults import Fault, broken_fields, faults_of, nearest, printable, shown
from porkgrid.scenario.parts import LONGEST_NAME, Encounter, Flyby, Leg, Limit, Part, Rank, refusal
from porkgrid.scenario.vehicles import (
    MAX_STAGES,
    Launcher,
    LauncherFiles,
    Spacecraft,
    Stack,
    Stage,
    manoeuvres_of,
    read_launcher_tables,
    stage_faults,
)
from porkgrid.scenario.vehicles import (
    combination_faults as vehicle_faults,
)
from porkgrid.sky.bodies import BODIES

MAX_ENCOUNTERS = 10  # practice: flown designs have up to about that many
MAX_LIMITS = 28  # a bit each in flags of 32 bits, four kept for reasons that are no limits

SECTIONS = ("name", "description", "encounter", "leg", "limits", "rank", "launcher", "spacecraft", "stack",
            "kernels", "bodies", "measures")  # fmt: skip

P = TypeVar("P", bound=Part)


class Heading(Part):
    """What the scenario is called."""

    name: str = Field(examples=['"Ouzel to Mars, 2028"'])
    description: str = ""

    @field_validator("name")
    @classmethod
    def _can_be_a_title_and_a_folder(cls, value: str) -> str:
        if len(value) > LONGEST_NAME:
            raise refusal(f"has {len(value)} characters; give {LONGEST_NAME} or fewer, it is a chart's title")
        if not value.isprintable():
            raise refusal("holds a line break or control character; keep it to one line")
        if not any(each.isalnum() for each in value):
            raise refusal(f"must have a letter or digit, for the survey's folder, not {shown(value)}")
        return value


@dataclass(frozen=True)
class Outline:
    """What is known of an encounter even where some of its keys are at fault; those are None."""

    body: str | int | None
    first: date | None
    last: date | None
    parking: bool  # whether the key is there, right or wrong
    capture: bool
    whole: Encounter | None  # None where anything is at fault


def unknown_keys(table: Mapping[str, Any]) -> list[Fault]:
    """Faults for keys at the top of the file that mean nothing."""
    unknown = [key for key in table if key not in SECTIONS]
    return [
        Fault(key, "makes a campaign of several routes; only `porkgrid sweep` and `check` take one")
        if key == "route"
        else Fault(printable(key), f"no such key; {nearest(key, SECTIONS)}")
        for key in unknown
    ]


def read_heading(table: Mapping[str, Any]) -> tuple[Heading | None, list[Fault]]:
    """Name and description."""
    given = {key: table[key] for key in Heading.model_fields if key in table}
    heading, faults, _ = _validated(Heading, given, "")
    return heading, faults


def read_texts(table: Mapping[str, Any], key: str, example: str) -> tuple[list[str] | None, list[Fault]]:
    """The texts of a list (None without the key), those that are right."""
    if key not in table:
        return None, []
    given = table[key]
    if not isinstance(given, list) or not given:
        return None, [Fault(key, f"must be a list such as {example}, or left out, not {shown(given)}")]
    texts: list[str] = []
    faults = []
    for number, each in enumerate(given, start=1):
        if not isinstance(each, str) or not each.strip() or not each.isprintable():
            faults.append(Fault(key, f"entry {number} must be a text as in {example}, not {shown(each)}"))
        elif each in texts:
            faults.append(Fault(key, f'"{printable(each)}" is there twice; keep one'))
        else:
            texts.append(each)
    return texts, faults


def read_encounters(table: Mapping[str, Any]) -> tuple[list[Outline], list[Fault]]:
    """Encounters in flying order; none where there are too many to be a route."""
    given, faults = _tables(table, "encounter")
    if not faults and len(given) < 2:
        many = "only one is given" if given else "missing"
        faults.append(Fault("encounter", f"{many}; a route has two [[encounter]] tables or more"))
    if len(given) > MAX_ENCOUNTERS:
        faults.append(Fault("encounter", f"{len(given)} are given; a route has {MAX_ENCOUNTERS} or fewer"))
    read = []
    for index, each in enumerate(given[:MAX_ENCOUNTERS]):
        prefix = f"encounter {index + 1}, "
        misplaced = _misplaced(each, index, len(given), prefix)
        encounter, wrong, right = _validated(Encounter, each, prefix)
        if encounter and encounter.flyby is None and 0 < index < len(given) - 1:
            encounter = encounter.model_copy(update={"flyby": Flyby()})
        whole = None if misplaced else encounter
        read.append(
            Outline(
                body=right.get("body"),
                first=right.get("first"),
                last=right.get("last"),
                parking="parking" in each,
                capture="capture" in each,
                whole=whole,
            )
        )
        faults += [*wrong, *misplaced]
    return read if len(given) <= MAX_ENCOUNTERS else [], faults


def read_legs(table: Mapping[str, Any], encounters: int) -> tuple[list[Leg | None], list[Fault]]:
    """Legs in flying order; without any [[leg]] each leg of the route has the defaults."""
    legs = max(encounters - 1, 0)
    if "leg" not in table:
        return [Leg()] * legs, []
    given, faults = _tables(table, "leg")
    if encounters >= 2 and not faults and len(given) != legs:
        what = f"{len(given)} given for {encounters} encounters; give {legs}, or none for the defaults"
        faults.append(Fault("leg", what))
    read = []
    for number, each in enumerate(given[:MAX_ENCOUNTERS], start=1):
        leg, wrong, _ = _validated(Leg, each, f"leg {number}, ")
        read.append(leg)
        faults += wrong
    return read, faults


def read_limits(table: Mapping[str, Any]) -> tuple[dict[str, Limit | None], list[Fault]]:
    """Limits by the name of their measure."""
    given, faults = _table(table, "limits")
    if len(given) > MAX_LIMITS:
        faults.append(Fault("limits", f"{len(given)} are given; give {MAX_LIMITS} or fewer"))
    read: dict[str, Limit | None] = {}
    for name, bounds in given.items():
        key = f"limits.{printable(name)}"
        if not isinstance(bounds, dict):
            what = f"must be a table such as {{ max = 25 }}, not {shown(bounds)}"
            read[name] = None
            faults.append(Fault(key, what))
            continue
        read[name], wrong, _ = _validated(Limit, bounds, f"{key}.")
        faults += wrong
    return read, faults


def read_rank(table: Mapping[str, Any]) -> tuple[Rank | None, str | None, list[Fault]]:
    """Ranking, and apart from it the measure that it names."""
    given, faults = _table(table, "rank")
    rank, wrong, right = _validated(Rank, given, "rank.")
    return rank, right.get("by"), [*faults, *wrong]


@dataclass(frozen=True)
class Vehicles:
    """What flies, as far as it could be read."""

    launcher: Launcher | None = None
    spacecraft: Spacecraft | None = None
    stack: Stack | None = None


def read_vehicles(
    table: Mapping[str, Any], outlines: list[Outline], beside: Path
) -> tuple[Vehicles, list[Fault]]:
    """Launcher with its tables, spacecraft and stack."""
    launcher = None
    faults: list[Fault] = []
    if "launcher" in table:
        given, faults = _table(table, "launcher")
        files, wrong, _ = _validated(LauncherFiles, given, "launcher.")
        faults = faults + wrong
        if files is not None and not faults:
            launcher, faults = read_launcher_tables(files, beside)
    spacecraft = None
    if "spacecraft" in table:
        given, wrong = _table(table, "spacecraft")
        faults += wrong
        spacecraft, wrong, _ = _validated(Spacecraft, given, "spacecraft.")
        faults += wrong
    stack, wrong = _read_stack(table, outlines) if "stack" in table else (None, [])
    faults += wrong
    parking = bool(outlines) and outlines[0].parking
    faults += vehicle_faults(table, spacecraft, parking)
    return Vehicles(launcher, spacecraft, stack), faults


class _Payload(Part):
    payload_kg: float = Field(gt=0, examples=["1200"])


def _read_stack(table: Mapping[str, Any], outlines: list[Outline]) -> tuple[Stack | None, list[Fault]]:
    given, faults = _table(table, "stack")
    payload, wrong, _ = _validated(_Payload, {k: v for k, v in given.items() if k != "stage"}, "stack.")
    faults = [*faults, *wrong]
    listed, wrong = _tables(given, "stage")
    faults += [Fault(f"stack.{fault.key}", fault.text) for fault in wrong]
    if not listed and not wrong:
        faults.append(Fault("stack.stage", "missing; give each under [[stack.stage]], the lowest first"))
    if len(listed) > MAX_STAGES:
        faults.append(Fault("stack.stage", f"{len(listed)} are given; give {MAX_STAGES} or fewer"))
    stages = []
    for number, each in enumerate(listed[:MAX_STAGES], start=1):
        stage, wrong, _ = _validated(Stage, each, f"stack.stage {number}, ")
        stages.append(stage)
        faults += wrong
    capture = bool(outlines) and outlines[-1].capture
    faults += stage_faults(stages, manoeuvres_of(len(outlines), capture))
    if payload is None or faults:
        return None, faults
    return Stack(payload_kg=payload.payload_kg, stages=tuple(each for each in stages if each)), []


def read_bodies(table: Mapping[str, Any]) -> tuple[dict[str, BodySpec | None], list[Fault]]:
    """Bodies of the file's own, by name."""
    given, faults = _table(table, "bodies")
    read: dict[str, BodySpec | None] = {}
    for name, spec in given.items():
        prefix = f"bodies.{printable(name)}."
        read[name] = None
        faults += _name_faults(name, read, prefix)
        if not isinstance(spec, dict):
            what = f"must be a table with naif_id or elements, not {shown(spec)}"
            faults.append(Fault(prefix.rstrip("."), what))
            continue
        body, wrong, _ = _validated(BodySpec, spec, prefix)
        clashing = [*combination_faults(spec, prefix), *_built_in_id(spec, prefix)]
        read[name] = None if clashing else body
        faults += [*wrong, *clashing]
    return read, faults


def _validated(
    model: type[P], given: dict[str, Any], prefix: str
) -> tuple[P | None, list[Fault], dict[str, Any]]:
    """The model or None, the faults, and the values of the keys that have none."""
    try:
        return model.model_validate(given), [], given
    except ValidationError as error:
        broken = broken_fields(error)
        return None, faults_of(error, model, prefix), {k: v for k, v in given.items() if k not in broken}


def _table(table: Mapping[str, Any], key: str) -> tuple[dict[str, Any], list[Fault]]:
    given = table.get(key, {})
    if isinstance(given, dict):
        return given, []
    return {}, [Fault(key, f"must be a table, [{key}], not {shown(given)}")]


def _tables(table: Mapping[str, Any], key: str) -> tuple[list[dict[str, Any]], list[Fault]]:
    given = table.get(key, [])
    if isinstance(given, dict):
        return [given], [Fault(key, f"is a single table; write [[{key}]] in double brackets, one for each")]
    if not isinstance(given, list) or not all(isinstance(each, dict) for each in given):
        return [], [Fault(key, f"must be tables, each under [[{key}]], not {shown(given)}")]
    return given, []


def _misplaced(given: dict[str, Any], index: int, count: int, prefix: str) -> list[Fault]:
    """Faults for what an encounter cannot do at its place in the route."""
    last = count - 1
    allowed = {"parking": index == 0, "capture": index == last, "flyby": 0 < index < last}
    where = {"parking": "first", "capture": "last", "flyby": "encounters between the first and the last"}
    faults = []
    for key, fits in allowed.items():
        if key in given and not fits and count >= 2:
            place = where[key] if key == "flyby" else f"the {where[key]} encounter"
            faults.append(Fault(f"{prefix}{key}", f"belongs to {place} only; remove it here"))
    return faults


def _name_faults(name: str, others: Mapping[str, Any], prefix: str) -> list[Fault]:
    key = prefix.rstrip(".")
    folded = name.strip().casefold()
    if folded in BODIES:
        return [Fault(key, f"is the name of a built-in body; choose another, such as my-{folded}")]
    if not name.isprintable() or len(name) > LONGEST_NAME or not any(each.isalpha() for each in name):
        return [Fault(key, "is not a name; give one line with a letter in it, such as [bodies.heron]")]
    if name != name.strip():
        return [Fault(key, f'has blanks at its ends; write "{name.strip()}"')]
    if any(each != name and each.casefold() == folded for each in others):
        return [Fault(key, "differs from another body's name in capitals only; rename one")]
    return []


def _built_in_id(spec: dict[str, Any], prefix: str) -> list[Fault]:
    return [
        Fault(f"{prefix}naif_id", f'is the built-in body "{body.name}"; name that in the encounter')
        for body in BODIES.values()
        if body.naif_id == spec.get("naif_id")
    ]

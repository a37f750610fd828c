"""The JSON Schema of scenario files, for editors that complete and check TOML as it is written.

It is made from the models that read the file, so that it cannot differ from them in keys, types and bounds.
What needs two tables beside each other (dates in order, measures that a route lacks) is left to `check`.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any, Protocol

from pydantic.json_schema import models_json_schema

from porkgrid.scenario.bodies import BodySpec
from porkgrid.scenario.campaign import MAX_ROUTES, Route
from porkgrid.scenario.parts import LONGEST_NAME, Encounter, Leg, Limit, Part, Rank
from porkgrid.scenario.sections import MAX_ENCOUNTERS, MAX_LIMITS, Heading
from porkgrid.scenario.vehicles import MAX_STAGES, LauncherFiles, Spacecraft, Stage
from porkgrid.sky.bodies import BODIES

Schema = dict[str, Any]

_MODELS: tuple[type[Part], ...] = (
    Heading, Encounter, Leg, Limit, Rank, BodySpec, LauncherFiles, Spacecraft, Stage, Route,
)  # fmt: skip
_UNITS = {
    "km3_s2": "km³/s²", "km2_s2": "km²/s²", "km_s": "km/s", "km": "km", "deg": "degrees", "days": "days",
    "au": "au", "kg": "kg", "s": "s",
}  # fmt: skip
_MEANINGS = {
    "first": "first date of the window", "last": "last date of the window, itself included",
    "step_days": "from one date of the window to the next", "parking": "orbit to leave; first encounter only",
    "flyby": "bounds on a flyby; not in the first encounter, nor the last",
    "capture": "orbit to be captured into; last encounter only", "body": "a body's name, or its NAIF number",
    "max_revs": "most whole revolutions about the Sun", "retrograde": "against the planets' sense",
    "by": "measure to rank candidates by", "order": "which end of the measure is better",
    "keep": "how many candidates", "apart_days": "closer than this in every date is one opportunity",
    "table": "CSV file of injected mass by C3", "dla_table": "CSV file of mass factors by declination",
    "flies": "burns that the stage makes: departure, flyby1, …, capture", "isp_s": "specific impulse",
    "structural_fraction": "structure / (structure + propellant)", "max_burn_km_s": "largest burn of a flyby",
    "ascent_dv_km_s": "its share of the way to the parking orbit", "min": "least allowed",
    "max": "most allowed", "naif_id": "its number in a kernel of the scenario", "e": "eccentricity",
    "a_au": "semi-major axis", "q_au": "perihelion distance", "i_deg": "inclination",
    "perihelion": "date of its passage",
    "node_deg": "longitude of the ascending node", "argument_deg": "argument of perihelion",
    "epoch": "date of the elements", "gm_km3_s2": "gravitational parameter", "radius_km": "equatorial radius",
    "stops": "labels, or bodies, of encounters in flying order", "leg": "how each leg of the route is flown",
}  # fmt: skip
# A date or date-time without quotes and without UTC offset, as validators of TOML hand it on
_EPOCH: Schema = {
    "anyOf": [
        {"type": "string", "format": "date"},
        {"type": "string", "pattern": r"^\d{4}-\d\d-\d\d[Tt ]\d\d:\d\d(:\d\d(\.\d+)?)?$"},
    ]
}
_ELEMENTS = ("epoch", "e", "i_deg", "node_deg", "argument_deg")
_SIZES, _PLACES = ("a_au", "q_au"), ("mean_anomaly_deg", "perihelion")


class Named(Protocol):
    """What the schema says of a measure; `{n}` in a name stands for numbers from 1."""

    @property
    def name(self) -> str:
        """As limits have it."""

    @property
    def unit(self) -> str:
        """As it is shown."""

    @property
    def meaning(self) -> str:
        """In a line."""


def scenario_schema(measures: Iterable[Named]) -> Schema:
    """The JSON Schema (draft 7) of scenario files that may name these measures."""
    known = list(measures)
    _, document = models_json_schema([(model, "validation") for model in _MODELS])
    models: dict[str, Schema] = {name: _tidy(each) for name, each in document["$defs"].items()}
    _tie_keys(models)
    models["Rank"]["properties"]["by"] = {**_measure_name(known), "description": _MEANINGS["by"]}
    heading = models.pop("Heading")["properties"]
    heading["name"] |= {"minLength": 1, "maxLength": LONGEST_NAME}
    return {
        "$schema": "http://json-schema.org/draft-07/schema#",
        "title": "porkgrid scenario",
        "type": "object",
        "additionalProperties": False,
        "required": ["name", "encounter"],
        "properties": heading | _sections(known),
        "not": {"anyOf": [{"required": ["launcher", "stack"]}, {"required": ["spacecraft", "stack"]}]},
        # labels tell the windows of a campaign apart; a single route has none
        "if": {"required": ["route"]},
        "else": {"properties": {"encounter": {"items": {"properties": {"label": False}}}}},
        "$defs": models,
    }


def _sections(measures: list[Named]) -> Schema:
    """The tables of a file beside its heading."""
    texts = {"type": "array", "minItems": 1, "uniqueItems": True, "items": {"type": "string", "minLength": 1}}
    stack = {
        "type": "object",
        "additionalProperties": False,
        "required": ["payload_kg", "stage"],
        "description": "Stages from the lowest up, and the payload on top of them.",
        "properties": {
            "payload_kg": {"type": "number", "exclusiveMinimum": 0, "description": "Payload, kg."},
            "stage": _tables("Stage", 1, MAX_STAGES),
        },
    }
    return {
        "encounter": _tables("Encounter", 2, 2 * MAX_ENCOUNTERS),
        "leg": _tables("Leg", 1, MAX_ENCOUNTERS - 1),
        "limits": _limits(measures),
        "rank": _reference("Rank"),
        "launcher": _reference("LauncherFiles"),
        "spacecraft": _reference("Spacecraft"),
        "stack": stack,
        "kernels": texts | {"description": "SPK files beside the scenario."},
        "bodies": {
            "type": "object",
            "description": "Bodies of the file's own, by name.",
            "additionalProperties": _reference("BodySpec"),
        },
        "measures": {
            "type": "array",
            "minItems": 1,
            "uniqueItems": True,
            "items": _measure_name(measures),
            "description": "Measures to store; without it every one.",
        },
        "route": _tables("Route", 1, MAX_ROUTES),
    }


def _tie_keys(models: dict[str, Schema]) -> None:
    """Add what holds between keys of one table, and the keys that readers add to models."""
    models["Capture"]["oneOf"] = _one_of("apoapsis_altitude_km", "eccentricity")
    models["Limit"]["anyOf"] = _one_of("min", "max")
    own = models["BodySpec"]
    elements = (*_ELEMENTS, *_SIZES, *_PLACES)
    own["if"] = {"required": ["naif_id"]}
    own["then"] = {"properties": dict.fromkeys(elements, False)}
    own["else"] = {
        "required": list(_ELEMENTS),
        "allOf": [{"oneOf": _one_of(*_SIZES)}, {"oneOf": _one_of(*_PLACES)}],
    }
    encounter = models["Encounter"]["properties"]
    names = [name for name in BODIES if name != "sun"]
    encounter["body"] = {
        "anyOf": [{"enum": names}, {"type": "string", "maxLength": LONGEST_NAME}, {"type": "integer"}],
        "description": f"{_MEANINGS['body']}; bodies of the file's own too.",
    }
    encounter["label"] = {"type": "string", "description": "Of a campaign's window: what stops call it."}
    models["Route"]["properties"]["leg"]["items"] = _reference("Leg")


def _limits(measures: list[Named]) -> Schema:
    bounds = {each.name: _described(each) for each in measures}
    return {
        "type": "object",
        "description": "What is allowed: measures by name, each with min, max or both.",
        "additionalProperties": False,
        "maxProperties": MAX_LIMITS,
        "properties": {name: each for name, each in bounds.items() if "{n}" not in name},
        "patternProperties": {_pattern(name): each for name, each in bounds.items() if "{n}" in name},
    }


def _described(measure: Named) -> Schema:
    unit = "" if measure.unit == "1" else f", {measure.unit}"
    return {"allOf": [_reference("Limit")], "description": f"{measure.meaning}{unit}".replace("{n}", "n")}


def _measure_name(measures: list[Named]) -> Schema:
    plain = [each.name for each in measures if "{n}" not in each.name]
    patterns = [{"type": "string", "pattern": _pattern(each.name)} for each in measures if "{n}" in each.name]
    return {"anyOf": [{"enum": plain}, *patterns]}


def _pattern(name: str) -> str:
    return f"^{name.replace('{n}', '[1-9][0-9]*')}$"


def _tables(model: str, least: int, most: int) -> Schema:
    return {"type": "array", "minItems": least, "maxItems": most, "items": _reference(model)}


def _reference(model: str) -> Schema:
    return {"$ref": f"#/$defs/{model}"}


def _one_of(*keys: str) -> list[Schema]:
    return [{"required": [key]} for key in keys]


def _tidy(model: Schema) -> Schema:
    """A model's schema with descriptions in words and units, and without null, which TOML has not."""
    properties = {key: _property(key, each) for key, each in model["properties"].items()}
    description = " ".join(model.get("description", "").replace("`", "").split())
    tidied = {key: each for key, each in model.items() if key != "title"}
    return tidied | {"description": description, "properties": properties}


def _property(key: str, given: Schema) -> Schema:
    kinds = [each for each in given.get("anyOf", [given]) if each.get("type") != "null"]
    if any(each.get("format") in ("date", "date-time") for each in kinds):
        kind: Schema = dict(_EPOCH)
    elif len(kinds) == 1:
        kind = {name: each for name, each in kinds[0].items() if name not in ("title", "examples", "default")}
    else:
        kind = {"anyOf": kinds}
    if "$ref" in kind:
        kind = {"allOf": [kind]}  # beside a reference draft 7 reads nothing else
    usual = given.get("default")
    return kind | {"description": _words(key), **({} if usual is None else {"default": usual})}


def _words(key: str) -> str:
    """What a key means, with its unit."""
    end = next((each for each in _UNITS if key.endswith(f"_{each}")), None)
    stem, unit = (key, "") if end is None else (key.removesuffix(f"_{end}"), f", {_UNITS[end]}")
    meaning = _MEANINGS.get(key, stem.replace("_", " "))
    return f"{meaning[0].upper()}{meaning[1:]}{unit}."

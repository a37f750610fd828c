"""Faults of a request as sentences: where, what is wrong, what would be right."""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Mapping
from datetime import date, datetime, time
from typing import TYPE_CHECKING, Any, NamedTuple

if TYPE_CHECKING:
    from pydantic import BaseModel, ValidationError

LONGEST_SHOWN = 40  # characters of an offending value


class Fault(NamedTuple):
    """One thing wrong with a request: the key it is wrong at ("" for the whole file) and a sentence."""

    key: str
    text: str

    def line(self, path: object) -> str:
        """The fault as the user reads it: FILE: KEY: what is wrong; what would be right."""
        return ": ".join(part for part in (str(path), self.key, self.text) if part)


def nearest(name: object, known: Iterable[str]) -> str:
    """A clause that names the most similar known name, or lists them all where none is similar."""
    names = list(known)
    folded = {each.casefold(): each for each in names}
    near = difflib.get_close_matches(str(name).casefold()[:100], folded, n=1)
    if near:
        return f'did you mean "{folded[near[0]]}"?'
    return f"valid here: {', '.join(names)}"


def printable(text: str) -> str:
    """A text of a TOML file fit for one line of a message: cut short, control characters escaped."""
    short = text if len(text) <= LONGEST_SHOWN else text[: LONGEST_SHOWN - 1] + "…"
    return short if short.isprintable() else short.encode("unicode_escape").decode("ascii")


def shown(value: object) -> str:
    """A value of a TOML file with its type in words, cut short: `the text "12"`, `a table`."""
    match value:
        case bool():
            return f"the truth value {str(value).lower()}"
        case str():
            return f'the text "{printable(value)}"'
        case int():
            # str() of an int of thousands of digits raises; such a number is only described
            return f"the number {value}" if abs(value) < 10**LONGEST_SHOWN else "a huge whole number"
        case float():
            return f"the number {value}"
        case datetime():
            return f"the date-time {value.isoformat()}"
        case date():
            return f"the date {value.isoformat()}"
        case time():
            return f"the time of day {value.isoformat()}"
        case Mapping():
            return "a table" if value else "an empty table"
        case list() | tuple():
            return f"a list of {len(value)}" if value else "an empty list"
    return f"a {type(value).__name__}"


def faults_of(error: ValidationError, model: type[BaseModel], prefix: str) -> list[Fault]:
    """Faults of a table that pydantic refused; `prefix` ("rank.", "encounter 2, ") leads to its keys."""
    return [_fault(each, model, prefix) for each in error.errors(include_url=False)]


def broken_fields(error: ValidationError) -> set[str]:
    """Names of the fields of the section that have a fault."""
    return {str(each["loc"][0]) for each in error.errors(include_url=False) if each["loc"]}


def _fault(error: Any, model: type[BaseModel], prefix: str) -> Fault:
    location = [printable(str(part)) for part in error["loc"]]
    key = prefix + ".".join(location) if location else prefix.rstrip(" ,.")
    return Fault(key, _sentence(error, _model_at(model, location[:-1]), location))


def _sentence(error: Any, model: type[BaseModel], location: list[str]) -> str:
    """Say an error in our words. Types: https://docs.pydantic.dev/latest/errors/validation_errors/."""
    context, given = error.get("ctx", {}), shown(error["input"])
    match error["type"]:
        case "missing":
            return f"missing; give for example {location[-1]} = {_example(model, location[-1])}"
        case "extra_forbidden":
            return f"no such key; {nearest(location[-1], model.model_fields)}"
        case "finite_number":
            return f"{given} is not finite; give a finite number"
        case "greater_than":
            return f"must be above {context['gt']:g}, not {given}"
        case "greater_than_equal":
            return f"must be {context['ge']:g} or more, not {given}"
        case "less_than":
            return f"must be below {context['lt']:g}, not {given}"
        case "less_than_equal":
            return f"must be {context['le']:g} or less, not {given}"
        case "literal_error":
            return f"must be {context['expected']}, not {given}"
        case "model_type":
            return f"must be a table such as {_example(model, location[-1])}, not {given}"
    wanted = _WANTED.get(error["type"])
    return f"must be {wanted}, not {given}" if wanted else error["msg"]


_WANTED = {
    "float_type": "a number",
    "int_type": "a whole number",
    "bool_type": "true or false",
    "string_type": "a text in quotes",
}


def _example(model: type[BaseModel], field: str) -> str:
    info = model.model_fields.get(field)
    return str(info.examples[0]) if info and info.examples else "…"


def _model_at(model: type[BaseModel], location: list[str]) -> type[BaseModel]:
    """The model of the table at `location`, where that is a table of its own inside `model`."""
    from pydantic import BaseModel

    for name in location:
        info = model.model_fields.get(name)
        kinds = getattr(info.annotation, "__args__", (info.annotation,)) if info else ()
        inner = [kind for kind in kinds if isinstance(kind, type) and issubclass(kind, BaseModel)]
        if not inner:
            break
        model = inner[0]
    return model

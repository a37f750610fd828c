"""Tables as TOML text, and the places in them: for tests that mutate scenarios."""

from __future__ import annotations

from datetime import date, datetime, time
from typing import Any


def toml(value: Any) -> str:
    """A value as inline TOML."""
    match value:
        case bool():
            return str(value).lower()
        case float():
            return repr(value)
        case int():
            return hex(value) if value > 2**63 else str(value)  # hexadecimal takes numbers of any length
        case str():
            return '"' + "".join(f"\\U{ord(each):08X}" for each in value) + '"'
        case list():
            return "[" + ", ".join(map(toml, value)) + "]"
        case dict():
            return "{" + ", ".join(f"{toml(key)} = {toml(inner)}" for key, inner in value.items()) + "}"
        case date() | datetime() | time():
            return value.isoformat()
    raise TypeError(value)


def document(table: dict[str, Any]) -> str:
    """A table as a TOML document, a line for each of its keys."""
    return "\n".join(f"{toml(key)} = {toml(value)}" for key, value in table.items())


def places(value: Any, here: tuple = ()) -> list[tuple]:
    """Paths to everything inside a table."""
    inside = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    return [path for key, inner in inside for path in [(*here, key), *places(inner, (*here, key))]]

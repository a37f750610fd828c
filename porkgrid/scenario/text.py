"""A scenario file's bytes to a TOML table, with every way that can fail said in words."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path
from typing import Any

from porkgrid.scenario.faults import Fault

LARGEST_BYTES = 1_000_000  # a scenario is a few kilobytes; more is the wrong file


def read_text(path: Path) -> tuple[str, list[Fault]]:
    """Text of the file (a byte order mark dropped) and faults; the text is empty where there are faults."""
    try:
        with path.open("rb") as file:
            data = file.read(LARGEST_BYTES + 1)
    except FileNotFoundError:
        return "", [Fault("", _missing(path))]
    except IsADirectoryError:
        return "", [Fault("", "is a folder; give a scenario file (.toml)")]
    except ValueError:  # a NUL character in the path
        return "", [Fault("", "is not a possible file name; give the path of a scenario file (.toml)")]
    except OSError as error:
        return "", [Fault("", f"cannot be read ({error.strerror}); give a readable scenario file")]
    if len(data) > LARGEST_BYTES:
        return "", [Fault("", "is larger than a megabyte; a scenario file is a few kilobytes of TOML text")]
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        what = f"line {line} is not UTF-8 text (byte 0x{data[error.start]:02x}); save the file as UTF-8"
        return "", [Fault("", what)]
    if not text.strip():
        return "", [Fault("", "is empty; a scenario has at least a name and two [[encounter]] tables")]
    return text, []


def parse_toml(text: str) -> tuple[dict[str, Any], list[Fault]]:
    """The table that TOML text holds, and faults; the table is empty where there are faults."""
    try:
        return tomllib.loads(text), []
    except tomllib.TOMLDecodeError as error:
        return {}, [_syntax_fault(str(error), text)]
    except ValueError:  # CPython refuses to convert whole numbers of more than 4300 digits
        return {}, [Fault("", "holds a whole number of thousands of digits; mend or remove it")]
    except RecursionError:
        return {}, [Fault("", "nests lists or tables too deeply; a scenario nests them twice")]


def _missing(path: Path) -> str:
    with_suffix = path.with_name(path.name + ".toml") if path.name else path
    if not path.suffix and with_suffix.is_file():
        return f"no such file; did you mean {with_suffix}?"
    return "no such file; give the path of a scenario file (.toml)"


def _syntax_fault(message: str, text: str) -> Fault:
    """Fault of a TOML syntax error, keyed by line and column (tomllib puts them at the message's end)."""
    what, _, place = message.partition(" (at ")
    found = re.match(r"line (\d+), column (\d+)", place)
    whole = text.rstrip()  # tomllib says "at end of document" of what the last line lacks
    end = whole.count("\n") + 1, len(whole) - whole.rfind("\n")
    line, column = map(int, found.groups()) if found else end
    return Fault(f"line {line}, column {column}", f"not TOML: {what}{_advice(what)}")


def _advice(what: str) -> str:
    if what.startswith("Invalid value"):
        return "; texts need quotes, dates are bare (2028-11-30), truth values are true or false"
    if what.startswith("Expected newline"):
        return "; the value ends before this: texts need quotes, dates are written 2028-01-09"
    if what.startswith("Cannot overwrite a value"):
        return "; the key is already given, keep one"
    return ""

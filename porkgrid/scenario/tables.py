"""Tables of numbers that a user gives as CSV, every fault found at once and named by its line."""

from __future__ import annotations

import csv
import difflib
import io
import math
import re
import stat
from pathlib import Path
from typing import NamedTuple

from porkgrid.scenario.faults import Fault, printable

LARGEST_BYTES = 1_000_000  # 10 000 rows of two long numbers are half of it
MOST_ROWS = 10_000
MOST_FAULTS = 20  # shown; a file of the wrong kind has one per line
LARGEST_NUMBER = 1e12  # beyond it a table of kilograms, degrees or km²/s² is a slip of the pen
NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?", re.ASCII)


class Row(NamedTuple):
    """One row of numbers, in the order of the header, and the line of the file it stands on."""

    line: int
    values: tuple[float, ...]

    def fault(self, text: str) -> Fault:
        """A fault at this row's line."""
        return Fault(f"line {self.line}", text)


def read_rows(path: Path, header: tuple[str, ...]) -> tuple[list[Row], list[Fault]]:
    """Rows of the table under this header, and faults; rows without fault are given beside the faults.

    UTF-8; values separated by commas, decimals with a point; blank lines and lines that begin with # are
    skipped. Where the header is another no rows are given: what their columns mean is not known.
    """
    lines, faults = _read_lines(path, header)
    if faults:
        return [], faults
    bare = _is_numbers(lines[0][1])  # the header is forgotten, the columns are likely the right ones
    heading = _header_fault(*lines[0], header)
    body = lines if bare else lines[1:]
    rows: list[Row] = []
    for number, line in body:
        values, wrong = _parse_line(line, header)
        faults += [Fault(f"line {number}", each) for each in wrong]
        if values:
            rows.append(Row(number, values))
    if heading:
        return (rows if bare else []), [heading, *faults]
    if len(body) < 2:
        count = "one row" if body else "no rows"
        faults.append(Fault("", f"has {count} under the header; give at least two, to interpolate between"))
    return rows, faults


def fault_lines(path: Path, faults: list[Fault]) -> list[str]:
    """Faults as the user reads them, in the order of the lines, the many of a wrong file cut short."""
    ordered = sorted(faults, key=lambda fault: int(fault.key.removeprefix("line ") or 0))
    shown = [fault.line(path) for fault in ordered[:MOST_FAULTS]]
    hidden = len(ordered) - len(shown)
    return [*shown, f"{path}: faults not shown: {hidden}; mend these first"] if hidden else shown


def _parse_line(line: str, header: tuple[str, ...]) -> tuple[tuple[float, ...], list[str]]:
    """Numbers of a line and what is wrong with it; no numbers where anything is."""
    fields, wrong = _split(line)
    if wrong:
        return (), [wrong]
    if len(fields) != len(header):
        count = "one value" if len(fields) == 1 else f"{len(fields)} values"
        return (), [f"has {count}; give {len(header)}: {','.join(header)}"]
    checked = [_number_fault(name, field) for name, field in zip(header, fields, strict=True)]
    faults = [each for each in checked if each]
    return (
        ((), faults) if faults else (tuple(float(field) + 0.0 for field in fields), [])
    )  # no −0: equal numbers, equal text


def _split(line: str) -> tuple[list[str], str]:
    """Fields of a line, or what hinders splitting it."""
    if ";" in line or "\t" in line:
        mark = "semicolon" if ";" in line else "tab"
        return [], f"holds a {mark}; separate values with commas and write decimals with a point: 10.5,2400"
    try:
        (fields,) = csv.reader([line], strict=True, skipinitialspace=True)
    except csv.Error as error:
        return [], f"is not CSV ({error}); numbers need no quotes: 10.5,2400"
    return [field.strip() for field in fields], ""


def _number_fault(name: str, field: str) -> str:
    if not field:
        return f"{name} is empty; give a number"
    if field.lstrip("+-").casefold() in {"nan", "inf", "infinity"}:
        return f"{name} is {printable(field)}; give a finite number"
    if not NUMBER.fullmatch(field):
        return f'{name} is the text "{printable(field)}"; give a plain number such as 2400 or 10.5'
    value = float(field)
    if not math.isfinite(value) or abs(value) > LARGEST_NUMBER:
        return f"{name} is {printable(field)}; give a number of at most {LARGEST_NUMBER:g}"
    return ""


def _is_numbers(line: str) -> bool:
    fields, _ = _split(line)
    return bool(fields) and all(NUMBER.fullmatch(field) for field in fields)


def _header_fault(number: int, line: str, header: tuple[str, ...]) -> Fault | None:
    fields, wrong = _split(line)
    wanted = ",".join(header)
    if tuple(fields) == header:
        return None
    if wrong:
        return Fault(f"line {number}", f"{wrong.partition(';')[0]}; the header must be {wanted}")
    if _is_numbers(line):
        return Fault(f"line {number}", f"numbers, where the header is missing; put {wanted} above them")
    return Fault(f"line {number}", f'the header must be {wanted}, not "{printable(line)}"')


def _read_lines(path: Path, header: tuple[str, ...]) -> tuple[list[tuple[int, str]], list[Fault]]:
    """Lines that hold something, numbered as an editor numbers them, and faults of the file as a whole."""
    text, faults = _read_text(path, header)
    lines = [
        (number, line.strip())
        for number, line in enumerate(io.StringIO(text, newline=None), start=1)
        if line.strip() and not line.lstrip().startswith("#")
    ]
    if len(lines) - 1 > MOST_ROWS:
        faults = [Fault("", f"has {len(lines) - 1} rows; give {MOST_ROWS} or fewer")]
    elif not lines and not faults:
        faults = [Fault("", f"holds no table; give the header {','.join(header)} and at least two rows")]
    return lines, faults


def _read_text(path: Path, header: tuple[str, ...]) -> tuple[str, list[Fault]]:
    """Text of the file (a byte order mark dropped) and faults; the text is empty where there are faults."""
    try:
        mode = path.stat().st_mode
        if not stat.S_ISREG(mode):  # reading a pipe would wait for ever
            return "", [Fault("", f"is {'a folder' if stat.S_ISDIR(mode) else 'no file'}; give a CSV file")]
        with path.open("rb") as file:
            data = file.read(LARGEST_BYTES + 1)
    except (FileNotFoundError, NotADirectoryError):
        return "", [Fault("", _missing(path, header))]
    except ValueError:  # a NUL character in the path
        return "", [Fault("", "is not a possible file name; give the path of a CSV file")]
    except OSError as error:
        return "", [Fault("", f"cannot be read ({error.strerror}); give a readable CSV file")]
    if len(data) > LARGEST_BYTES:
        return "", [Fault("", f"is larger than a megabyte; give a table of at most {MOST_ROWS} rows")]
    try:
        return data.decode("utf-8-sig"), []
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        what = f"is not UTF-8 text (byte 0x{data[error.start]:02x}); save the file as UTF-8"
        return "", [Fault(f"line {line}", what)]


def _missing(path: Path, header: tuple[str, ...]) -> str:
    beside = sorted(each.name for each in path.parent.glob("*.csv")) if path.parent.is_dir() else []
    near = difflib.get_close_matches(path.name, beside, n=1)
    if near:
        return f"no such file; did you mean {path.with_name(near[0])}?"
    return f"no such file; give the path of a CSV table with the header {','.join(header)}"

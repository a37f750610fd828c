"""Arguments and options that commands share."""

from __future__ import annotations

import re
from enum import StrEnum
from pathlib import Path
from typing import Annotated

import typer

from porkgrid.errors import RequestError

ScenarioFile = Annotated[Path, typer.Argument(metavar="SCENARIO", help="Scenario file (TOML).")]
SurveyFolder = Annotated[
    Path, typer.Argument(metavar="SURVEY", help="Survey folder that `porkgrid sweep` made.")
]
AsJson = Annotated[bool, typer.Option("--json", help="Print JSON on standard output instead of a table.")]


class Format(StrEnum):
    """File formats of figures."""

    PNG = "png"
    SVG = "svg"
    PDF = "pdf"


class Order(StrEnum):
    """Which end of a measure is better."""

    LEAST = "least"
    MOST = "most"


Formats = Annotated[list[Format], typer.Option("--format", help="Figure format; give it again for more.")]

_UNITS = {"MB": 1e6, "GB": 1e9, "MIB": 2.0**20, "GIB": 2.0**30}


def bytes_of(size: str) -> float:
    """Bytes of a size such as 900MB or 2 GB. RequestError for anything else."""
    found = re.fullmatch(r"\s*([0-9]*\.?[0-9]+)\s*([A-Za-z]+)\s*", size)
    unit = _UNITS.get(found[2].upper()) if found else None
    if found is None or unit is None:
        raise RequestError(f"--memory {size}: is no size; give a number with MB or GB, such as 900MB or 2GB")
    return float(found[1]) * unit

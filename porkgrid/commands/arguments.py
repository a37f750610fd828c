"""Arguments and options that commands share."""

from __future__ import annotations

from enum import StrEnum
from pathlib import Path
from typing import Annotated

import typer

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

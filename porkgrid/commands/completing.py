"""What the shell completes: names of measures and of bodies. Typer calls these with what is typed so far."""

from __future__ import annotations

from pathlib import Path

import typer

_NUMBERS = (
    1,
    2,
    3,
)  # of legs, flybys and stages, where no survey says which it has


def measure_names(ctx: typer.Context, incomplete: str) -> list[str]:
    """Measures that begin so: those that the survey on the command line stores, else all there are."""
    # while the value of an option is being typed the parser leaves all words in args
    words = [ctx.params.get("survey"), *ctx.args]
    names = next((found for word in words if word and (found := _stored(Path(word)))), _all_names())
    return [name for name in names if name.startswith(incomplete)]


def body_names(incomplete: str) -> list[str]:
    """Bodies that a first scenario can be written for."""
    from porkgrid.scenario.usualorbits import PARKING

    return [name for name in PARKING if name.startswith(incomplete.lower())]


def _stored(survey: Path) -> list[str]:
    """Names of the arrays of a survey that are measures; none where there is no survey."""
    grid = survey / "grid.zarr"
    arrays = {path.name for path in grid.iterdir() if path.is_dir()} if grid.is_dir() else set()
    return sorted(arrays.intersection(_all_names()))


def _all_names() -> list[str]:
    from porkgrid.survey.measures import all_entries

    names = [entry.name for entry in all_entries()]
    return [
        name.replace("{n}", str(number))
        for name in names
        for number in (_NUMBERS if "{n}" in name else _NUMBERS[:1])
    ]

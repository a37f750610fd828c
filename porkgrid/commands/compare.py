"""porkgrid compare: routes side by side."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from porkgrid.commands.arguments import AsJson, Format, Formats
from porkgrid.commands.completing import measure_names
from porkgrid.errors import RequestError

if TYPE_CHECKING:
    from porkgrid.survey.compare import Comparison
    from porkgrid.survey.surveys import Survey

_SLUG_LENGTH = 100  # characters of the names joined, which a folder's name holds

# Rows of the table, where any route has them; the file has all measures.
_SHOWN = (
    "tof_days",
    "c3_km2_s2",
    "dla_deg",
    "dv_departure_km_s",
    "flyby{n}_burn_km_s",
    "deep_space_burn_km_s",
    "dv_capture_km_s",
    "dv_total_km_s",
    "v_inf_arrival_km_s",
    "entry_speed_km_s",
    "injected_mass_kg",
    "delivered_mass_kg",
    "mass_margin_kg",
    "propellant_kg",
    "low_orbit_mass_kg",
    "liftoff_mass_kg",
)
_MOST_FLYBYS = 9


def compare(
    surveys: Annotated[
        list[Path], typer.Argument(metavar="SURVEY…", help="Survey folders that `porkgrid sweep` made.")
    ],
    days: Annotated[int, typer.Option(help="Length of the launch periods, in days.")] = 21,
    by: Annotated[
        str | None,
        typer.Option(
            metavar="MEASURE",
            help="Measure to rank by; by default each survey's own.",
            autocompletion=measure_names,
        ),
    ] = None,
    out: Annotated[
        Path | None, typer.Option(help="Folder to write to; by default comparisons/<names joined>.")
    ] = None,
    formats: Formats = [Format.PNG],  # noqa: B006 - typer wants a list
    as_json: AsJson = False,
) -> None:
    """Lay routes side by side: best dates, launch periods, burns, masses, and what one saves against another.

    The Hohmann transfer of the two orbits and the phased bi-elliptic transfer come along to be judged by.

    Example: porkgrid compare surveys/godwit-by-venus-to-mars-2034 surveys/godwit-straight-to-mars-2035
    """
    from porkgrid.survey.surveys import open_survey

    opened = [open_survey(each) for each in surveys]  # before what takes longer to load
    folder = _folder(out, [survey.scenario.slug for survey in opened])
    compare_surveys(opened, folder, days, by, formats, as_json)


def compare_surveys(
    surveys: list[Survey], folder: Path, days: int, by: str | None, formats: list[Format], as_json: bool
) -> None:
    """Compare open surveys, print the table and the sentences, and write table and figure into `folder`."""
    from porkgrid.reports.comparisons import write_comparison
    from porkgrid.survey.compare import compare as lay_side_by_side

    comparison = lay_side_by_side(surveys, days, by)
    files = write_comparison(comparison, folder, [each.value for each in formats])
    if as_json:
        _print_json(comparison, files)
        return
    _print_table(comparison)
    for sentence in comparison.sentences:
        print(sentence)
    for path in files:
        print(path)


def _folder(out: Path | None, slugs: list[str]) -> Path:
    """The folder to write to, made where it is not there."""
    each = max(8, _SLUG_LENGTH // len(slugs))
    joined = "_".join(slug[:each].strip("-") for slug in slugs)
    folder = out if out is not None else Path("comparisons") / joined[: 2 * _SLUG_LENGTH]
    if folder.exists() and not folder.is_dir():
        raise RequestError(f"{folder}: is a file; give a folder with --out")
    folder.mkdir(parents=True, exist_ok=True)
    return folder


def _print_table(comparison: Comparison) -> None:
    """Print the routes as columns, what is known of them as rows."""
    from porkgrid import terminal
    from porkgrid.survey.compare import comparison_table

    table = comparison_table(comparison)
    units = comparison.units
    shown = [name for name in _expanded(_SHOWN) if name in table and table[name].notna().any()]
    texts = ["route", "ranked_by", "departure", *_expanded(("flyby{n}",)), "arrival"]
    lines = [[name, *_texts(table[name])] for name in texts if name in table]
    lines += [
        [name, *(terminal.number(float(value), units[name]) for value in table[name])] for name in shown
    ]
    lines += [[f"{comparison.days} days", *_periods(comparison, len(table))]]
    lines += [["worst day", *_worst(comparison, len(table))]]
    terminal.print_table(["", *map(str, table["name"])], lines)


def _expanded(names: tuple[str, ...]) -> list[str]:
    return [
        name.format(n=n)
        for name in names
        for n in (range(1, _MOST_FLYBYS + 1) if "{n}" in name else range(1))
    ]


def _texts(values: Any) -> list[str]:
    return [value[:10] if value[:4].isdigit() else value for value in values.fillna("–").astype(str)]


def _periods(comparison: Comparison, columns: int) -> list[str]:
    said = [
        entry.no_period if entry.period is None else f"{entry.period.first[:10]} – {entry.period.last[:10]}"
        for entry in comparison.entries
    ]
    return said + ["–"] * (columns - len(said))


def _worst(comparison: Comparison, columns: int) -> list[str]:
    """The worst day of each launch period, by its own measure."""
    from porkgrid import terminal

    units = comparison.units
    said = [
        "–"
        if entry.period is None
        else f"{terminal.number(entry.period.worst, units[entry.by])} {units[entry.by]} on "
        f"{entry.period.worst_on[:10]}"
        for entry in comparison.entries
    ]
    return said + ["–"] * (columns - len(said))


def _print_json(comparison: Comparison, files: list[Path]) -> None:
    from porkgrid import terminal
    from porkgrid.survey.compare import comparison_table

    rows = [
        {name: value for name, value in row.items() if value is not None and value == value}
        for row in comparison_table(comparison).to_dict("records")
    ]
    terminal.print_json(
        {
            "days": comparison.days,
            "routes": rows,
            "sentences": list(comparison.sentences),
            "files": [str(path) for path in files],
        }
    )

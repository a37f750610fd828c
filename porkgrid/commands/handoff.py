"""porkgrid handoff: a flight as a folder that the next team can load."""

from __future__ import annotations

import shutil
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from porkgrid.commands.arguments import AsJson, SurveyFolder
from porkgrid.errors import RequestError, RunError

if TYPE_CHECKING:
    from porkgrid.handoff.report import FullForceReport
    from porkgrid.handoff.trajectory import Trajectory
    from porkgrid.survey.candidates import Picked
    from porkgrid.survey.surveys import Survey

_CHECKED = ("c3_km2_s2", "rla_deg", "dla_deg", "v_inf_arrival_km_s", "dv_total_km_s")  # on the sheet


def handoff(
    survey: SurveyFolder,
    candidate: Annotated[
        int | None, typer.Option(metavar="N", help="Candidate of the survey, its dates refined.")
    ] = None,
    dates: Annotated[
        str | None, typer.Option(metavar="DATE,DATE,…", help="Dates of your own instead, one per encounter.")
    ] = None,
    fresh: Annotated[bool, typer.Option("--fresh", help="Replace a hand-off that is there already.")] = False,
    as_json: AsJson = False,
) -> None:
    """Check a flight in the field of Sun, planets and Moon, and write it for detailed analysis.

    CCSDS OEM and OPM messages, SPK kernels, the encounters' target sheet, the full-force check against
    patched conics, a one-page sheet and the figures, in a folder of the survey's handoff folder.

    Example: porkgrid handoff surveys/ouzel-to-mars-2028 --candidate 1

    Example: porkgrid handoff surveys/ouzel-to-mars-2028 --dates 2028-11-30,2029-10-10
    """
    if (candidate is None) == (dates is None):
        raise RequestError(
            "handoff: give either --candidate N or --dates DATE,DATE,…, one date per encounter"
        )
    from porkgrid import terminal
    from porkgrid.handoff import chosen
    from porkgrid.handoff.fullforce import full_force_check
    from porkgrid.survey.surveys import open_survey

    opened = open_survey(survey)
    name = (
        f"candidate-{candidate}"
        if candidate is not None
        else "_".join(str(dates).replace(":", "").split(","))
    )
    folder = opened.path / "handoff" / name.replace(" ", "")
    if folder.exists() and not fresh:
        raise RequestError(f"{folder}: there is a hand-off already; --fresh replaces it")
    picked = (
        chosen.candidate(opened, candidate) if candidate is not None else chosen.on_dates(opened, str(dates))
    )
    for limit in chosen.broken_limits(opened.plan, picked):
        terminal.say(f"outside the survey's limits: {limit}")
    terminal.say("flying it with all forces …")
    report = full_force_check(opened.plan, picked)
    files = _write_whole_folder(opened, picked, report, folder)
    if as_json:
        terminal.print_json(_document(report, folder, files))
        return
    _print_check(opened, report)
    terminal.say(f"hand-off in {folder}")


def _write_whole_folder(survey: Survey, picked: Picked, report: FullForceReport, folder: Path) -> list[str]:
    """Write everything beside the folder's place and move it there; names of the files."""
    part = folder.with_name(f".{folder.name}.part")
    try:
        shutil.rmtree(part, ignore_errors=True)
        part.mkdir(parents=True)
        _write(survey, picked, report, part)
        if folder.exists():
            shutil.rmtree(folder)
        part.rename(folder)
    except OSError as error:
        raise RunError(f"{folder}: cannot be written: {error.strerror or error}") from error
    finally:
        shutil.rmtree(part, ignore_errors=True)
    return sorted(str(path.relative_to(folder)) for path in folder.rglob("*") if path.is_file())


def _write(survey: Survey, picked: Picked, report: FullForceReport, folder: Path) -> None:
    import datetime as dt

    from porkgrid.handoff.checkfiles import write_check
    from porkgrid.handoff.conicpath import patched_trajectory, quantities_of
    from porkgrid.handoff.covering import write_covering
    from porkgrid.handoff.flownpath import flown_trajectory
    from porkgrid.survey.candidates import measures_at

    plan, created = survey.plan, dt.datetime.now(dt.UTC)
    kernels = tuple((each["file"], each["sha256"]) for each in survey.provenance["kernels"])
    patched = patched_trajectory(plan, picked, quantities_of(plan, measures_at(plan, picked)), kernels)
    flights = {"patched": patched}
    try:
        flights["full-force"] = flown_trajectory(plan, report, kernels)
    except ValueError as lost:  # the check lost a leg, which the report tells
        _say(f"no full-force trajectory to write: {lost}")
    for model, trajectory in flights.items():
        _write_flight(folder / model, trajectory, created)
    write_check(folder, report)
    _draw(survey, picked, patched, report, folder)
    write_covering(folder, survey, picked, report)


def _write_flight(folder: Path, trajectory: Trajectory, created: Any) -> None:
    """The messages, the kernel and the target sheet of one model's trajectory."""
    from porkgrid.handoff import spk
    from porkgrid.handoff.oem import write_oem
    from porkgrid.handoff.opm import write_opms
    from porkgrid.handoff.targets import write_targets

    folder.mkdir()
    write_oem(folder / "trajectory.oem", trajectory, created)
    write_opms(folder, trajectory, created)
    write_targets(folder, trajectory)
    try:
        spk.write_spk(folder / "trajectory.bsp", trajectory)
    except spk.SpiceMissingError:
        _say("SPK skipped: spiceypy is not installed (pip install spiceypy)")


def _draw(survey: Survey, picked: Picked, patched: Trajectory, report: FullForceReport, folder: Path) -> None:
    """The one-page sheet as PDF and SVG, the path and the flybys as PNG."""
    from porkgrid.figures.flyby import draw_flyby
    from porkgrid.figures.overtime import SheetBurn
    from porkgrid.figures.path import draw_path
    from porkgrid.figures.sheet import CheckRow, ReviewSheet, SheetCheck, draw_sheet
    from porkgrid.figures.style import save_figure
    from porkgrid.handoff.sunpath import sun_path
    from porkgrid.survey.pictures import Number, flyby_picture, route_picture
    from porkgrid.survey.sightlines import sightlines

    plan = survey.plan
    flown = (
        list(picked.epochs), [each.revs for each in picked.options], [each.branch for each in picked.options]
    )  # fmt: skip
    picture = route_picture(plan, *flown)
    symbols = {name: measure.symbol for name, measure in plan.measures.items()}
    rows = tuple(
        CheckRow(symbols[line.name], line.patched, line.full_force, line.unit)
        for line in report.lines
        if line.name in _CHECKED and line.name in symbols
    )
    masses = [
        Number(symbols[each.name], each.value, each.unit)
        for each in patched.quantities
        if each.unit == "kg" and each.value == each.value
    ]
    review = ReviewSheet(
        picture=picture,
        seen=sightlines(plan.ephemeris, *sun_path(patched)),
        burns=[SheetBurn(burn.label, burn.jd_tdb, burn.size_km_s) for burn in patched.burns],
        masses=masses,
        model=patched.model,
        check=SheetCheck(report.verdict, rows),
    )
    save_figure(draw_sheet(review), folder / "sheet", ["pdf", "svg"])
    save_figure(draw_path(picture), folder / "figures" / "path", ["png"])
    for n in range(1, plan.flybys + 1):
        save_figure(draw_flyby(flyby_picture(plan, *flown, n)), folder / "figures" / f"flyby{n}", ["png"])


def _print_check(survey: Survey, report: FullForceReport) -> None:
    from porkgrid import terminal
    from porkgrid.handoff.checkfiles import shown

    title = f"{survey.provenance['name']}: {survey.plan.route}\nfull-force check: {report.verdict}"
    rows = [shown(line) for line in report.lines]
    terminal.print_table(["", "patched", "full force", "difference", "unit"], rows, title)
    for reason in report.reasons:
        print(reason)
    misses = ", ".join(f"{miss:.3g}" for miss in report.miss_km)
    print(f"miss at the end of each leg: {misses} km; {report.wall_s:.1f} s")


def _document(report: FullForceReport, folder: Path, files: list[str]) -> dict[str, Any]:
    return {
        "folder": str(folder),
        "verdict": report.verdict,
        "reasons": list(report.reasons),
        "converged": report.converged,
        "extra_dv_m_s": report.extra_dv_m_s,
        "miss_km": list(report.miss_km),
        "lines": [
            {"name": line.name, "unit": line.unit, "patched": line.patched, "full_force": line.full_force}
            for line in report.lines
        ],
        "files": files,
    }


def _say(message: str) -> None:
    from porkgrid import terminal

    terminal.say(message)

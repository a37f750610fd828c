"""A flight as a folder that the next team can load: written whole, or not at all."""

from __future__ import annotations

import datetime as dt
import shutil
from dataclasses import dataclass
from pathlib import Path

from porkgrid.errors import RequestError, RunError
from porkgrid.figures.flyby import draw_flyby
from porkgrid.figures.overtime import SheetBurn
from porkgrid.figures.path import draw_path
from porkgrid.figures.sheet import CheckRow, ReviewSheet, SheetCheck, draw_sheet
from porkgrid.figures.style import save_figure
from porkgrid.handoff import checkfiles, chosen, spk
from porkgrid.handoff.conicpath import patched_trajectory, quantities_of
from porkgrid.handoff.covering import write_covering
from porkgrid.handoff.flownpath import flown_trajectory
from porkgrid.handoff.oem import write_oem
from porkgrid.handoff.opm import write_opms
from porkgrid.handoff.report import FullForceReport
from porkgrid.handoff.sunpath import sun_path
from porkgrid.handoff.targets import write_targets
from porkgrid.handoff.trajectory import Trajectory
from porkgrid.showing import html_line, html_page, html_table
from porkgrid.survey.candidates import Picked, measures_at
from porkgrid.survey.pictures import Number, flyby_picture, route_picture
from porkgrid.survey.sightlines import sightlines
from porkgrid.survey.store import CAUTION
from porkgrid.survey.surveys import Survey

_CHECKED = ("c3_km2_s2", "rla_deg", "dla_deg", "v_inf_arrival_km_s", "dv_total_km_s")  # on the sheet


@dataclass(frozen=True, eq=False)
class HandOff:
    """A hand-off on disk.

    files: names in `folder`. outside: the survey's limits, in words, that the flight does not meet.
    left_out: what could not be written, and why.
    """

    folder: Path
    report: FullForceReport
    files: tuple[str, ...]
    outside: tuple[str, ...]
    left_out: tuple[str, ...]

    def __repr__(self) -> str:
        return f"<HandOff {self.report.verdict}: {len(self.files)} files in {str(self.folder)!r}>"

    def _repr_html_(self) -> str:
        lines = [checkfiles.shown(line) for line in self.report.lines]
        misses = ", ".join(f"{miss:.2g}" for miss in self.report.miss_km)
        return html_page(
            f"Full-force check: {self.report.verdict}",
            *map(html_line, self.report.reasons),
            html_table(["", "patched", "full force", "difference", "unit"], lines),
            html_line(f"miss at the end of each leg: {misses} km; {len(self.files)} files in {self.folder}"),
            html_line(f"Thresholds. {self.report.thresholds}."),
            html_line(CAUTION),
        )


@dataclass(frozen=True, eq=False)
class Flight:
    """What is to be handed off, and where to; `outside` as of `HandOff`."""

    picked: Picked
    folder: Path
    outside: tuple[str, ...]


def chosen_flight(survey: Survey, candidate: int | None, dates: str | None, fresh: bool) -> Flight:
    """The flight of a candidate (from 1), or of a text of dates with commas, and its folder.

    RequestError unless just one of the two is given, for what cannot be flown, and for a folder that is there
    already unless it is to be made afresh.
    """
    if (candidate is None) == (dates is None):
        raise RequestError(
            "handoff: give either --candidate N or --dates DATE,DATE,…, one date per encounter"
        )
    name = f"candidate-{candidate}" if dates is None else "_".join(dates.replace(":", "").split(","))
    folder = survey.path / "handoff" / name.replace(" ", "")
    if folder.exists() and not fresh:
        raise RequestError(f"{folder}: there is a hand-off already; --fresh replaces it")
    picked = (
        chosen.candidate(survey, candidate) if candidate is not None else chosen.on_dates(survey, str(dates))
    )
    return Flight(picked, folder, tuple(chosen.broken_limits(survey.plan, picked)))


def write_handoff(survey: Survey, flight: Flight, report: FullForceReport) -> HandOff:
    """Write everything beside the folder's place and move it there. RunError where that cannot be written."""
    folder = flight.folder
    part = folder.with_name(f".{folder.name}.part")
    try:
        shutil.rmtree(part, ignore_errors=True)
        part.mkdir(parents=True)
        left_out = _write(survey, flight.picked, report, part)
        if folder.exists():
            shutil.rmtree(folder)
        part.rename(folder)
    except OSError as error:
        raise RunError(f"{folder}: cannot be written: {error.strerror or error}") from error
    finally:
        shutil.rmtree(part, ignore_errors=True)
    files = sorted(str(path.relative_to(folder)) for path in folder.rglob("*") if path.is_file())
    return HandOff(folder, report, tuple(files), flight.outside, tuple(left_out))


def _write(survey: Survey, picked: Picked, report: FullForceReport, folder: Path) -> list[str]:
    """Write all files; what was left out, each with its reason."""
    plan, created = survey.plan, dt.datetime.now(dt.UTC)
    kernels = tuple((each["file"], each["sha256"]) for each in survey.provenance["kernels"])
    patched = patched_trajectory(plan, picked, quantities_of(plan, measures_at(plan, picked)), kernels)
    flights, left_out = {"patched": patched}, []
    try:
        flights["full-force"] = flown_trajectory(plan, report, kernels)
    except ValueError as lost:  # the check lost a leg, which the report tells
        left_out.append(f"no full-force trajectory to write: {lost}")
    for model, trajectory in flights.items():
        left_out += _write_flight(folder / model, trajectory, created)
    checkfiles.write_check(folder, report)
    _draw(survey, picked, patched, report, folder)
    write_covering(folder, survey, picked, report)
    return list(dict.fromkeys(left_out))


def _write_flight(folder: Path, trajectory: Trajectory, created: dt.datetime) -> list[str]:
    """The messages, the kernel and the target sheet of one model's trajectory; what was left out."""
    folder.mkdir()
    write_oem(folder / "trajectory.oem", trajectory, created)
    write_opms(folder, trajectory, created)
    write_targets(folder, trajectory)
    try:
        spk.write_spk(folder / "trajectory.bsp", trajectory)
    except spk.SpiceMissingError:
        return ["SPK skipped: spiceypy is not installed (pip install spiceypy)"]
    return []


def _draw(survey: Survey, picked: Picked, patched: Trajectory, report: FullForceReport, folder: Path) -> None:
    """The one-page sheet as PDF and SVG, the path and the flybys as PNG."""
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

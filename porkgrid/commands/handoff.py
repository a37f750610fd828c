"""porkgrid handoff: a flight as a folder that the next team can load."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any

import typer

from porkgrid.commands.arguments import AsJson, SurveyFolder

if TYPE_CHECKING:
    from porkgrid.handoff.report import FullForceReport
    from porkgrid.reports.handoffs import HandOff
    from porkgrid.survey.surveys import Survey


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
    from porkgrid import terminal
    from porkgrid.survey.surveys import open_survey

    opened = open_survey(survey)
    from porkgrid.handoff.fullforce import full_force_check
    from porkgrid.reports.handoffs import chosen_flight, write_handoff

    flight = chosen_flight(opened, candidate, dates, fresh)
    for limit in flight.outside:
        terminal.say(f"outside the survey's limits: {limit}")
    terminal.say("flying it with all forces …")
    made = write_handoff(opened, flight, full_force_check(opened.plan, flight.picked))
    for what in made.left_out:
        terminal.say(what)
    if as_json:
        terminal.print_json(_document(made))
        return
    _print_check(opened, made.report)
    terminal.say(f"hand-off in {made.folder}")


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


def _document(made: HandOff) -> dict[str, Any]:
    report = made.report
    return {
        "folder": str(made.folder),
        "verdict": report.verdict,
        "reasons": list(report.reasons),
        "converged": report.converged,
        "extra_dv_m_s": report.extra_dv_m_s,
        "miss_km": list(report.miss_km),
        "lines": [
            {"name": line.name, "unit": line.unit, "patched": line.patched, "full_force": line.full_force}
            for line in report.lines
        ],
        "files": list(made.files),
    }

"""What lies on top of a hand-off: where it comes from, and which file is what."""

from __future__ import annotations

import json
from pathlib import Path

from porkgrid.handoff.report import FullForceReport
from porkgrid.sky.epochs import iso_from_jd
from porkgrid.survey.candidates import Picked, stops_of
from porkgrid.survey.folder import SCENARIO, write_whole
from porkgrid.survey.store import CAUTION
from porkgrid.survey.surveys import Survey

_FILES = {
    "patched/": "the flight in patched conics, as the survey has it",
    "full-force/": "the same flight in the field of the Sun, the planets, the Moon and Pluto as point masses",
    "…/trajectory.oem": "CCSDS OEM: states about the Sun, and about each body while it is near",
    "…/*.opm": "CCSDS OPM: state and manoeuvres at departure and after each encounter",
    "…/trajectory.bsp": "SPICE kernel of the probe (where spiceypy was installed)",
    "…/targets.json, targets.md": "the encounters: epochs, excess velocities, aim planes, burns, masses",
    "full-force.json, full-force.md": "the check: patched against full-force, line by line, with its verdict",
    "sheet.pdf, sheet.svg": "one page for a review",
    "figures/": "the path, and the passage of each flyby",
    "scenario.toml, provenance.json": "what was asked for, and what it was computed with",
}


def write_covering(folder: Path, survey: Survey, picked: Picked, report: FullForceReport) -> None:
    """Write README.md, provenance.json and the scenario into a hand-off's folder."""
    write_whole(folder / SCENARIO, (survey.path / SCENARIO).read_text(encoding="utf-8"))
    keys = ("name", "route", "versions", "kernels", "bodies", "conventions", "fingerprint", "started")
    provenance = {key: survey.provenance[key] for key in keys if key in survey.provenance}
    provenance |= {
        "models": {"patched/": "patched conics", "full-force/": "full force, point masses"},
        "epochs_jd_tdb": list(picked.epochs),
        "legs": [{"revs": each.revs, "branch": each.branch} for each in picked.options],
        "full_force": {"ephemeris": report.ephemeris, "forces": list(report.forces),
                       "integrator": report.integrator, "tolerances": report.tolerances},
        "caution": CAUTION,
    }  # fmt: skip
    text = json.dumps(provenance, indent=2, ensure_ascii=False) + "\n"
    write_whole(folder / "provenance.json", text)
    write_whole(folder / "README.md", "\n".join(_page(survey, picked, report)) + "\n")


def _page(survey: Survey, picked: Picked, report: FullForceReport) -> list[str]:
    dates = zip(stops_of(survey.plan), map(iso_from_jd, picked.epochs), strict=True)
    return [
        f"# {survey.provenance['name']}",
        "",
        f"{survey.plan.route}: " + ", ".join(f"{stop} {date} TDB" for stop, date in dates) + ".",
        f"Full-force check: {report.verdict}.",
        "",
        f"**{CAUTION}**",
        "",
        *(f"- `{name}`: {what}" for name, what in _FILES.items()),
        "",
        "Every file says which model it comes from. Axes are those of the ICRF, epochs TDB, km, km/s, kg.",
    ]

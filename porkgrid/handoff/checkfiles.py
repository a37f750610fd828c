"""The full-force check as files: all of it as JSON, and a page to read as Markdown."""

from __future__ import annotations

import json
import math
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from porkgrid.handoff.report import FullForceReport, Line
from porkgrid.sky.epochs import iso_from_jd
from porkgrid.survey.folder import write_whole
from porkgrid.survey.store import CAUTION

_EPOCH = "_jd_tdb"


def write_check(folder: Path, report: FullForceReport) -> list[Path]:
    """Write full-force.json and full-force.md into the folder; their paths."""
    paths = [folder / "full-force.json", folder / "full-force.md"]
    write_whole(paths[0], json.dumps(_document(report), indent=2, ensure_ascii=False) + "\n")
    write_whole(paths[1], "\n".join(_page(report)) + "\n")
    return paths


def shown(line: Line) -> list[str]:
    """A line as words: name, patched, full-force, difference, unit; epochs as ISO dates, apart by days."""
    if line.name.endswith(_EPOCH):
        dates = [iso_from_jd(jd) if jd == jd else "–" for jd in (line.patched, line.full_force)]
        return [line.name.removesuffix(_EPOCH), *dates, f"{line.difference:+.4f}", "days"]
    numbers = [f"{value:.4f}" if value == value else "–" for value in (line.patched, line.full_force)]
    return [
        line.name,
        *numbers,
        f"{line.difference:+.4f}" if line.difference == line.difference else "–",
        line.unit,
    ]


def _document(report: FullForceReport) -> dict[str, Any]:
    return {
        "model": "full force: " + ", ".join(report.forces),
        "verdict": report.verdict,
        "reasons": list(report.reasons),
        "thresholds": report.thresholds,
        "converged": report.converged,
        "lines": [
            {
                "name": line.name, "unit": line.unit, "patched": _number(line.patched),
                "full_force": _number(line.full_force), "difference": _number(line.difference),
            }
            for line in report.lines
        ],
        "burns_left_m_s": {
            f"{each.kind} {each.body}": _number(each.burn_left_m_s) for each in report.encounters
        },
        "extra_dv_m_s": _number(report.extra_dv_m_s),
        "miss_km": [_number(miss) for miss in report.miss_km],
        "joint_km": _number(report.joint_km),
        "joint_km_s": _number(report.joint_km_s),
        "attempts": [
            {
                "held": list(each.held), "converged": each.converged, "ended": each.ended,
                "iterations": [
                    {name: _number(value) for name, value in vars(one).items()} for one in each.history
                ],
            }
            for each in report.attempts
        ],
        "ephemeris": report.ephemeris,
        "integrator": report.integrator,
        "tolerances": report.tolerances,
        "assumptions": list(report.assumptions),
        "aim_plane": report.aim_plane,
        "wall_seconds": report.wall_s,
        "caution": CAUTION,
    }  # fmt: skip


def _page(report: FullForceReport) -> Iterator[str]:
    yield f"# Full-force check: {report.verdict}"
    yield ""
    yield from (f"- {reason}" for reason in report.reasons)
    yield ""
    yield "| | patched | full force | difference | unit |"
    yield "|---|---|---|---|---|"
    yield from (f"| {' | '.join(shown(line))} |" for line in report.lines)
    yield ""
    misses = ", ".join(f"{miss:.3g} km" for miss in report.miss_km)
    yield f"Miss at the end of each leg, flown in one arc: {misses}."
    yield f"Δv beyond patched conics: {report.extra_dv_m_s:.1f} m/s."
    for each in report.attempts:
        state = "joined" if each.converged else "not joined"
        held = f" holding {', '.join(each.held)}" if each.held else ""
        yield f"Tried{held}: {state} after {len(each.history)} iterations ({each.ended})."
    yield ""
    yield f"Thresholds. {report.thresholds}."
    yield f"Forces: {', '.join(report.forces)}. Ephemeris: {report.ephemeris}."
    yield f"Integrator: {report.integrator}; {report.tolerances}. Aim plane: {report.aim_plane}."
    yield from (f"Assumed: {each}" for each in report.assumptions)
    yield ""
    yield CAUTION


def _number(value: Any) -> Any:
    return value if not isinstance(value, float) or math.isfinite(value) else None

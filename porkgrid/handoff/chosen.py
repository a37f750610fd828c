"""Which flight is handed off: a candidate of the survey, refined, or dates that the analyst brings."""

from __future__ import annotations

from datetime import datetime
from itertools import pairwise, product

import numpy as np

from porkgrid.errors import RequestError
from porkgrid.physics.lambert import FLOWN
from porkgrid.sky.epochs import iso_from_jd, jd_from_date
from porkgrid.sky.states import state_table
from porkgrid.survey.candidates import Picked, epoch_names
from porkgrid.survey.limits import blocked_by
from porkgrid.survey.plan import Plan
from porkgrid.survey.refine import refine
from porkgrid.survey.routes import cells_at
from porkgrid.survey.surveys import Survey


def candidate(survey: Survey, number: int) -> Picked:
    """Candidate `number` (from 1) of a survey with its dates let off the grid.

    RequestError for a number that is not in the table.
    """
    table, plan = survey.candidates, survey.plan
    if not 1 <= number <= len(table):
        there = f"there are 1 to {len(table)}" if len(table) else "the limits left none"
        raise RequestError(f"{survey.path}: no candidate {number}; {there}")
    row = table.iloc[number - 1]
    flown = [(int(row[f"leg{n}_revs"]), int(row[f"leg{n}_branch"])) for n in range(1, plan.flybys + 2)]
    options = tuple(
        next(option for option in options if (option.revs, option.branch) == leg)
        for options, leg in zip(plan.options, flown, strict=True)
    )
    on_grid = Picked(tuple(float(row[name]) for name in epoch_names(plan)), options)
    return refine(plan, [on_grid])[0].picked


def on_dates(survey: Survey, text: str) -> Picked:
    """The best flight of a survey's route on the dates of a text, ISO dates or date-times with commas.

    RequestError where they are no dates, too few or too many, not in order, or outside the survey's windows.
    """
    plan = survey.plan
    epochs = _epochs(text, len(plan.tables))
    faults = []
    for number, (jd, table) in enumerate(zip(epochs, plan.tables, strict=True), start=1):
        if not table.jd[0] <= jd <= table.jd[-1]:
            window = f"{iso_from_jd(table.jd[0])} to {iso_from_jd(table.jd[-1])}"
            faults.append(f"--dates: {iso_from_jd(jd)} is outside encounter {number}'s window, {window}")
    if any(later <= earlier for earlier, later in pairwise(epochs)):
        faults.append("--dates: each date must follow the one before it")
    if faults:
        raise RequestError(*faults)
    flights = [Picked(epochs, options) for options in product(*plan.options)]
    return min(flights, key=lambda flight: _merit(plan, flight))


def broken_limits(plan: Plan, picked: Picked) -> list[str]:
    """The limits, in words, that a flight does not meet."""
    _, blocked, _ = _flown(plan, picked)
    return [bound.title for bit, bound in enumerate(plan.bounds, start=3) if blocked >> bit & 1]


def _merit(plan: Plan, picked: Picked) -> tuple[bool, bool, float]:
    status, blocked, rank = _flown(plan, picked)
    return status != FLOWN, blocked != 0, rank if rank == rank else np.inf


def _flown(plan: Plan, picked: Picked) -> tuple[int, int, float]:
    """Status, flags and signed rank measure of one flight."""
    tables = [
        state_table(plan.ephemeris, table.body, np.array([jd]))
        for table, jd in zip(plan.tables, picked.epochs, strict=True)
    ]
    cells = cells_at(plan, tables, list(picked.options))
    value = np.ravel(plan.measures[plan.rank_by].compute(cells))[0]
    return (
        int(cells.status[0, 0]), int(blocked_by(cells, plan.bounds)[0, 0]), plan.rank_sign * float(value)
    )  # fmt: skip


def _epochs(text: str, wanted: int) -> tuple[float, ...]:
    parts = [part.strip() for part in text.split(",")]
    if len(parts) != wanted:
        raise RequestError(
            f"--dates: {len(parts)} given for {wanted} encounters; give one for each, with commas"
        )
    epochs = []
    for part in parts:
        try:
            epochs.append(jd_from_date(datetime.fromisoformat(part)))
        except ValueError:
            raise RequestError(
                f"--dates: {part!r} is no date; write 2028-11-30 or 2028-11-30T06:00 (TDB)"
            ) from None
    return tuple(epochs)

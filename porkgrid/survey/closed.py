"""When the limits forbid every cell: which limit costs most, and what would open the first cell."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from porkgrid.survey.flybyroutes import flyby_cells
from porkgrid.survey.limits import REASONS, Bound
from porkgrid.survey.measures import FLYBY
from porkgrid.survey.plan import Plan
from porkgrid.survey.store import BLOCKED_BY
from porkgrid.survey.surveys import Survey
from porkgrid.survey.view import flag_shares, row_bands


def explain_closed(survey: Survey) -> list[str]:
    """Say in a few lines why no cell is allowed and what would open one; empty where some are."""
    if survey.provenance["cells_allowed"]:
        return []
    forbidden = survey.provenance["cells_forbidden_by"]
    if sum(forbidden[reason] for reason in REASONS) == survey.provenance["cells"]:
        return ["No cell can be flown at all: look at the date windows."]
    lines = ["The limits forbid every cell."]
    limits = [share for share in flag_shares(survey) if share.title not in REASONS.values()]
    worst = max(limits, key=lambda share: share.share)
    lines.append(f"Most costly: {worst.title}, which forbids {100 * worst.share:.1f} % of the grid.")
    if survey.plan.flybys:
        openers = [line for bound in survey.plan.bounds if (line := _would_open_a_route(survey.plan, bound))]
        return lines + (openers or ["No single limit opens a cell: give two of them more room."])
    openers = [line for bound in survey.plan.bounds if (line := _would_open(survey, bound))]
    return lines + (openers or [_nearest_cell(survey)])


def stages_out_of_reach(survey: Survey) -> list[str]:
    """Stages that no flight of the survey can do with, and by how much; empty where some flight can."""
    totals = survey.provenance["cells_forbidden_by"]
    flown = survey.provenance["cells"] - sum(totals[reason] for reason in REASONS)
    lines = []
    for bound in survey.plan.bounds:
        if bound.name.endswith("_reach") and flown and totals[bound.name] == flown:
            least = min(float(np.nanmin(values)) for values, _ in row_bands(survey, bound.measure.name))
            assert bound.most is not None
            lines.append(
                f"{bound.title}: the least that any date asks of it is {least:.3f} km/s, "
                f"{least - bound.most:.3f} km/s more; give a higher isp_s, a lower structural_fraction or "
                "another stage"
            )
    return lines


def _would_open_a_route(plan: Plan, bound: Bound) -> str | None:
    """A value of one limit at which a route with flybys passes: that of the best one found without the limit.

    Any route found so keeps all other limits. A tighter value may do as well: the search makes least what is
    ranked, not the excess.
    """
    if bound.measure.name.endswith("_altitude_km") and bound.measure.scope == FLYBY:
        return None  # nobody should fly lower for it
    without = replace(plan, bounds=tuple(each for each in plan.bounds if each != bound))
    cells, blocked = flyby_cells(without, without.search, without.tables[0])
    values = np.broadcast_to(bound.measure.compute(cells), blocked.shape)
    excess = np.where(blocked == 0, bound.excess(values), np.inf)
    where = np.unravel_index(np.argmin(excess), excess.shape)
    return _opening(bound, float(values[where])) if np.isfinite(excess[where]) else None


def _would_open(survey: Survey, bound: Bound) -> str | None:
    """The value of one limit that opens the first cell, the others as they are."""
    mask = np.uint32(1 << _bit(survey, bound))
    least, value = np.inf, np.nan
    for values, blocked in row_bands(survey, bound.measure.name):
        excess = np.where(blocked == mask, bound.excess(values), np.inf)
        where = np.unravel_index(np.argmin(excess), excess.shape)
        if excess[where] < least:
            least, value = float(excess[where]), float(values[where])
    return _opening(bound, value) if np.isfinite(least) else None


def _opening(bound: Bound, value: float) -> str:
    end = "min" if bound.least is not None and value < bound.least else "max"
    opening = f"{_beyond(value, end):g} {bound.measure.unit}"
    return f"The first cell opens with {bound.measure.name} {end} = {opening}."


def _nearest_cell(survey: Survey) -> str:
    """Where no single limit would do: the cell that the fewest limits forbid, and what it needs."""
    fewest, cell, names = 99, (0, 0), list[str]()
    offset = 0
    meanings = survey.grid[BLOCKED_BY].attrs["flag_meanings"].split()
    for _, blocked in row_bands(survey, BLOCKED_BY):
        count = np.bitwise_count(blocked).astype(int)
        count[(blocked & np.uint32((1 << len(REASONS)) - 1)) != 0] = 99
        i, j = np.unravel_index(np.argmin(count), count.shape)
        if count[i, j] < fewest:
            fewest, cell = int(count[i, j]), (offset + int(i), int(j))
            names = [name for bit, name in enumerate(meanings) if int(blocked[i, j]) >> bit & 1]
        offset += len(blocked)
    at = survey.grid.isel(departure=cell[0], arrival=cell[1])
    needs = ", ".join(f"{name} {float(at[name]):.4g}" for name in names)
    dates = " to ".join(str(at[side].values)[:10] for side in ("departure", "arrival"))
    return f"No single limit opens a cell; the nearest, {dates}, needs {needs}."


def _bit(survey: Survey, bound: Bound) -> int:
    return survey.grid[BLOCKED_BY].attrs["flag_meanings"].split().index(bound.name)


def _beyond(value: float, end: str) -> float:
    """The value rounded outward to five digits, so that the cell is inside."""
    unit = 10.0 ** (np.floor(np.log10(abs(value))) - 4) if value else 1e-4
    return float((np.floor if end == "min" else np.ceil)(value / unit) * unit)

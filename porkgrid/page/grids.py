"""What the page knows of every cell: measures, what forbids it, and the dates of its flybys, packed."""

from __future__ import annotations

import os
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from functools import partial
from typing import Any

import numpy as np

from porkgrid.page.blocks import Blocks
from porkgrid.page.opened import Opened
from porkgrid.page.pack import packed_grid
from porkgrid.page.thin import Thinning, swept_part, thinned, thinned_dates
from porkgrid.page.words import digits_of, plain_symbol
from porkgrid.sky.epochs import iso_from_jd
from porkgrid.survey.limits import REASONS
from porkgrid.survey.measures import BOTH, BY_DEPARTURE, Measure
from porkgrid.survey.store import BLOCKED_BY, NEVER_SWEPT


def grid_document(opened: Opened, thinning: Thinning, blocks: Blocks) -> dict[str, Any]:
    """The grid for the page: dates and small tables as JSON holds them, arrays as numbers of blocks.

    Arrays are (arrivals, departures), float32 measures as stored and `blocked_by` as uint32; where no tile
    has been swept measures are NaN and `blocked_by` has all bits. Epochs of flybys are float32 places in the
    list of dates of that flyby, which is given beside, −1 where the cell has no flight.
    """
    plan = opened.survey.plan
    departure = thinned_dates(plan.tables[0].jd, thinning.departure_step)
    arrival = thinned_dates(plan.tables[-1].jd, thinning.arrival_step)
    jobs = _jobs(opened, thinning)
    with ThreadPoolExecutor(min(4, os.cpu_count() or 1)) as pool:  # inflating and deflating release the GIL
        texts = dict(zip(jobs, pool.map(lambda job: job(), jobs.values()), strict=True))
    return {
        "departure": _dates(departure),
        "arrival": _dates(arrival),
        "thinning": thinning.words,
        "steps": [thinning.departure_step, thinning.arrival_step],
        "blocked": blocks.add(texts[BLOCKED_BY]),
        "flags": _flags(opened),
        "measures": [_described(opened, name, thinning, texts, blocks) for name in plan.stored],
        "flybys": [
            _dates(plan.tables[n].jd) | {"block": blocks.add(texts[f"flyby{n}_epoch_jd_tdb"])}
            for n in range(1, plan.flybys + 1)
        ],
    }


def described(measure: Measure) -> dict[str, Any]:
    """A measure as the page names, spells and orders it."""
    return {
        "name": measure.name,
        "unit": measure.unit,
        "symbol": plain_symbol(measure.symbol),
        "meaning": measure.meaning,
        "better": measure.better,
        "digits": digits_of(measure.unit),
    }


def _jobs(opened: Opened, thinning: Thinning) -> dict[str, Callable[[], str]]:
    """What there is to read and pack, by variable; each call does one."""
    plan, grid = opened.survey.plan, opened.survey.grid
    rows = slice(0, thinning.departures, thinning.departure_step)
    columns = slice(0, thinning.arrivals, thinning.arrival_step)

    def read(name: str, where_not_swept: float) -> np.ndarray:
        if not opened.missing:
            return thinned(grid[name], thinning)
        return swept_part(grid[name], opened.swept, rows, columns, where_not_swept).T

    def epochs(n: int) -> str:
        return packed_grid(_places(read(f"flyby{n}_epoch_jd_tdb", np.nan), plan.tables[n].jd))

    def measure(name: str) -> str:
        return packed_grid(read(name, np.nan))

    jobs: dict[str, Callable[[], str]] = {
        name: partial(measure, name) for name in plan.stored if plan.measures[name].dims == BOTH
    }
    jobs |= {f"flyby{n}_epoch_jd_tdb": partial(epochs, n) for n in range(1, plan.flybys + 1)}
    jobs[BLOCKED_BY] = lambda: packed_grid(read(BLOCKED_BY, NEVER_SWEPT))
    return jobs


def _places(epochs: np.ndarray, dates_jd: np.ndarray) -> np.ndarray:
    """Where epochs lie in an ascending list of dates, as float32; −1 where there is none."""
    places = np.searchsorted(dates_jd, np.nan_to_num(epochs, nan=dates_jd[0]) - 1e-6)
    return np.where(np.isnan(epochs), -1, places).astype(np.float32)


def _described(
    opened: Opened, name: str, thinning: Thinning, texts: dict[str, str], blocks: Blocks
) -> dict[str, Any]:
    measure = opened.survey.plan.measures[name]
    entry = described(measure)
    if name.startswith("flyby") and name.endswith("_epoch_jd_tdb"):
        return entry | {"of": "flyby", "number": measure.number}
    if measure.dims == BOTH:
        return entry | {"of": "both", "block": blocks.add(texts[name])}
    by_departure = measure.dims == BY_DEPARTURE
    step = thinning.departure_step if by_departure else thinning.arrival_step
    values = thinned_dates(opened.survey.grid[name].values, step)
    return entry | {"of": "departure" if by_departure else "arrival", "values": values.tolist()}


def _dates(jd: np.ndarray) -> dict[str, list[Any]]:
    """Dates as ISO text, and as the TDB Julian dates that tell how far apart they are."""
    return {"iso": [iso_from_jd(each) for each in jd], "jd": jd.tolist()}


def _flags(opened: Opened) -> list[dict[str, Any]]:
    """The bits of `blocked_by`, lowest first: reasons for which there is no flight, then limits."""
    reasons = [{"name": name, "title": title, "limit": None} for name, title in REASONS.items()]
    limits = [
        {
            "name": bound.name,
            "title": bound.title,
            "limit": {"measure": bound.measure.name, "least": bound.least, "most": bound.most},
        }
        for bound in opened.survey.plan.bounds
    ]
    return [*reasons, *limits]

"""What a sweep will do, settled before it starts: tables, leg options, measures, limits and tiles."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from itertools import pairwise

import numpy as np

from porkgrid.scenario import Scenario
from porkgrid.sky.bodies import find_body
from porkgrid.sky.kernel import Ephemeris, open_ephemeris
from porkgrid.sky.states import StateTable, state_table
from porkgrid.survey.cells import Cells, FlybyCells
from porkgrid.survey.chains import Search, prepare
from porkgrid.survey.flybylimits import refuse_unsearchable, with_flyby_bounds
from porkgrid.survey.legs import LegCells, LegOption, leg_options
from porkgrid.survey.limits import Bound, bounds_of
from porkgrid.survey.masses import Masses, masses_of
from porkgrid.survey.masslimits import with_mass_bounds
from porkgrid.survey.measures import Measure, default_rank, features_of, measures_for
from porkgrid.survey.objective import objective_of
from porkgrid.survey.orbits import ApsisOrbit, ShapeOrbit, capture_orbit, parking_orbit

# A tile is a chunk of the store: 2^17 cells keep a tile's arrays at a megabyte each.
TILE_COLUMNS = 1024
TILE_CELLS = 2**17
SEARCH_TILES = 12


@dataclass(frozen=True)
class Tile:
    """A block of the grid that is computed and written as a whole."""

    number: int
    rows: slice
    columns: slice

    @property
    def cells(self) -> int:
        """How many cells it holds."""
        return (self.rows.stop - self.rows.start) * (self.columns.stop - self.columns.start)


@dataclass(frozen=True, eq=False)
class Plan:
    """A scenario with everything looked up that its cells need."""

    scenario: Scenario
    ephemeris: Ephemeris
    tables: tuple[StateTable, ...]  # one per encounter
    earth_at_arrival: np.ndarray  # (3, m) km
    options: tuple[tuple[LegOption, ...], ...]  # per leg
    parking: ApsisOrbit | None
    capture: ApsisOrbit | ShapeOrbit | None
    masses: Masses
    measures: dict[str, Measure]  # all that the route has
    stored: tuple[str, ...]  # those that the survey keeps
    bounds: tuple[Bound, ...]
    rank_by: str
    rank_sign: float  # +1: less is better; −1: more is better
    objective: Measure  # what a search for flyby dates makes least, with its own sign
    objective_sign: float
    tile_cells: int = TILE_CELLS  # at most, in a tile
    tile_columns: int = TILE_COLUMNS  # at most, in a tile of a direct route
    flown: dict = field(default_factory=dict)  # legs that are the same fly once: legtables

    @property
    def shape(self) -> tuple[int, int]:
        """Departure dates × arrival dates."""
        return len(self.tables[0].jd), len(self.tables[-1].jd)

    @property
    def chunks(self) -> tuple[int, int]:
        """Rows and columns of a whole tile."""
        n, m = self.shape
        if self.flybys:  # a search reaches all arrivals at once, and is dear: many small tiles
            return max(1, min(self.tile_cells // m, -(-n // SEARCH_TILES))), m
        columns = min(m, self.tile_columns)
        return min(n, max(1, self.tile_cells // columns)), columns

    @cached_property
    def tiles(self) -> tuple[Tile, ...]:
        """The tiles in order of number; the same for every machine and every number of workers."""
        return tuple(Tile(number, *block) for number, block in enumerate(_blocks(self.shape, self.chunks)))

    @property
    def lambert_solves(self) -> int:
        """How many Lambert problems a sweep solves."""
        dates = [len(table.jd) for table in self.tables]
        pairs = zip(self.options, pairwise(dates), strict=True)
        return sum(len(options) * a * b for options, (a, b) in pairs)

    @property
    def flybys(self) -> int:
        """How many flybys the route has."""
        return len(self.options) - 1

    def cells(
        self,
        departure: StateTable,
        arrival: StateTable,
        earth_at_arrival: np.ndarray,
        legs: list[LegCells],
        flybys: Sequence[FlybyCells] = (),
    ) -> Cells:
        """Cells of these legs with the orbits and masses of the plan."""
        return Cells(
            departure, arrival, earth_at_arrival, legs, self.parking, self.capture, list(flybys), self.masses
        )

    @cached_property
    def search(self) -> Search:
        """What the search for flyby dates shares among tiles."""
        return prepare(self)

    @property
    def route(self) -> str:
        """The bodies in flying order, "Earth → Mars"; those moved by elements say so."""
        return " → ".join(
            body.title if body.elements is None else f"{body.title} (two-body elements)"
            for body in (table.body for table in self.tables)
        )


def make_plan(scenario: Scenario) -> Plan:
    """Look up what a sweep of the scenario needs. RequestError where it cannot be done."""
    ephemeris = open_ephemeris(scenario.kernels)
    extra = scenario.own_bodies
    bodies = [find_body(encounter.body, extra) for encounter in scenario.encounters]
    tables = tuple(
        state_table(ephemeris, body, encounter.epochs_jd())
        for body, encounter in zip(bodies, scenario.encounters, strict=True)
    )
    first, last = scenario.encounters[0], scenario.encounters[-1]
    masses = masses_of(scenario)
    features = features_of(bodies, first.parking is not None, last.capture is not None, masses.features)
    measures = measures_for(len(scenario.legs), features)
    rank_by = scenario.rank.by or default_rank(features)
    sign = 1.0 if (scenario.rank.order or measures[rank_by].better) == "least" else -1.0
    objective, objective_sign = objective_of(masses, measures, rank_by, sign)
    bounds = with_flyby_bounds(bounds_of(scenario.limits, measures), scenario, bodies, measures)
    bounds = with_mass_bounds(bounds, scenario, measures)
    earth, _ = ephemeris.states(find_body("earth", {}), tables[-1].jd)
    plan = Plan(
        scenario=scenario,
        ephemeris=ephemeris,
        tables=tables,
        earth_at_arrival=earth,
        options=tuple(tuple(leg_options(leg.max_revs, leg.retrograde)) for leg in scenario.legs),
        parking=None if first.parking is None else parking_orbit(first.parking, bodies[0]),
        capture=None if last.capture is None else capture_orbit(last.capture, bodies[-1]),
        masses=masses,
        measures=measures,
        stored=_stored(scenario, measures, rank_by, bounds),
        bounds=bounds,
        rank_by=rank_by,
        rank_sign=sign,
        objective=objective,
        objective_sign=objective_sign,
        tile_cells=TILE_CELLS,
        tile_columns=TILE_COLUMNS,
    )
    if plan.flybys:
        refuse_unsearchable(plan)
    return plan


def _stored(
    scenario: Scenario, measures: dict[str, Measure], rank_by: str, bounds: tuple[Bound, ...]
) -> tuple[str, ...]:
    """The measures to keep: those asked for, and always the epochs, the limited and the ranked."""
    if scenario.measures is None:
        return tuple(measures)
    wanted = {*scenario.measures, *(bound.measure.name for bound in bounds), rank_by}
    # what a candidate is made of
    wanted |= {name for name in measures if name.endswith(("_epoch_jd_tdb", "_revs", "_branch"))}
    return tuple(name for name in measures if name in wanted)


def _blocks(shape: tuple[int, int], chunks: tuple[int, int]) -> Iterator[tuple[slice, slice]]:
    for top in range(0, shape[0], chunks[0]):
        for left in range(0, shape[1], chunks[1]):
            yield (
                slice(top, min(top + chunks[0], shape[0])),
                slice(left, min(left + chunks[1], shape[1])),
            )

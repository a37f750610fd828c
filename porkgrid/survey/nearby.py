"""The measures of routes at dates near their own, many routes and many sets of dates at a time.

Each measure is a function of a grid of (departure, arrival) dates. Here the k-th departure belongs to the
k-th arrival, and what is sought stands on the diagonal of the grid of k × k; nearly all that a measure is
made of is (k, 1), so little is computed in vain.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

import numpy as np

from porkgrid.physics.constants import DAY_S, GM_SUN_KM3_S2
from porkgrid.physics.lambert import FLOWN, NO_TRANSFER, lambert
from porkgrid.sky.bodies import find_body
from porkgrid.sky.states import StateTable, state_table
from porkgrid.survey.candidates import Picked
from porkgrid.survey.cells import Cells, FlybyCells
from porkgrid.survey.descent import Evaluate
from porkgrid.survey.legs import LegCells, LegOption
from porkgrid.survey.limits import Bound
from porkgrid.survey.measures import Measure
from porkgrid.survey.plan import Plan
from porkgrid.survey.tracks import Tracks, tracks

# Options of a leg, and which of them each of k routes flies (k,)
Flown = tuple[Sequence[LegOption], np.ndarray]


@dataclass
class OneSidedFlyby(FlybyCells):
    """A flyby whose burn is negative where it brakes on side +1, or speeds up on side −1; side (k, 1).

    The size of a burn has a kink where it is zero; so written, it is smooth across. Side 0: the size.
    """

    side: np.ndarray

    @cached_property
    def burn_km_s(self) -> np.ndarray:
        """(k, 1) burn along the velocity times the side."""
        gain = np.linalg.norm(self.v_out, axis=0) - np.linalg.norm(self.v_in, axis=0)
        size = super().burn_km_s
        return np.where(self.side == 0.0, size, np.copysign(size, self.side * gain))


def paired_cells(
    plan: Plan,
    tables: Sequence[StateTable],
    earth_at_arrival: np.ndarray,
    flown: Sequence[Flown],
    sides: np.ndarray,
) -> Cells:
    """The cells of k routes, each on the diagonal.

    tables: of every encounter, with the k dates of the k routes; earth_at_arrival (3, k) km; flown: how, for
    every leg; sides (flybys, k) of `OneSidedFlyby`.
    """
    legs = [_leg(*pair, each) for pair, each in zip(pairwise(tables), flown, strict=True)]
    flybys = [
        OneSidedFlyby(table.body, before.v_inf_in, after.v_inf_out, after.body_velocity1, side[:, None])
        for table, (before, after), side in zip(tables[1:-1], pairwise(legs), sides, strict=True)
    ]
    return plan.cells(tables[0], tables[-1], earth_at_arrival, legs, flybys)


def on_diagonal(measure: Measure, cells: Cells) -> np.ndarray:
    """(k,) values of a measure in `paired_cells`."""
    k = len(cells.departure.jd)
    return np.broadcast_to(measure.compute(cells), (k, k)).diagonal()


def measures_of(plan: Plan, picked: Sequence[Picked]) -> list[dict[str, float]]:
    """Every measure of several routes: `candidates.measures_at` of each, at a fraction of the calls."""
    epochs = np.array([one.epochs for one in picked])
    tables = [state_table(plan.ephemeris, table.body, epochs[:, n]) for n, table in enumerate(plan.tables)]
    earth, _ = plan.ephemeris.states(find_body("earth", {}), epochs[:, -1])
    sides = np.zeros((plan.flybys, len(picked)))
    cells = paired_cells(plan, tables, earth, _flown(plan, picked), sides)
    columns = [on_diagonal(measure, cells).tolist() for measure in plan.measures.values()]
    return [dict(zip(plan.measures, row, strict=True)) for row in zip(*columns, strict=True)]


def evaluation(plan: Plan, picked: Sequence[Picked], spans: np.ndarray) -> Evaluate:
    """The ranked measure, limits and burns of candidates as a descent wants them: less is better.

    spans (candidates, encounters, 2): the TDB Julian dates between which dates will be asked for.
    """
    stops = [tracks(plan.ephemeris, table.body, spans[:, n]) for n, table in enumerate(plan.tables)]
    earth = tracks(plan.ephemeris, find_body("earth", {}), spans[:, -1])
    choices = _flown(plan, picked)

    def evaluate(which: np.ndarray, epochs: np.ndarray, sides: np.ndarray) -> np.ndarray:
        count, _, p = epochs.shape
        tables = [_table(track, which, epochs[:, n]) for n, track in enumerate(stops)]
        flown = [(options, np.repeat(chosen[which], p)) for options, chosen in choices]
        at_earth = _table(earth, which, epochs[:, -1]).position
        cells = paired_cells(plan, tables, at_earth, flown, np.repeat(sides, p, axis=0).T)
        cost = plan.rank_sign * on_diagonal(plan.measures[plan.rank_by], cells)
        slacks = [row for bound in plan.bounds for row in _slacks(bound, on_diagonal(bound.measure, cells))]
        burns = [flyby.burn_km_s[:, 0] for flyby in cells.flybys]
        return np.swapaxes(np.array([cost, *slacks, *burns]).reshape(-1, count, p), 0, 1)

    return evaluate


def _flown(plan: Plan, picked: Sequence[Picked]) -> list[Flown]:
    """How each leg of the routes is flown."""
    return [
        (options, np.array([options.index(one.options[leg]) for one in picked]))
        for leg, options in enumerate(plan.options)
    ]


def _table(track: Tracks, which: np.ndarray, jd: np.ndarray) -> StateTable:
    """States at dates (a, p) of the candidates numbered (a,), one after the other."""
    states = track.states(which, jd).reshape(6, -1)
    return StateTable(track.body, jd.ravel(), states[:3], states[3:])


def _slacks(bound: Bound, values: np.ndarray) -> list[np.ndarray]:
    """How far values are inside each end of a limit; negative outside."""
    least = [] if bound.least is None else [values - bound.least]
    return least if bound.most is None else [*least, bound.most - values]


def _leg(departure: StateTable, arrival: StateTable, flown: Flown) -> LegCells:
    """A leg flown from each departure to the arrival of the same number; arrays (k, 1) and (3, k, 1)."""
    tof_days = arrival.jd - departure.jd
    v_out, v_in = np.empty_like(departure.position), np.empty_like(arrival.position)
    options, chosen = flown
    for n, option in enumerate(options):
        here = np.flatnonzero(chosen == n)
        v1, v2 = lambert(
            departure.position[:, here].T, arrival.position[:, here].T, tof_days[here] * DAY_S, GM_SUN_KM3_S2,
            revs=option.revs, branch="right" if option.right else "left", retrograde=option.retrograde,
        )  # fmt: skip
        v_out[:, here] = v1.T - departure.velocity[:, here]
        v_in[:, here] = v2.T - arrival.velocity[:, here]
    return LegCells(
        r1=departure.position[:, :, None],
        r2=arrival.position[:, :, None],
        body_velocity1=departure.velocity[:, :, None],
        body_velocity2=arrival.velocity[:, :, None],
        jd2=arrival.jd[:, None],
        tof_days=tof_days[:, None],
        v_inf_out=v_out[:, :, None],
        v_inf_in=v_in[:, :, None],
        status=np.where(np.isnan(v_out[0]), NO_TRANSFER, FLOWN).astype(np.int8)[:, None],
        revs=np.array([option.revs for option in options], dtype=np.int8)[chosen, None],
        branch=np.array([option.branch for option in options], dtype=np.int8)[chosen, None],
    )

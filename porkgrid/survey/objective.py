"""What a search for flyby dates makes least, so that a cell's flyby dates are the best by the rank."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from porkgrid.physics.staging import exhaust_speed_km_s
from porkgrid.survey.cells import Cells
from porkgrid.survey.masses import Masses
from porkgrid.survey.measures import ENDS, MASS, Measure


def objective_of(
    masses: Masses, measures: Mapping[str, Measure], rank_by: str, sign: float
) -> tuple[Measure, float]:
    """The measure to search flyby dates by, and its sign (+1: less is better).

    That is the ranked measure where legs and burns add up to it. Masses do not add, but where one engine
    makes all burns after the launch their logarithms do. Where dates alone decide the rank, and for stacks,
    a full tank or an order against the grain, it is total Δv (without a parking orbit: the spacecraft's).
    """
    ranked = measures[rank_by]
    if ranked.scope not in (ENDS, MASS):
        return ranked, sign
    natural = sign == (1.0 if ranked.better == "least" else -1.0)
    if ranked.scope == MASS and natural and masses.stack is None:
        by_mass = _by_mass(masses, rank_by)
        if by_mass is not None:
            return by_mass, 1.0
    if "dv_total_km_s" in measures:
        return measures["dv_total_km_s"], 1.0
    return (_by_spacecraft(masses), 1.0) if masses.spacecraft is not None else (ranked, sign)


def searched_exactly(objective: Measure, name: str) -> bool:
    """Whether flyby dates that are best by the objective are best by a mass measure."""
    return name in _SERVES.get(objective.name, ())


_SPACECRAFT, _DELIVERED = "spacecraft Δv", "delivered mass as Δv"
_SERVES = {
    _SPACECRAFT: ("dv_spacecraft_km_s", "propellant_kg", "low_orbit_mass_kg"),
    _DELIVERED: ("delivered_mass_kg", "mass_margin_kg"),
}


def _by_mass(masses: Masses, rank_by: str) -> Measure | None:
    craft = masses.spacecraft
    assert craft is not None
    if rank_by in ("delivered_mass_kg", "mass_margin_kg"):
        return None if craft.tank_kg is not None else _by_delivered(craft.isp_s)
    if rank_by == "propellant_kg" and craft.dry_mass_kg is None:
        return None
    return _by_spacecraft(masses)


def _by_spacecraft(masses: Masses) -> Measure:
    """Propellant of one engine grows with the sum of its burns."""
    launched = masses.capability is not None
    return Measure(
        _SPACECRAFT,
        "km/s",
        _SPACECRAFT,
        "sum of the burns of the spacecraft",
        lambda cells: cells.budget.spacecraft_dv_km_s,
        scope=MASS,
        first_leg=_nothing if launched else lambda cells: cells.dv_departure,
        last_leg=_capture,
    )


def _by_delivered(isp_s: float) -> Measure:
    """ln(delivered) = ln(injected) − burns / c, so least is burns − c ln(injected)."""
    c = float(exhaust_speed_km_s(isp_s))

    def injection(cells: Cells) -> np.ndarray:
        with np.errstate(divide="ignore"):  # a table may end at no mass at all
            return -c * np.log(cells.budget.injected_kg)

    return Measure(
        _DELIVERED,
        "km/s",
        _DELIVERED,
        "burns less what the injected mass is worth",
        lambda cells: injection(cells) + cells.budget.spacecraft_dv_km_s,
        scope=MASS,
        first_leg=injection,
        last_leg=_capture,
    )


def _nothing(cells: Cells) -> np.ndarray:
    return np.zeros(())


def _capture(cells: Cells) -> np.ndarray:
    return np.zeros(()) if cells.capture is None else cells.dv_capture

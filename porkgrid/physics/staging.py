"""What a change of speed costs in propellant: the rocket equation, and stages that carry their own structure.

Masses in kg, Δv in km/s, specific impulse in s; arrays broadcast. The structural fraction ε of a stage is
structure/(structure + propellant), 0 <= ε < 1 (any text on staging, for instance Curtis, Orbital Mechanics
for Engineering Students, sections 11.3 to 11.5).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from porkgrid.physics.constants import G0_KM_S2


def exhaust_speed_km_s(isp_s: ArrayLike) -> np.ndarray:
    """Effective exhaust speed of an engine of this specific impulse."""
    return G0_KM_S2 * np.asarray(isp_s, dtype=float)


def mass_ratio(dv_km_s: ArrayLike, isp_s: ArrayLike) -> np.ndarray:
    """Mass before a burn over mass after it (Tsiolkovsky); infinite where a double cannot hold it."""
    with np.errstate(over="ignore"):
        return np.exp(np.divide(dv_km_s, exhaust_speed_km_s(isp_s)))


def propellant_after(mass_after_kg: ArrayLike, dv_km_s: ArrayLike, isp_s: ArrayLike) -> np.ndarray:
    """Propellant that gives this Δv and leaves `mass_after_kg`."""
    return np.multiply(mass_after_kg, _growth(dv_km_s, isp_s))


def stage_propellant(
    above_kg: ArrayLike, dv_km_s: ArrayLike, isp_s: ArrayLike, structural_fraction: ArrayLike
) -> np.ndarray:
    """Propellant that a stage needs to give what it carries, `above_kg`, and its own structure this Δv.

    With R the mass ratio and κ = ε/(1 − ε), structure per propellant, R = (above + κp + p)/(above + κp) gives
    p = above (R − 1)/(1 − κ(R − 1)). NaN where R >= 1/ε: a stage that carries nothing gives no more.
    """
    fraction = np.asarray(structural_fraction, dtype=float)
    growth = _growth(dv_km_s, isp_s)
    with np.errstate(invalid="ignore", over="ignore"):  # growth beyond a double; without structure 0·∞
        left = 1.0 - fraction / (1.0 - fraction) * growth
        return np.multiply(above_kg, growth) / np.where(left > 0.0, left, np.nan)


def stage_structure(propellant_kg: ArrayLike, structural_fraction: ArrayLike) -> np.ndarray:
    """Structure of a stage that holds this much propellant."""
    fraction = np.asarray(structural_fraction, dtype=float)
    return np.multiply(fraction / (1.0 - fraction), propellant_kg)


def stage_dv_limit(isp_s: ArrayLike, structural_fraction: ArrayLike) -> np.ndarray:
    """Δv that a stage gives to itself alone, c ln(1/ε); with anything to carry it gives less."""
    with np.errstate(divide="ignore"):  # no structure, no limit
        return -exhaust_speed_km_s(isp_s) * np.log(structural_fraction)


def _growth(dv_km_s: ArrayLike, isp_s: ArrayLike) -> np.ndarray:
    """Mass ratio less one, which keeps its digits where the Δv is small."""
    with np.errstate(over="ignore"):
        return np.expm1(np.divide(dv_km_s, exhaust_speed_km_s(isp_s)))

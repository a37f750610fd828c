"""What is known of the cells of a grid before any measure is taken.

A cell is one (departure date, arrival date) pair; n departure dates and m arrival dates make n × m cells.
Legs hold the options that were kept for the cell; a direct flight is a route of one leg.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from porkgrid.physics import burns
from porkgrid.sky.bodies import Body, gm_of, pole_axes
from porkgrid.sky.states import StateTable
from porkgrid.survey.legs import LegCells
from porkgrid.survey.orbits import ApsisOrbit, ShapeOrbit

if TYPE_CHECKING:
    from porkgrid.survey.masses import Budget, Masses


@dataclass
class FlybyCells:
    """One flyby in every cell: the body passed, and what joins the leg in to the leg out."""

    body: Body
    v_in: np.ndarray  # (3, n, m) km/s, relative to the body
    v_out: np.ndarray
    body_velocity: np.ndarray  # (3, n, m) km/s, heliocentric

    @cached_property
    def periapsis_km(self) -> np.ndarray:
        """(n, m) radius of the one periapsis that turns v_in into v_out."""
        from porkgrid.physics.flyby import periapsis_radius

        return periapsis_radius(self.v_in, self.v_out, gm_of(self.body))

    @cached_property
    def burn_km_s(self) -> np.ndarray:
        """(n, m) burn at that periapsis, along the velocity."""
        from porkgrid.physics.flyby import burn

        return burn(self.v_in, self.v_out, gm_of(self.body))


@dataclass
class Cells:
    """The legs of a grid with the tables of the bodies at its two ends."""

    departure: StateTable
    arrival: StateTable
    earth_at_arrival: np.ndarray  # (3, m) km, heliocentric
    legs: list[LegCells]
    parking: ApsisOrbit | None = None
    capture: ApsisOrbit | ShapeOrbit | None = None
    flybys: list[FlybyCells] = field(default_factory=list)
    masses: Masses | None = None

    @cached_property
    def departure_axes(self) -> np.ndarray:
        """(n, 3, 3): rows are the axes in which departure declination and right ascension are given."""
        return pole_axes(self.departure.body, self.departure.jd)

    @cached_property
    def arrival_axes(self) -> np.ndarray:
        """(m, 3, 3): rows are the axes in which arrival declination is given."""
        return pole_axes(self.arrival.body, self.arrival.jd)

    @property
    def status(self) -> np.ndarray:
        """(n, m) FLOWN, or what keeps the first leg that cannot be flown from it (physics.lambert)."""
        return np.maximum.reduce([leg.status for leg in self.legs])

    @cached_property
    def c3(self) -> np.ndarray:
        """(n, m) departure energy, km²/s²."""
        return _square(self.legs[0].v_inf_out)

    @cached_property
    def v_inf_departure(self) -> np.ndarray:
        """(n, m) km/s."""
        return np.sqrt(self.c3)

    @cached_property
    def v_inf_arrival(self) -> np.ndarray:
        """(n, m) km/s."""
        return np.sqrt(_square(self.legs[-1].v_inf_in))

    @cached_property
    def dv_departure(self) -> np.ndarray:
        """(n, m) km/s, burn at the parking orbit's periapsis."""
        orbit, gm = self.parking, gm_of(self.departure.body)
        assert orbit is not None
        apsides = (orbit.periapsis_km, orbit.apoapsis_km)
        if orbit.inclination_rad is None:
            return burns.apsis_burn(self.v_inf_departure, *apsides, gm)
        return burns.departure_burn(
            self.v_inf_departure, self.departure_declination_rad, *apsides, orbit.inclination_rad, gm
        )

    @cached_property
    def capture_periapsis_km(self) -> np.ndarray:
        """(n, m), or () where it is one for all cells: radius of the capture orbit's periapsis."""
        orbit = self.capture
        assert orbit is not None
        if isinstance(orbit, ApsisOrbit):
            return np.asarray(orbit.periapsis_km)
        cheapest = burns.cheapest_periapsis(self.v_inf_arrival, orbit.eccentricity, gm_of(self.arrival.body))
        return np.maximum(cheapest, orbit.lowest_km)

    @cached_property
    def dv_capture(self) -> np.ndarray:
        """(n, m) km/s, burn at the capture orbit's periapsis."""
        orbit, gm = self.capture, gm_of(self.arrival.body)
        assert orbit is not None
        if isinstance(orbit, ApsisOrbit):
            return burns.apsis_burn(self.v_inf_arrival, orbit.periapsis_km, orbit.apoapsis_km, gm)
        return burns.shape_burn(self.v_inf_arrival, self.capture_periapsis_km, orbit.eccentricity, gm)

    @cached_property
    def dv_after_departure(self) -> np.ndarray:
        """(n, m) km/s, sum of the burns at flybys and at capture."""
        total = np.zeros_like(self.v_inf_arrival) if self.capture is None else self.dv_capture
        for flyby in self.flybys:
            total = total + flyby.burn_km_s
        return total

    def burn_named(self, name: str) -> np.ndarray:
        """(n, m) km/s of "departure", "flyby1", … or "capture"."""
        if name == "departure":
            return self.dv_departure
        if name == "capture":
            return self.dv_capture
        return self.flybys[int(name.removeprefix("flyby")) - 1].burn_km_s

    @cached_property
    def budget(self) -> Budget:
        """Masses of the cells."""
        from porkgrid.survey.masses import Budget

        assert self.masses is not None
        return Budget(self.masses, self)

    @cached_property
    def departure_declination_rad(self) -> np.ndarray:
        """(n, m) declination of the departure asymptote."""
        z = _along(self.departure_axes[:, 2, :, None], self.legs[0].v_inf_out)
        return np.arcsin(np.clip(z / self.v_inf_departure, -1.0, 1.0))


def _square(vector: np.ndarray) -> np.ndarray:
    return vector[0] * vector[0] + vector[1] * vector[1] + vector[2] * vector[2]


def _along(axis: np.ndarray, vector: np.ndarray) -> np.ndarray:
    """Component of `vector` (3, n, m) along `axis`, (n, 3, 1) per row of the grid."""
    return axis[:, 0] * vector[0] + axis[:, 1] * vector[1] + axis[:, 2] * vector[2]

"""What the full-force check says of a candidate: patched against full-force, line by line, and a verdict."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from porkgrid.handoff.newton import Iteration
from porkgrid.physics.constants import DAY_S

Floats = NDArray[np.float64]

CONFIRMED, CHANGED, FAILED = "confirmed", "confirmed with changes", "not confirmed"

# What a confirmation allows. Practice: a launcher's reserve, and the allowance for corrections that a mission
# carries anyway.
LARGEST_C3_CHANGE_PERCENT = 2.0
LARGEST_EXTRA_DV_M_S = 50.0
LARGEST_SHIFT_DAYS = 1.0
LARGEST_MISS_KM = 1.0

THRESHOLDS = (
    f"{CONFIRMED}: joined, every miss under {LARGEST_MISS_KM:g} km, flybys at allowed altitudes and within "
    f"{LARGEST_SHIFT_DAYS:g} day of their epochs, C3 no more than {LARGEST_C3_CHANGE_PERCENT:g} % and burns "
    f"no more than {LARGEST_EXTRA_DV_M_S:g} m/s above patched, no limit of the scenario newly broken; "
    f"{CHANGED}: joined, every miss under {LARGEST_MISS_KM:g} km, flybys at allowed altitudes; "
    f"{FAILED}: anything else"
)


@dataclass(frozen=True)
class Line:
    """One number both ways. Epochs are TDB Julian dates and their difference is in days."""

    name: str
    unit: str
    patched: float
    full_force: float

    @property
    def difference(self) -> float:
        """Full-force less patched; of a right ascension, the short way round."""
        difference = self.full_force - self.patched
        return (difference + 180.0) % 360.0 - 180.0 if self.name == "rla_deg" else difference


@dataclass(frozen=True, eq=False)
class FlownLeg:
    """A leg as integrated, from periapsis to periapsis, at the integrator's own steps.

    `seconds` (k,) count from `reference_jd` (TDB) and are exact, where Julian dates round to 40 microseconds;
    position (3, k) km and velocity (3, k) km/s are heliocentric in ICRF axes. The steps are uneven, as short
    as hundredths of a second and as long as a week: for states to interpolate between, ask `at`.
    """

    number: int
    reference_jd: float
    seconds: Floats
    position: Floats
    velocity: Floats
    between: Callable[[Floats], Floats]  # states (6, m) at seconds (m,)

    def at(self, seconds: Floats) -> tuple[Floats, Floats]:
        """Position (3, m) km and velocity (3, m) km/s at any times (m,) of the leg, to millimetres.

        ValueError for a time before its start or after its end.
        """
        wanted = np.asarray(seconds, dtype=float)
        if wanted.size and not (self.seconds[0] <= wanted.min() and wanted.max() <= self.seconds[-1]):
            raise ValueError(f"leg {self.number} is flown from {self.seconds[0]} to {self.seconds[-1]} s")
        states = self.between(wanted)
        return states[:3], states[3:]

    @property
    def jd(self) -> Floats:
        """TDB Julian dates (k,)."""
        return self.reference_jd + self.seconds / DAY_S


@dataclass(frozen=True, eq=False)
class FlownEncounter:
    """Periapsis at one encounter. Vectors (3,) are from the body in ICRF axes; None where there is none.

    `kind` is "departure", "flyby" or "arrival"; `burn_km_s` is along the velocity, and `burn_left_m_s` what
    it is above the patched route's. `held` says which number of the patched flyby was kept: "burn", "radius"
    (the least allowed) or "epoch". A body without GM is met at its centre: periapsis 0, no aim point.
    """

    kind: str
    body: str
    jd: float
    periapsis_km: float
    position: Floats
    velocity_before: Floats | None
    velocity_after: Floats | None
    v_inf_in: Floats | None
    v_inf_out: Floats | None
    burn_km_s: float = 0.0
    burn_left_m_s: float = 0.0
    held: str = ""


@dataclass(frozen=True)
class Attempt:
    """One solution tried: what its flybys held, whether it joined, how it ended, and the way there.

    An iteration's misses are the worst joint in km and in km/s, and the worst flyby condition (km/s, radii of
    the least radius, or days).
    """

    held: tuple[str, ...]
    converged: bool
    ended: str
    history: tuple[Iteration, ...]


@dataclass(frozen=True, eq=False)
class FullForceReport:
    """The check of one candidate. Without convergence the numbers are those of the best that was reached."""

    lines: tuple[Line, ...]
    encounters: tuple[FlownEncounter, ...]
    legs: tuple[FlownLeg, ...]
    joint_km: float  # worst gap between the halves of a leg
    joint_km_s: float
    miss_km: tuple[float, ...]  # at the end of every leg, flown in one arc from its start
    converged: bool
    attempts: tuple[Attempt, ...]  # in the order tried
    extra_dv_m_s: float
    verdict: str
    reasons: tuple[str, ...]
    thresholds: str
    forces: tuple[str, ...]
    ephemeris: str
    integrator: str
    tolerances: str
    assumptions: tuple[str, ...]
    aim_plane: str
    wall_s: float

    def line(self, name: str) -> Line:
        """The line of a name; KeyError where the route has none such."""
        return {line.name: line for line in self.lines}[name]

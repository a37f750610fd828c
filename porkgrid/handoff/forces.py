"""The field of the full-force check: point masses of the Solar System on tracks from the ephemeris."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from porkgrid.errors import RunError
from porkgrid.physics.constants import DAY_S
from porkgrid.physics.nbody import Field
from porkgrid.physics.tracks import fit_tracks, sample_times, state_on_track
from porkgrid.sky.bodies import BODIES, Body, gm_of
from porkgrid.sky.kernel import Ephemeris

# The Sun is the centre. From Mars outward the kernel has the barycentres of the systems, moons included.
PULLING = ("mercury", "venus", "earth", "moon", "mars", "jupiter", "saturn", "uranus", "neptune", "pluto")

# The kernel's own pieces for Moon and Earth are 4 days long with 13 terms (Park and others 2021).
_PIECE_DAYS, _TERMS = 4.0, 14
WORST_FIT_KM = 1e-3
# A Julian date is rounded to 40 microseconds, and within a kernel of a thousand years seconds are to 2, which
# moves a planet by centimetres. Dates in whole 4096ths of a day are exact both in days and in seconds.
_TICKS_PER_DAY = 4096.0
_CHECKS = 64  # places between the samples at which a fit is compared with the kernel


@dataclass(frozen=True, eq=False)
class Forces:
    """A field and what it is made of: its time 0 is `epoch_jd` (TDB), its tracks are those of `bodies`."""

    field: Field
    epoch_jd: float
    bodies: tuple[Body, ...]
    worst_fit_km: float

    def seconds(self, jd: float) -> float:
        """Seconds of the field of a TDB Julian date."""
        return (jd - self.epoch_jd) * DAY_S

    def jd(self, t_s: float) -> float:
        """TDB Julian date of a time of the field."""
        return self.epoch_jd + t_s / DAY_S

    def index(self, body: Body) -> int:
        """Which of the tracks is the body's."""
        return self.bodies.index(body)

    @property
    def names(self) -> tuple[str, ...]:
        """The Sun, and the bodies that pull."""
        pulling = zip(self.bodies, self.field.gm, strict=True)
        return (BODIES["sun"].title, *(body.title for body, gm in pulling if gm > 0.0))


def forces_over(ephemeris: Ephemeris, met: Sequence[Body], first_jd: float, last_jd: float) -> Forces:
    """The field from one TDB Julian date to another, with all of `PULLING` and the bodies met besides.

    RequestError where the ephemeris does not cover the dates; RunError where a track cannot be fitted to
    `WORST_FIT_KM`.
    """
    bodies = [BODIES[name] for name in PULLING]
    bodies += [body for body in dict.fromkeys(met) if body not in bodies]
    span_s = (last_jd - first_jd) * DAY_S
    wanted_s = sample_times(0.0, span_s, _PIECE_DAYS * DAY_S, _TERMS)
    jd = _whole_ticks(first_jd + wanted_s / DAY_S)
    samples = np.stack([ephemeris.states(body, jd.ravel())[0] for body in bodies])
    tracks = fit_tracks(0.0, span_s, (jd - first_jd) * DAY_S, samples.reshape(len(bodies), 3, *jd.shape))
    gm = np.array([body.gm_km3_s2 or 0.0 for body in bodies])
    sun = gm_of(BODIES["sun"])

    checked_jd = _whole_ticks(np.linspace(first_jd, last_jd, _CHECKS + 2)[1:-1])
    worst = 0.0
    for number, body in enumerate(bodies):
        there, _ = ephemeris.states(body, checked_jd)
        fitted = [state_on_track(tracks, number, (at - first_jd) * DAY_S)[0] for at in checked_jd]
        miss_km = float(np.linalg.norm(np.array(fitted).T - there, axis=0).max())
        if miss_km > WORST_FIT_KM:
            raise RunError(
                f"{body.name}: its path could be followed to {miss_km:.3g} km only, "
                f"{WORST_FIT_KM:g} km are needed for the full-force check"
            )
        worst = max(worst, miss_km)
    return Forces(Field(sun, gm, tracks), first_jd, tuple(bodies), worst)


def _whole_ticks(jd: np.ndarray) -> np.ndarray:
    return np.rint(jd * _TICKS_PER_DAY) / _TICKS_PER_DAY

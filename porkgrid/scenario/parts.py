"""The tables of a scenario file as validated objects: encounters, legs, limits and ranking.

Checks here need one table only. Each is made at the last of the fields it looks at, so that one bad field
does not hide a fault of another.
"""

from __future__ import annotations

import math
from datetime import date, datetime
from typing import Annotated, Any, Literal

import numpy as np
from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, ValidationInfo, field_validator
from pydantic_core import PydanticCustomError

from porkgrid.physics.constants import DAY_S
from porkgrid.scenario.faults import shown
from porkgrid.sky.epochs import jd_from_date

MAX_DATES = 1_000_000  # per encounter: a day's step for 2700 years
SHORTEST_STEP_S = 1.0  # Julian dates resolve 40 microseconds and the grid's dates milliseconds
LONGEST_NAME = 80  # characters; a name is a chart's title and a folder
MAX_REVS = 20  # practice: each revolution adds two solutions per cell; flown missions use two or three


def refusal(text: str) -> PydanticCustomError:
    """A fault in our own words, to raise in a validator."""
    return PydanticCustomError("porkgrid", "{text}", {"text": text})


def bare_date(value: Any) -> date:
    """A date or date-time of the TDB calendar, as TOML writes it without quotes and without UTC offset."""
    if isinstance(value, datetime) and value.tzinfo is not None:
        raise refusal(
            f"{value.isoformat()} has a UTC offset, but dates here are of the TDB calendar; "
            f"write {value.replace(tzinfo=None).isoformat()}"
        )
    if isinstance(value, date):
        return value
    unquoted = " without quotes" if isinstance(value, str) else ""
    raise refusal(
        f"must be a bare date such as 2028-11-30 or 2028-11-30T12:00:00{unquoted}, not {shown(value)}"
    )


def body_name(value: Any) -> str | int:
    """A body's name or its NAIF number."""
    if isinstance(value, str) and value.isprintable() and len(value) <= LONGEST_NAME:
        return value
    if isinstance(value, int) and not isinstance(value, bool) and abs(value) < 2**31:
        return value
    raise refusal(f'must be a body\'s name in quotes such as "mars", or its NAIF number, not {shown(value)}')


Epoch = Annotated[date | datetime, BeforeValidator(bare_date)]
BodyName = Annotated[str | int, BeforeValidator(body_name)]


class Part(BaseModel):
    """A table of the scenario file: types are taken strictly, unknown keys refused, numbers finite."""

    model_config = ConfigDict(strict=True, frozen=True, extra="forbid", allow_inf_nan=False)


class Orbit(Part):
    """A closed orbit about a body; altitudes in km above its equatorial radius."""

    periapsis_altitude_km: float = Field(ge=0, examples=["400"])
    apoapsis_altitude_km: float = Field(ge=0, examples=["400"])

    @field_validator("apoapsis_altitude_km")
    @classmethod
    def _above_periapsis(cls, value: float, info: ValidationInfo) -> float:
        periapsis = info.data.get("periapsis_altitude_km", 0.0)
        if value < periapsis:
            raise refusal(f"{value:g} is below the periapsis altitude of {periapsis:g}; swap them")
        return value


class Parking(Orbit):
    """The orbit that a mission leaves from; without an inclination its plane holds every asymptote."""

    inclination_deg: float | None = Field(default=None, ge=0, le=180)


class Capture(Part):
    """The orbit to be captured into: its apoapsis or eccentricity, and its periapsis or the cheapest one."""

    periapsis_altitude_km: float | None = Field(default=None, ge=0, examples=["400"])
    apoapsis_altitude_km: float | None = Field(default=None, ge=0, examples=["33000"])
    eccentricity: float | None = Field(default=None, ge=0, lt=1, validate_default=True, examples=["0.8"])

    @field_validator("apoapsis_altitude_km")
    @classmethod
    def _above_periapsis(cls, value: float | None, info: ValidationInfo) -> float | None:
        periapsis = info.data.get("periapsis_altitude_km")
        if value is not None and periapsis is not None and value < periapsis:
            raise refusal(f"{value:g} is below the periapsis altitude of {periapsis:g}; swap them")
        return value

    @field_validator("eccentricity")
    @classmethod
    def _one_shape(cls, value: float | None, info: ValidationInfo) -> float | None:
        if "apoapsis_altitude_km" not in info.data:
            return value
        apoapsis = info.data["apoapsis_altitude_km"]
        if value is not None and apoapsis is not None:
            raise refusal("is given beside apoapsis_altitude_km; either says the orbit's shape, give one")
        if value is None and apoapsis is None:
            raise refusal("missing; give apoapsis_altitude_km, or eccentricity (0 is a circle)")
        return value


class Flyby(Part):
    """Bounds on a flyby: least altitude (None: the body's own) and largest burn at its periapsis."""

    min_altitude_km: float | None = Field(default=None, ge=0)
    max_burn_km_s: float = Field(default=0.2, ge=0)


ORBIT_EXAMPLE = "{ periapsis_altitude_km = 400, apoapsis_altitude_km = 400 }"


class Encounter(Part):
    """A body and the dates on which the route may be there, `first` to `last` inclusive by `step_days`."""

    body: BodyName = Field(examples=['"mars"'])
    first: Epoch = Field(examples=["2028-11-30"])
    last: Epoch = Field(examples=["2029-02-28"])
    step_days: float = Field(default=1.0, gt=0, validate_default=True)
    parking: Parking | None = Field(default=None, examples=[ORBIT_EXAMPLE])
    flyby: Flyby | None = Field(default=None, examples=["{ min_altitude_km = 300 }"])
    capture: Capture | None = Field(default=None, examples=[ORBIT_EXAMPLE])

    @field_validator("last")
    @classmethod
    def _after_first(cls, value: date, info: ValidationInfo) -> date:
        first = info.data.get("first")
        if first is not None and jd_from_date(value) < jd_from_date(first):
            raise refusal(f"{value.isoformat()} is before first, {first.isoformat()}; swap them or mend one")
        return value

    @field_validator("step_days")
    @classmethod
    def _few_enough(cls, value: float, info: ValidationInfo) -> float:
        if value * DAY_S < SHORTEST_STEP_S:
            raise refusal(f"{value:g} is finer than a second; give 0.00002 or more")
        if "first" not in info.data or "last" not in info.data:
            return value
        span = jd_from_date(info.data["last"]) - jd_from_date(info.data["first"])
        if span / value >= MAX_DATES:
            raise refusal(
                f"{value:g} makes more than {MAX_DATES:,} dates of this window; "
                f"give {_rounded_up(span / MAX_DATES):g} or more, or a shorter window"
            )
        return value

    def epochs_jd(self) -> np.ndarray:
        """TDB Julian dates of the window, (n,), first to last inclusive by the step."""
        first, last = jd_from_date(self.first), jd_from_date(self.last)
        # A Julian date resolves 40 microseconds: forgive that much, so that a step of 0.1 meets `last`
        steps = math.floor((last - first + 1e-9) / self.step_days)
        return first + self.step_days * np.arange(min(steps + 1, MAX_DATES))


class Leg(Part):
    """How a leg may be flown: most whole revolutions about the Sun, and the sense of motion."""

    max_revs: int = Field(default=0, ge=0, le=MAX_REVS)
    retrograde: bool = False


class Limit(Part):
    """Bounds on a measure, in its unit; either or both."""

    min: float | None = None
    max: float | None = Field(default=None, validate_default=True)

    @field_validator("max")
    @classmethod
    def _bounds_something(cls, value: float | None, info: ValidationInfo) -> float | None:
        if "min" not in info.data:
            return value
        least = info.data["min"]
        if value is None and least is None:
            raise refusal("neither min nor max is given; give one or both, such as { max = 25 }")
        if value is not None and least is not None and value < least:
            raise refusal(f"{value:g} is below min, {least:g}; swap them")
        return value


class Rank(Part):
    """How candidates are listed; `by` None leaves the measure to the engine, `order` None to the measure."""

    by: str | None = None
    order: Literal["least", "most"] | None = None
    keep: int = Field(default=20, ge=1, le=10_000)
    apart_days: float = Field(default=10.0, ge=0)


def _rounded_up(value: float) -> float:
    """The next number of two significant digits."""
    unit = 10.0 ** (math.floor(math.log10(value)) - 1)
    return math.ceil(value / unit) * unit

"""Bodies that a scenario brings along: a NAIF number in a kernel, or osculating elements."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, TypeVar

from pydantic import Field

from porkgrid.physics.constants import AU_KM, GM_SUN_KM3_S2
from porkgrid.scenario.faults import Fault
from porkgrid.scenario.parts import Epoch, Part
from porkgrid.sky.bodies import Body
from porkgrid.sky.elements import Elements, perihelion_epoch_jd
from porkgrid.sky.epochs import jd_from_date

SUN_RADIUS_AU = 695_700.0 / AU_KM  # IAU 2015 resolution B3, nominal
FARTHEST_AU = 100_000.0  # beyond it the Galaxy's tide, not the Sun, shapes the orbit (memory)
HIGHEST_E = 1_000.0  # the interstellar comets known have 1.2 to 6.1 (memory); far more strains the formulas

T = TypeVar("T")

_ALWAYS = ("epoch", "e", "i_deg", "node_deg", "argument_deg")
_CHOICES = "a_au or q_au, mean_anomaly_deg or perihelion"
_ELEMENTS = (*_ALWAYS, "a_au", "q_au", "mean_anomaly_deg", "perihelion")


class BodySpec(Part):
    """A body of the user's own: `naif_id` (in a kernel of the scenario) or heliocentric elements.

    Elements are osculating, about the Sun, in the ecliptic and equinox of J2000, as small-body data bases
    publish them. Size: a_au or q_au. Place: mean_anomaly_deg (at `epoch`) or the date of perihelion.
    """

    naif_id: int | None = Field(default=None, ge=-(2**31), lt=2**31)
    epoch: Epoch | None = None
    a_au: float | None = Field(default=None, gt=0, le=FARTHEST_AU)
    q_au: float | None = Field(default=None, ge=SUN_RADIUS_AU, le=FARTHEST_AU)
    e: float | None = Field(default=None, ge=0, le=HIGHEST_E)
    i_deg: float | None = Field(default=None, ge=0, le=180)
    node_deg: float | None = Field(default=None, ge=-360, le=360)
    argument_deg: float | None = Field(default=None, ge=-360, le=360)
    mean_anomaly_deg: float | None = Field(default=None, ge=-360, le=360)
    perihelion: Epoch | None = None
    gm_km3_s2: float | None = Field(default=None, gt=0)
    radius_km: float | None = Field(default=None, gt=0)
    min_flyby_altitude_km: float | None = Field(default=None, ge=0)
    entry_altitude_km: float | None = Field(default=None, ge=0)


def body_of(name: str, spec: BodySpec) -> Body:
    """The body that a faultless specification describes."""
    return Body(
        name=name,
        naif_id=spec.naif_id,
        gm_km3_s2=spec.gm_km3_s2,
        radius_km=spec.radius_km,
        pole=None,
        min_flyby_altitude_km=spec.min_flyby_altitude_km,
        entry_altitude_km=spec.entry_altitude_km,
        elements=None if spec.naif_id is not None else _elements_of(spec),
    )


def combination_faults(given: Mapping[str, Any], prefix: str) -> list[Fault]:
    """Faults in which keys of a [bodies.NAME] table stand together, whether or not their values are right."""
    elements = [key for key in _ELEMENTS if key in given]
    if "naif_id" in given:
        if not elements:
            return []
        what = f"stands with elements ({', '.join(elements)}); keep one or the other"
        return [Fault(f"{prefix}naif_id", what)]
    if not elements:
        what = f"says not where the body is; give naif_id, or elements: {', '.join(_ALWAYS)}, {_CHOICES}"
        return [Fault(prefix.rstrip("."), what)]
    absent = [key for key in _ALWAYS if key not in given]
    missing = [Fault(f"{prefix}{key}", "missing; give it with the other elements") for key in absent]
    return [*missing, *_size_faults(given, prefix), *_place_faults(given, prefix)]


def _size_faults(given: Mapping[str, Any], prefix: str) -> list[Fault]:
    a_au, q_au = "a_au" in given, "q_au" in given
    if a_au and _is_open(given):
        what = "an open orbit (e of 1 or more) has no usable a_au; give q_au and perihelion instead"
        return [Fault(f"{prefix}a_au", what)]
    if a_au and q_au:
        return [Fault(f"{prefix}a_au", "stands with q_au; keep one of them")]
    if not a_au and not q_au:
        return [Fault(f"{prefix}q_au", f"missing; give q_au{'' if _is_open(given) else ' or a_au'}")]
    if a_au and _number(given["a_au"]) and _number(given.get("e")):
        q = given["a_au"] * (1.0 - given["e"])
        if 0.0 < q < SUN_RADIUS_AU:
            what = f"with this e, perihelion is at {q:.2g} au, inside the Sun ({SUN_RADIUS_AU:.2g}); mend one"
            return [Fault(f"{prefix}a_au", what)]
    return []


def _place_faults(given: Mapping[str, Any], prefix: str) -> list[Fault]:
    anomaly, perihelion = "mean_anomaly_deg" in given, "perihelion" in given
    if anomaly and _is_open(given):
        what = "an open orbit (e of 1 or more) has no mean anomaly in degrees; give perihelion, its date"
        return [Fault(f"{prefix}mean_anomaly_deg", what)]
    if anomaly and perihelion:
        return [Fault(f"{prefix}mean_anomaly_deg", "stands with perihelion; keep one of them")]
    if not anomaly and not perihelion:
        other = "" if _is_open(given) else ", or mean_anomaly_deg"
        return [Fault(f"{prefix}perihelion", f"missing; give perihelion, the date of passage{other}")]
    return []


def _elements_of(spec: BodySpec) -> Elements:
    """Perihelion form of the elements: distance and date of perihelion."""
    e, epoch_jd = _given(spec.e), jd_from_date(_given(spec.epoch))
    q_au = spec.q_au if spec.q_au is not None else _given(spec.a_au) * (1.0 - e)
    if spec.perihelion is not None:
        perihelion_jd = jd_from_date(spec.perihelion)
    else:
        anomaly_deg = _given(spec.mean_anomaly_deg)
        perihelion_jd = perihelion_epoch_jd(epoch_jd, q_au / (1.0 - e), anomaly_deg, GM_SUN_KM3_S2)
    angles = _given(spec.i_deg), _given(spec.node_deg), _given(spec.argument_deg)
    return Elements(epoch_jd, q_au, e, *angles, perihelion_jd)


def _given(value: T | None) -> T:
    assert value is not None  # combination_faults has refused the specification otherwise
    return value


def _is_open(given: Mapping[str, Any]) -> bool:
    return _number(given.get("e")) and given["e"] >= 1.0


def _number(value: Any) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool) and abs(value) < 1e300

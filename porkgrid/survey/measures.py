"""The registry of measures: every number of a cell that can be stored, limited, ranked, drawn or listed.

Adding a measure is one entry here. `{n}` in a name makes one measure per leg or per flyby. `compute` takes
the `Cells` of a grid and returns an array that broadcasts to (departure dates, arrival dates).
"""

from __future__ import annotations

import difflib
from collections.abc import Callable, Iterable, Set
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from porkgrid.physics import burns
from porkgrid.physics.constants import AU_KM
from porkgrid.sky.bodies import radius_of

if TYPE_CHECKING:
    from porkgrid.sky.bodies import Body
    from porkgrid.survey.cells import Cells, FlybyCells

# What a measure is a function of, which tells a search for flybys where to apply a limit or a cost to it.
DEPARTURE, ARRIVAL, LEG = "first leg", "last leg", "leg n"
FLYBY, EVERY_LEG, SUM, ENDS = "flyby n", "every leg", "sum over the route", "first and last date"
MASS = "masses of the route"  # applied to the flyby dates that were found, not searched by

BOTH, BY_DEPARTURE, BY_ARRIVAL = ("departure", "arrival"), ("departure",), ("arrival",)

ROUTE_FEATURES = {
    "parking": "a parking orbit: parking = { periapsis_altitude_km = …, apoapsis_altitude_km = … } "
    "in the first encounter",
    "capture": "a capture orbit: capture = { periapsis_altitude_km = …, apoapsis_altitude_km = … } "
    "in the last encounter",
    "entry": "an arrival body with an atmosphere in the body table",
    "departure pole": "a departure body with a pole in the body table",
    "arrival pole": "an arrival body with a pole in the body table",
    "mars arrival": "Mars as the arrival body",
}
MASS_FEATURES = {
    "launcher": 'a launcher: [launcher] with table = "….csv"',
    "spacecraft": "a spacecraft: [spacecraft] with isp_s = …",
    "dry mass": "dry_mass_kg in [spacecraft]",
    "propellant": "a [spacecraft] with a dry mass or a launcher, or a [stack]",
    "low orbit": "a [stack], or a [spacecraft] with a dry mass and no launcher",
    "ascent": "a stage with ascent_dv_km_s in a [stack]",
}
FEATURES = ROUTE_FEATURES | MASS_FEATURES


@dataclass(frozen=True)
class Measure:
    """A named number of a cell. `symbol` is mathtext for axes; `unit` is spelt as it is shown."""

    name: str
    unit: str
    symbol: str
    meaning: str
    compute: Callable[..., np.ndarray]
    dims: tuple[str, ...] = BOTH
    needs: tuple[str, ...] = ()
    scope: str = ENDS
    number: int = 0  # of the leg, flyby or stage
    better: str = "least"  # or "most"
    # Of a sum over the route: what its first leg and its last leg add beside the burns of its flybys
    first_leg: Callable[[Cells], np.ndarray] | None = None
    last_leg: Callable[[Cells], np.ndarray] | None = None

    @property
    def label(self) -> str:
        """Axis label: symbol and unit."""
        return self.symbol if self.unit == "1" else f"{self.symbol} ({self.unit})"


def _total(cells: Cells) -> np.ndarray:
    return cells.dv_departure + cells.dv_after_departure


def _capture_if_any(cells: Cells) -> np.ndarray:
    return np.zeros(()) if cells.capture is None else cells.dv_capture


def _flyby_altitude(flyby: FlybyCells) -> np.ndarray:
    return flyby.periapsis_km - radius_of(flyby.body)


def _flyby_turn(flyby: FlybyCells) -> np.ndarray:
    from porkgrid.physics.flyby import turn_angle

    return np.degrees(turn_angle(flyby.v_in, flyby.v_out))


def _flyby_gain(flyby: FlybyCells) -> np.ndarray:
    before = np.linalg.norm(flyby.v_in + flyby.body_velocity, axis=0)
    return np.linalg.norm(flyby.v_out + flyby.body_velocity, axis=0) - before


def _entry_speed(cells: Cells) -> np.ndarray:
    body = cells.arrival.body
    assert body.radius_km is not None
    assert body.entry_altitude_km is not None
    assert body.gm_km3_s2 is not None
    return burns.hyperbola_speed(cells.v_inf_arrival, body.radius_km + body.entry_altitude_km, body.gm_km3_s2)


def _right_ascension(cells: Cells) -> np.ndarray:
    x, y, z = cells.legs[0].v_inf_out
    axes = cells.departure_axes[..., None]  # (n, 3, 3, 1)
    along = axes[:, 0, 0] * x + axes[:, 0, 1] * y + axes[:, 0, 2] * z
    across = axes[:, 1, 0] * x + axes[:, 1, 1] * y + axes[:, 1, 2] * z
    degrees = np.degrees(np.arctan2(across, along))
    return np.where(degrees < 0.0, degrees + 360.0, degrees)


def _arrival_declination(cells: Cells) -> np.ndarray:
    x, y, z = cells.legs[-1].v_inf_in
    pole = cells.arrival_axes[:, 2, :]  # (m, 3)
    sine = (pole[:, 0] * x + pole[:, 1] * y + pole[:, 2] * z) / cells.v_inf_arrival
    return np.degrees(np.arcsin(np.clip(sine, -1.0, 1.0)))


def _arrival_phase(cells: Cells) -> np.ndarray:
    sunward = -cells.arrival.position / np.linalg.norm(cells.arrival.position, axis=0)
    x, y, z = cells.legs[-1].v_inf_in
    cosine = (sunward[0] * x + sunward[1] * y + sunward[2] * z) / cells.v_inf_arrival
    return np.degrees(np.arccos(np.clip(cosine, -1.0, 1.0)))


def _sun_distance(cells: Cells) -> np.ndarray:
    return np.linalg.norm(cells.arrival.position, axis=0) / AU_KM


def _earth_distance(cells: Cells) -> np.ndarray:
    return np.linalg.norm(cells.arrival.position - cells.earth_at_arrival, axis=0) / AU_KM


def _sun_earth_body(cells: Cells) -> np.ndarray:
    sight = cells.arrival.position - cells.earth_at_arrival
    sunward = -cells.earth_at_arrival
    across = np.linalg.norm(np.cross(sight, sunward, axis=0), axis=0)
    return np.degrees(np.arctan2(across, np.sum(sight * sunward, axis=0)))


def _mars_season(cells: Cells) -> np.ndarray:
    from porkgrid.sky.seasons import mars_ls_deg

    return mars_ls_deg(cells.arrival.position, cells.arrival.velocity, cells.arrival.jd)


def _tof(cells: Cells) -> np.ndarray:
    return cells.arrival.jd[None, :] - cells.departure.jd[:, None]


def _nearest_sun(cells: Cells) -> np.ndarray:
    return np.minimum.reduce([leg.sun_range_km[0] for leg in cells.legs]) / AU_KM


def _farthest_sun(cells: Cells) -> np.ndarray:
    return np.maximum.reduce([leg.sun_range_km[1] for leg in cells.legs]) / AU_KM


_ENTRIES = [
    Measure("departure_epoch_jd_tdb", "days", "departure (JD TDB)", "departure epoch, TDB Julian date",
            lambda c: c.departure.jd[:, None], BY_DEPARTURE),
    Measure("arrival_epoch_jd_tdb", "days", "arrival (JD TDB)", "arrival epoch, TDB Julian date",
            lambda c: c.arrival.jd, BY_ARRIVAL),
    Measure("c3_km2_s2", "km²/s²", "$C_3$", "departure energy: the excess speed squared", lambda c: c.c3,
            scope=DEPARTURE),
    Measure("v_inf_departure_km_s", "km/s", r"departure $v_\infty$", "departure excess speed",
            lambda c: c.v_inf_departure, scope=DEPARTURE),
    Measure("dla_deg", "deg", "DLA", "declination of the launch asymptote "
            "(ICRF axes at Earth, else to the body's pole)",
            lambda c: np.degrees(c.departure_declination_rad), needs=("departure pole",), scope=DEPARTURE),
    Measure("rla_deg", "deg", "RLA", "right ascension of the launch asymptote, 0 to 360 (ICRF axes at Earth, "
            "else from the node of the body's equator on the ICRF equator)",
            _right_ascension, needs=("departure pole",), scope=DEPARTURE),
    Measure("dv_departure_km_s", "km/s", r"departure $\Delta v$", "burn from the parking orbit's periapsis, "
            "with the plane change that the asymptote's declination asks of the orbit's inclination",
            lambda c: c.dv_departure, needs=("parking",), scope=DEPARTURE),
    Measure("v_inf_arrival_km_s", "km/s", r"arrival $v_\infty$", "arrival excess speed",
            lambda c: c.v_inf_arrival, scope=ARRIVAL),
    Measure("dv_capture_km_s", "km/s", r"capture $\Delta v$", "burn at the capture orbit's periapsis",
            lambda c: c.dv_capture, needs=("capture",), scope=ARRIVAL),
    Measure("capture_periapsis_altitude_km", "km", "capture periapsis altitude",
            "altitude of the capture orbit's periapsis, the cheapest where the scenario leaves it open",
            lambda c: c.capture_periapsis_km - radius_of(c.arrival.body) + 0.0 * c.v_inf_arrival,
            needs=("capture",), scope=ARRIVAL),
    Measure("entry_speed_km_s", "km/s", "entry speed", "inertial speed at the entry interface altitude",
            _entry_speed, needs=("entry",), scope=ARRIVAL),
    Measure("arrival_declination_deg", "deg", "arrival declination",
            "declination of the incoming velocity asymptote to the arrival body's equator",
            _arrival_declination, needs=("arrival pole",), scope=ARRIVAL),
    Measure("arrival_phase_deg", "deg", "arrival phase angle",
            "angle at the arrival body between the incoming velocity asymptote and the Sun", _arrival_phase,
            scope=ARRIVAL),
    Measure("arrival_sun_distance_au", "au", "Sun distance at arrival", "distance from the Sun at arrival",
            _sun_distance, BY_ARRIVAL),
    Measure("arrival_earth_distance_au", "au", "Earth distance at arrival", "distance from Earth at arrival",
            _earth_distance, BY_ARRIVAL),
    Measure("arrival_sep_deg", "deg", "Sun–Earth–body angle at arrival",
            "angle at the Earth between the Sun and the arrival body; small near solar conjunction",
            _sun_earth_body, BY_ARRIVAL),
    Measure("arrival_mars_ls_deg", "deg", r"Mars $L_s$ at arrival",
            "areocentric longitude of the Sun at arrival (0 = northern spring)",
            _mars_season, BY_ARRIVAL, ("mars arrival",)),
    Measure("tof_days", "days", "flight time", "time of flight from departure to arrival", _tof),
    Measure("dv_total_km_s", "km/s", r"total $\Delta v$", "sum of all burns that the route makes",
            _total, needs=("parking",), scope=SUM, first_leg=lambda c: c.dv_departure,
            last_leg=_capture_if_any),
    Measure("dv_spacecraft_km_s", "km/s", r"spacecraft $\Delta v$",
            "sum of the burns that the spacecraft's own engine makes: all but the departure where a launcher "
            "injects", lambda c: c.budget.spacecraft_dv_km_s, needs=("spacecraft",), scope=MASS),
    Measure("injected_mass_kg", "kg", "injected mass", "mass that the launcher injects to C3 and DLA",
            lambda c: c.budget.injected_kg, needs=("launcher",), scope=DEPARTURE, better="most"),
    Measure("delivered_mass_kg", "kg", "delivered mass", "what is left of the injected mass after the last "
            "burn, within what a full tank can push there",
            lambda c: c.budget.delivered_kg, needs=("launcher", "spacecraft"), scope=MASS, better="most"),
    Measure("mass_margin_kg", "kg", "mass margin", "delivered mass above the spacecraft's dry mass",
            lambda c: c.budget.margin_kg, needs=("launcher", "spacecraft", "dry mass"), scope=MASS,
            better="most"),
    Measure("propellant_kg", "kg", "propellant", "propellant of the spacecraft (for its dry mass where that "
            "is given), or of all stages", lambda c: c.budget.propellant_kg, needs=("propellant",),
            scope=MASS),
    Measure("low_orbit_mass_kg", "kg", "mass in low orbit", "mass in the parking orbit before departure",
            lambda c: c.budget.low_orbit_kg, needs=("low orbit",), scope=MASS),
    Measure("liftoff_mass_kg", "kg", "lift-off mass", "mass of a stack that flies the ascent too",
            lambda c: c.budget.liftoff_kg, needs=("ascent",), scope=MASS),
    Measure("sun_min_au", "au", "least Sun distance", "least distance from the Sun on the way", _nearest_sun,
            scope=EVERY_LEG),
    Measure("sun_max_au", "au", "greatest Sun distance", "greatest distance from the Sun on the way",
            _farthest_sun, scope=EVERY_LEG),
]  # fmt: skip

_LEG_ENTRIES = [
    Measure("leg{n}_tof_days", "days", "leg {n} flight time", "time of flight of leg {n}",
            lambda c, n: c.legs[n - 1].tof_days, scope=LEG),
    Measure("leg{n}_transfer_angle_deg", "deg", "leg {n} transfer angle",
            "angle swept about the Sun on leg {n}, whole revolutions left out",
            lambda c, n: np.degrees(c.legs[n - 1].transfer_angle_rad), scope=LEG),
    Measure("leg{n}_revs", "1", "leg {n} revolutions", "whole revolutions about the Sun on leg {n}",
            lambda c, n: c.legs[n - 1].revs, scope=LEG),
    Measure("leg{n}_branch", "1", "leg {n} branch",
            "which solution with revolutions: −1 left (longer period), +1 right, 0 no revolutions",
            lambda c, n: c.legs[n - 1].branch, scope=LEG),
    Measure("leg{n}_sun_min_au", "au", "leg {n} least Sun distance", "least on the arc that leg {n} flies",
            lambda c, n: c.legs[n - 1].sun_range_km[0] / AU_KM, scope=LEG),
    Measure("leg{n}_sun_max_au", "au", "leg {n} greatest Sun distance",
            "greatest on the arc that leg {n} flies",
            lambda c, n: c.legs[n - 1].sun_range_km[1] / AU_KM, scope=LEG),
]  # fmt: skip

_FLYBY_ENTRIES = [
    Measure("flyby{n}_epoch_jd_tdb", "days", "flyby {n} (JD TDB)", "epoch of flyby {n}, TDB Julian date",
            lambda c, n: c.legs[n - 1].jd2, scope=LEG),
    Measure("flyby{n}_v_inf_km_s", "km/s", r"flyby {n} $v_\infty$", "excess speed before flyby {n}",
            lambda c, n: np.linalg.norm(c.legs[n - 1].v_inf_in, axis=0), scope=LEG),
    Measure("flyby{n}_turn_deg", "deg", "flyby {n} turn angle",
            "angle by which flyby {n} turns the excess velocity",
            lambda c, n: _flyby_turn(c.flybys[n - 1]), scope=FLYBY),
    Measure("flyby{n}_altitude_km", "km", "flyby {n} altitude", "altitude of the periapsis of flyby {n}",
            lambda c, n: _flyby_altitude(c.flybys[n - 1]), scope=FLYBY),
    Measure("flyby{n}_burn_km_s", "km/s", "flyby {n} burn",
            "burn at the periapsis of flyby {n}, along the velocity",
            lambda c, n: c.flybys[n - 1].burn_km_s, scope=FLYBY),
    Measure("flyby{n}_gain_km_s", "km/s", "flyby {n} gain", "change of heliocentric speed by flyby {n}",
            lambda c, n: _flyby_gain(c.flybys[n - 1]), scope=FLYBY),
]  # fmt: skip


_STAGE_ENTRIES = [
    Measure("stage{n}_dv_km_s", "km/s", r"stage {n} $\Delta v$", "its burns and its share of the ascent",
            lambda c, n: c.budget.stage_dv_km_s(n), scope=MASS),
    Measure("stage{n}_propellant_kg", "kg", "stage {n} propellant", "propellant of stage {n}",
            lambda c, n: c.budget.stage_propellant_kg(n), scope=MASS),
]  # fmt: skip


def all_entries() -> list[Measure]:
    """Every entry of the registry, names with `{n}` unexpanded."""
    return [*_ENTRIES, *_LEG_ENTRIES, *_FLYBY_ENTRIES, *_STAGE_ENTRIES]


def features_of(
    bodies: Iterable[Body], parking: bool, capture: bool, masses: Set[str] = frozenset()
) -> frozenset[str]:
    """Features of a route (keys of `FEATURES`) that decide which measures it has; `masses`: of what flies."""
    route = list(bodies)
    first, last = route[0], route[-1]
    has = {
        "parking": parking,
        "capture": capture,
        "entry": None not in (last.entry_altitude_km, last.radius_km, last.gm_km3_s2),
        "departure pole": first.pole is not None,
        "arrival pole": last.pole is not None,
        "mars arrival": last.name == "mars",
    }
    return frozenset(name for name, present in has.items() if present) | masses


def measures_for(legs: int, features: Set[str]) -> dict[str, Measure]:
    """The measures that a route of so many legs with these features has, by name."""
    expanded = [
        *_ENTRIES,
        *(_numbered(entry, n) for n in range(1, legs + 1) for entry in _LEG_ENTRIES),
        *(_numbered(entry, n) for n in range(1, legs) for entry in _FLYBY_ENTRIES),
        *(_numbered(entry, n) for n in range(1, _stages(features) + 1) for entry in _STAGE_ENTRIES),
    ]
    return {entry.name: entry for entry in expanded if set(entry.needs) <= features}


def why_absent(name: str, legs: int, features: Set[str]) -> str:
    """Say why a route has no measure of this name, and what would be right."""
    everything = measures_for(max(legs, 9), frozenset(FEATURES) | {f"stage {n}" for n in range(1, 10)})
    known = everything.get(name)
    if known is None:
        present = measures_for(legs, features)
        near = difflib.get_close_matches(name, present, n=1, cutoff=0.4)
        hint = f"the nearest is {near[0]!r}" if near else "`porkgrid measures` lists them"
        return f"there is no measure {name!r}; {hint}"
    missing = [FEATURES[need] for need in known.needs if need not in features]
    if missing:
        return f"this route has no {name!r}; it needs {' and '.join(missing)}"
    if name.startswith("stage"):
        return f"there is no {name!r}: the stack has {_stages(features)} stages, from the lowest up"
    return f"this route has no {name!r}: it has {legs} leg{'s' if legs > 1 else ''}"


def default_rank(features: Set[str]) -> str:
    """The measure to rank by when the scenario names none: total Δv where burns are known, else C3."""
    return "dv_total_km_s" if "parking" in features else "c3_km2_s2"


def _stages(features: Set[str]) -> int:
    return sum(name.startswith("stage ") for name in features)


def _numbered(entry: Measure, n: int) -> Measure:
    compute = entry.compute
    return replace(
        entry,
        name=entry.name.format(n=n),
        symbol=entry.symbol.replace("{n}", str(n)),
        meaning=entry.meaning.format(n=n),
        number=n,
        compute=lambda cells: compute(cells, n),
    )

"""One plain sentence of answer: what one route gives against another."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, NamedTuple

_DAYS_PER_MONTH, _DAYS_PER_YEAR = 30.4375, 365.25
_TOLD = 0.1  # share by which arrival speeds must differ to be mentioned


class _Telling(NamedTuple):
    """A measure that decides between routes, and how it is said; `most`: more of it is better."""

    name: str
    pattern: str  # of a difference
    better: str
    worse: str
    same: str
    most: bool = False


# The most telling first.
_TELLING = (
    _Telling("propellant_kg", "{:,.0f} kg", "saves {} of propellant", "needs {} more propellant",
             "needs as much propellant"),
    _Telling("delivered_mass_kg", "{:,.0f} kg", "delivers {} more", "delivers {} less",
             "delivers as much", most=True),
    _Telling("low_orbit_mass_kg", "{:,.0f} kg", "saves {} in low orbit", "needs {} more in low orbit",
             "needs as much in low orbit"),
    _Telling("dv_total_km_s", "{:.2f} km/s", "saves {} of Δv", "costs {} more Δv", "costs as much Δv"),
    _Telling("c3_km2_s2", "{:.1f} km²/s²", "saves {} of C3", "needs {} more C3", "needs as much C3"),
)  # fmt: skip


def answer(name: str, route: Mapping[str, Any] | None, other: str, against: Mapping[str, Any] | None) -> str:
    """What a route gives against another: when it leaves, how long it takes, what it saves or costs.

    Both map names of measures to values, with their epochs; None for a survey that allows no dates.
    """
    name, other = _quoted(name), _quoted(other)
    if route is None or against is None:
        closed = " and ".join(each for each, dates in ((name, route), (other, against)) if dates is None)
        verb = "have" if route is None and against is None else "has"
        return f"{closed} {verb} no allowed dates: there is nothing to lay side by side."
    parts = [_leaving(route, other, against), _flight(route, against)]
    parts += _arrival(route, against) + _verdict(route, against)
    return f"{name} {_listed(parts)}{_one_sided_capture(route, other, against)}."


def answer_to(name: str, route: Mapping[str, Any] | None, baseline: str, against: Mapping[str, Any]) -> str:
    """What a route takes beyond a transfer whose dates do not count."""
    name = _quoted(name)
    if route is None:
        return f"{name} has no allowed dates: there is nothing to lay beside the {baseline}."
    flight = _flight(route, against) + (" as the" if _as_long(route, against) else " than the")
    parts = [f"{flight} {baseline}", *_arrival(route, against), *_verdict(route, against)]
    return f"{name} {_listed(parts)}."


def telling_measure(route: Mapping[str, Any], against: Mapping[str, Any]) -> str | None:
    """The most telling measure that both have a value of."""
    return next((each.name for each in _TELLING if _both(route, against, each.name)), None)


def _leaving(route: Mapping[str, Any], other: str, against: Mapping[str, Any]) -> str:
    days = route["departure_epoch_jd_tdb"] - against["departure_epoch_jd_tdb"]
    if round(days) == 0:
        return f"leaves on the same day as {other}"
    return f"leaves {_span(abs(days))} {'later' if days > 0.0 else 'earlier'} than {other}"


def _flight(route: Mapping[str, Any], against: Mapping[str, Any]) -> str:
    if _as_long(route, against):
        return "takes as long"
    days = route["tof_days"] - against["tof_days"]
    count = f"{abs(days):,.0f} day{'' if round(abs(days)) == 1 else 's'}"
    return f"takes {count} {'longer' if days > 0.0 else 'less'}"


def _arrival(route: Mapping[str, Any], against: Mapping[str, Any]) -> list[str]:
    """Say how arrival speeds differ, if they do so by more than a tenth of the other's."""
    if not _both(route, against, "v_inf_arrival_km_s"):
        return []
    speed, others = route["v_inf_arrival_km_s"], against["v_inf_arrival_km_s"]
    if abs(speed - others) <= _TOLD * others:
        return []
    return [f"arrives {abs(speed - others):.1f} km/s {'faster' if speed > others else 'slower'}"]


def _verdict(route: Mapping[str, Any], against: Mapping[str, Any]) -> list[str]:
    name = telling_measure(route, against)
    said = next((each for each in _TELLING if each.name == name), None)
    if said is None:
        return []
    gain = (route[said.name] - against[said.name]) * (1.0 if said.most else -1.0)
    amount = said.pattern.format(abs(gain))
    if amount == said.pattern.format(0.0):
        return [said.same]
    share = f" ({_percent(abs(gain) / abs(against[said.name]))})" if against[said.name] else ""
    return [(said.better if gain > 0.0 else said.worse).format(amount) + share]


def _as_long(route: Mapping[str, Any], against: Mapping[str, Any]) -> bool:
    return round(route["tof_days"] - against["tof_days"]) == 0


def _listed(parts: list[str]) -> str:
    return parts[0] if len(parts) == 1 else f"{', '.join(parts[:-1])} and {parts[-1]}"


def _quoted(name: str) -> str:
    """A name that a sentence can hold: in quotes where it has commas of its own."""
    return f"“{name}”" if "," in name else name


def _one_sided_capture(route: Mapping[str, Any], other: str, against: Mapping[str, Any]) -> str:
    """Say so where one of two routes brakes at its end: their costs then hold unlike things."""
    mine, others = (_known(each, "dv_capture_km_s") for each in (route, against))
    if mine == others or telling_measure(route, against) == "c3_km2_s2":
        return ""
    return ", its capture included" if mine else f", the capture of {other} included"


def _both(route: Mapping[str, Any], against: Mapping[str, Any], name: str) -> bool:
    return _known(route, name) and _known(against, name)


def _known(measures: Mapping[str, Any], name: str) -> bool:
    value = measures.get(name)
    return value is not None and value == value


def _span(days: float) -> str:
    if days < 60.0:
        return f"{days:.0f} day{'' if round(days) == 1 else 's'}"
    if days < 2.0 * _DAYS_PER_YEAR:
        return f"{days / _DAYS_PER_MONTH:.0f} months"
    return f"{days / _DAYS_PER_YEAR:.1f} years"


def _percent(share: float) -> str:
    return "under 1 %" if share < 0.01 else f"{100.0 * share:.0f} %"

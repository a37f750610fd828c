"""Grids that look like a porkchop, from closed formulas: two lobes with a ridge between them."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from porkgrid.survey.view import DayBests, FlagShare

MASKS = {"arrival_before_departure": 1, "plane_undefined": 2, "no_transfer": 4}
REASONS = ["arrival before departure", "transfer plane undefined", "no transfer"]


def dates(first: str, count: int, step_days: float = 1.0) -> np.ndarray:
    ms = np.round(np.arange(count) * step_days * 86_400_000).astype("timedelta64[ms]")
    return np.datetime64(first, "ms") + ms


def porkchop(
    departure: np.ndarray,
    arrival: np.ndarray,
    limits: dict[str, tuple[str, np.ndarray]] | None = None,
    c3_max: float | None = 25.0,
    **attrs: str,
) -> xr.Dataset:
    """A grid with c3, v_inf_arrival, dla, tof; `limits` adds limits: name -> (title, forbidden cells)."""
    d = (departure - np.datetime64("2028-12-01", "ms")).astype(float)[:, None] / 86_400_000
    tof = (arrival[None, :] - departure[:, None]).astype(float) / 86_400_000
    season = (d + 390.0) % 780.0 - 390.0
    long_way = 8.9 + ((season + 2) / 16.0) ** 2 + ((tof - 310 + 0.35 * season) / 30.0) ** 2
    short_way = 9.6 + ((season - 4) / 15.0) ** 2 + ((tof - 205 + 0.45 * season) / 22.0) ** 2
    ridge = 400.0 * np.exp(-(((tof - 256 + 0.5 * season) / 9.0) ** 2))
    c3 = np.minimum(long_way, short_way) + ridge
    v_inf = 2.6 + np.abs(tof - 290 + 0.3 * season) / 60.0 + ridge / 200.0
    dla = 12.0 + 0.35 * season + 0.05 * (tof - 260)
    c3[tof <= 0] = v_inf[tof <= 0] = dla[tof <= 0] = np.nan

    flags = [(name, title, np.zeros(c3.shape, bool)) for name, title in zip(MASKS, REASONS, strict=True)]
    flags[0] = (*flags[0][:2], tof <= 0)
    if c3_max is not None:
        flags.append(("c3_km2_s2", f"C3 at most {c3_max:g} km²/s²", ~(c3 <= c3_max)))
    flags += [(name, title, forbidden) for name, (title, forbidden) in (limits or {}).items()]
    bits = sum(np.where(bad, np.uint32(1 << i), np.uint32(0)) for i, (_, _, bad) in enumerate(flags))
    bits = np.where(tof <= 0, np.uint32(1), bits).astype(np.uint32)

    both = ("departure", "arrival")

    def measure(values: np.ndarray, unit: str, symbol: str, meaning: str) -> tuple:
        return both, values.astype(np.float32), {"units": unit, "symbol": symbol, "long_name": meaning}

    return xr.Dataset(
        {
            "c3_km2_s2": measure(c3, "km²/s²", "$C_3$", "departure energy"),
            "v_inf_arrival_km_s": measure(v_inf, "km/s", r"arrival $v_\infty$", "arrival excess speed"),
            "dla_deg": measure(dla, "deg", "DLA", "declination of the launch asymptote"),
            "tof_days": measure(tof, "days", "flight time", "time of flight"),
            "arrival_mars_ls_deg": (
                ("arrival",),
                ((np.arange(arrival.size) * 0.9 + 200) % 360).astype(np.float32),
                {"units": "deg", "symbol": r"Mars $L_s$ at arrival", "long_name": "season"},
            ),
            "blocked_by": (
                both,
                bits,
                {
                    "flag_masks": [1 << i for i in range(len(flags))],
                    "flag_meanings": " ".join(name for name, _, _ in flags),
                    "flag_titles": [title for _, title, _ in flags],
                },
            ),
        },
        coords={"departure": departure, "arrival": arrival},
        attrs={
            "title": "Tern relay to Mars, 2028",
            "route": "Earth → Mars",
            "rank_by": "c3_km2_s2",
            "rank_order": "least",
            "kernel": "DE440",
            "porkgrid": "0.1.0",
            "caution": "Patched conics for early design: confirm a date with a full-force run before use.",
            **attrs,
        },
    )


def usual(n: int = 124, m: int = 335, **changes: object) -> xr.Dataset:
    """The survey of the scenario in the design page, with three limits."""
    departure, arrival = dates("2028-10-01", n, 150 / n), dates("2029-04-01", m, 400 / m)
    free = porkchop(departure, arrival)
    dla, tof = free["dla_deg"].values, free["tof_days"].values
    limits = {
        "dla_deg": ("DLA from −28.5 to 28.5 deg", np.abs(dla) > 28.5),
        "tof_days": ("flight time at most 340 days", tof > 340),
    }
    return porkchop(departure, arrival, **{"limits": limits, **changes})  # type: ignore[arg-type]


def with_flyby_dates(first: str = "2028-12-20", days_apart: float = 0.4) -> xr.Dataset:
    """The usual survey with the epoch of a flyby that is later for later arrivals, as a Julian date."""
    view = usual()
    row = np.arange(view.sizes["departure"])[:, None] * 0.1
    column = np.arange(view.sizes["arrival"])[None, :] * days_apart
    jd = 2_440_587.5 + np.datetime64(first, "D").astype(float) + row + column
    attrs = {"units": "days", "symbol": "flyby 1 (JD TDB)", "long_name": "epoch of flyby 1"}
    return view.assign(flyby1_epoch_jd_tdb=(("departure", "arrival"), jd, attrs))


def bests_of(view: xr.Dataset, of: str, order: str = "least") -> DayBests:
    values = np.broadcast_to(
        view[of].values if view[of].ndim == 2 else view[of].values[None, :], view["blocked_by"].shape
    )
    sign = 1.0 if order == "least" else -1.0
    worse = np.where((view["blocked_by"].values == 0) & np.isfinite(values), sign * values, np.inf)

    def best(axis: int) -> np.ndarray:
        least = worse.min(axis=axis)
        return np.where(np.isfinite(least), sign * least, np.nan)

    return DayBests(view["departure"].values, best(1), view["arrival"].values, best(0))


def candidates_of(view: xr.Dataset, of: str, keep: int, apart_days: float = 10.0) -> pd.DataFrame:
    """The best allowed cells, kept apart, as a survey's candidates table."""
    values = np.where(view["blocked_by"].values == 0, view[of].values, np.nan)
    departure, arrival = view["departure"].values, view["arrival"].values
    apart = np.timedelta64(round(apart_days * 86_400_000), "ms")
    rows: list[dict] = []
    while len(rows) < keep and np.isfinite(values).any():
        i, j = np.unravel_index(np.nanargmin(values), values.shape)
        when = {"departure": _iso(departure[i]), "arrival": _iso(arrival[j])}
        rows.append({"rank": len(rows) + 1, **when, of: float(values[i, j])})
        near = np.ix_(abs(departure - departure[i]) < apart, abs(arrival - arrival[j]) < apart)
        values[near] = np.nan
    return pd.DataFrame(rows, columns=["rank", "departure", "arrival", of])


def _iso(date: np.datetime64) -> str:
    return str(date.astype("datetime64[m]")).removesuffix("T00:00")


def shares_of(view: xr.Dataset) -> list[FlagShare]:
    bits, attrs = view["blocked_by"].values, view["blocked_by"].attrs
    return [
        FlagShare(title, float(np.mean((bits & mask) != 0)), float(np.mean(bits == mask)))
        for title, mask in zip(attrs["flag_titles"], attrs["flag_masks"], strict=True)
    ]


C3 = "c3_km2_s2"
HOSTILE = r"$\frac{x}_^$ <b>& 50% \alpha_{1} ^^ $$ #{} ~ `' \\ $"


def many_limits(count: int) -> xr.Dataset:
    departure, arrival = dates("2028-10-01", 124), dates("2029-04-01", 335)
    free = porkchop(departure, arrival)
    rng = np.random.default_rng(3)
    slopes = rng.normal(size=(count, 2))
    tilt, length = (free["dla_deg"].values - 10.0) / 20.0, (free["tof_days"].values - 250.0) / 80.0
    limits = {
        f"limit{k}": (
            f"limited quantity number {k + 1} of the outer kind at most {k * 3.5:g} km/s",
            a * tilt + b * length > 1.1 + 0.05 * k,
        )
        for k, (a, b) in enumerate(slopes)
    }
    return porkchop(departure, arrival, limits=limits)


def fifteen_years() -> xr.Dataset:
    departure, arrival = dates("2028-01-01", 548, 10.0), dates("2028-06-01", 584, 10.0)
    tof = porkchop(departure, arrival)["tof_days"].values
    limits = {"tof_days": ("flight time 100 to 400 days", (tof < 100) | (tof > 400))}
    return porkchop(departure, arrival, limits=limits)


def with_delivered_mass() -> xr.Dataset:
    view = usual()
    mass = (3000 - 20 * view[C3].values).astype(np.float32)
    attrs = {"units": "kg", "symbol": "delivered mass", "long_name": "mass after capture"}
    view["delivered_mass_kg"] = (("departure", "arrival"), mass, attrs)
    return view.assign_attrs(rank_by="delivered_mass_kg", rank_order="most")


def filled(value: float) -> xr.Dataset:
    view = usual()
    view[C3] = view[C3].copy(data=np.full(view[C3].shape, value, dtype=np.float32))
    return view


LONG_WORDS = {
    "title": "A scenario with a very long name that goes on and on without an end " * 4,
    "route": "Earth → Venus → Earth → Earth → Jupiter → Saturn → a body with a long name " * 2,
    "caution": "Patched conics only, with a very long caution sentence that keeps going. " * 6,
}

# name -> (grid, candidates kept, days apart, lines)
CASES: dict[str, tuple[Callable[[], xr.Dataset], int, float, str | None]] = {
    "three limits": (usual, 12, 10, "v_inf_arrival_km_s"),
    "a cluster of twenty": (usual, 20, 1, "v_inf_arrival_km_s"),
    "no candidates": (usual, 0, 10, "tof_days"),
    "five limits": (lambda: many_limits(4), 12, 10, "tof_days"),
    "thirteen limits": (lambda: many_limits(12), 8, 10, "dla_deg"),
    "one departure date": (lambda: porkchop(dates("2028-12-01", 1), dates("2029-04-01", 335)), 5, 10, None),
    "one arrival date": (lambda: porkchop(dates("2028-10-01", 124), dates("2029-10-04", 1)), 5, 10, C3),
    "one cell": (lambda: porkchop(dates("2028-12-01", 1), dates("2029-10-04", 1)), 1, 1, C3),
    "two by two": (lambda: porkchop(dates("2028-11-30", 2), dates("2029-10-04", 2)), 4, 1, C3),
    "steps of three hours": (
        lambda: porkchop(dates("2028-12-01", 12, 1 / 8), dates("2029-10-04", 20, 1 / 8), c3_max=8.95),
        6,
        0.5,
        "v_inf_arrival_km_s",
    ),
    "all forbidden": (lambda: usual(c3_max=5), 5, 5, "v_inf_arrival_km_s"),
    "all allowed": (
        lambda: porkchop(dates("2028-10-01", 124), dates("2029-04-01", 335), c3_max=None),
        10,
        20,
        "arrival_mars_ls_deg",
    ),
    "fifteen years": (fifteen_years, 20, 30, None),
    "arrival before departure": (
        lambda: porkchop(dates("2028-10-01", 300), dates("2028-12-01", 300)),
        6,
        10,
        "v_inf_arrival_km_s",
    ),
    "constant": (lambda: filled(12.5), 3, 10, C3),
    "no values": (lambda: filled(np.nan), 3, 10, "v_inf_arrival_km_s"),
    "hostile words": (lambda: usual(title=HOSTILE, route=HOSTILE, caution=HOSTILE), 3, 10, "dla_deg"),
    "long words": (lambda: many_limits(9).assign_attrs(**LONG_WORDS), 20, 2, "v_inf_arrival_km_s"),
    "coarse": (lambda: usual(12, 20), 6, 10, "v_inf_arrival_km_s"),
}

_MORE = ("five limits", "one arrival date", "two by two", "constant", "coarse", "arrival before departure")
EVERY_CASE = [pytest.param(name, marks=[pytest.mark.slow] * (name in _MORE)) for name in CASES]

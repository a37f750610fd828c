"""Missions that flew: published encounter dates in, published closest approach out.

Patched conics on DE440: a Lambert leg between every two dates, and at the body between them the one
periapsis that turns the first leg into the second. Dates (UTC) and closest approaches are those of the
agencies' mission pages and press kits. 5 % of the periapsis radius is allowed, for the small corrections that
were flown and for the planets' pull on the legs.
"""

import numpy as np
import pytest

from porkgrid.physics.constants import DAY_S, GM_SUN_KM3_S2
from porkgrid.physics.flyby import burn, periapsis_radius
from porkgrid.physics.lambert import lambert
from porkgrid.scenario.parts import Flyby
from porkgrid.sky.bodies import BODIES
from porkgrid.sky.epochs import jd_tdb_from_utc
from porkgrid.sky.kernel import open_ephemeris

MARINER_10 = [
    ("earth", "1973-11-03T05:45"),
    ("venus", "1974-02-05T17:01"),
    ("mercury", "1974-03-29T20:47"),
]
GALILEO = [
    ("earth", "1989-10-18"),
    ("venus", "1990-02-10T06:00"),
    ("earth", "1990-12-08T20:35"),
]
VOYAGER_1 = [
    ("earth", "1977-09-05T12:56"),
    ("jupiter", "1979-03-05T12:05"),
    ("saturn", "1980-11-12T23:46"),
]
VOYAGER_2 = [
    ("earth", "1977-08-20T14:29"),
    ("jupiter", "1979-07-09T22:29"),
    ("saturn", "1981-08-26T03:24"),
    ("uranus", "1986-01-24T17:59"),
    ("neptune", "1989-08-25T03:56"),
]
VENUS_KM = BODIES["venus"].radius_km

FLOWN = {
    # mission: encounters, radius of closest approach to each flyby body, km
    "Mariner 10": (MARINER_10, [VENUS_KM + 5768.0]),
    "Galileo": (GALILEO, [VENUS_KM + 16_000.0]),
    "Voyager 1": (VOYAGER_1, [348_890.0]),
    "Voyager 2": (VOYAGER_2, [721_670.0, 161_000.0, 107_000.0]),
}


def flybys(encounters):
    """Return v∞ in and out (3, n) and GM (n,) of the n flybys between the first date and the last."""
    jd = np.array([jd_tdb_from_utc(utc) for _, utc in encounters])
    bodies = [BODIES[name] for name, _ in encounters]
    ephemeris = open_ephemeris()
    states = [ephemeris.states(body, [date]) for body, date in zip(bodies, jd, strict=True)]
    r, v = (np.hstack(column).T for column in zip(*states, strict=True))
    leaving, arriving = lambert(r[:-1], r[1:], np.diff(jd) * DAY_S, GM_SUN_KM3_S2)
    gm = np.array([body.gm_km3_s2 for body in bodies[1:-1]])
    return (arriving[:-1] - v[1:-1]).T, (leaving[1:] - v[1:-1]).T, gm


@pytest.mark.parametrize("mission", FLOWN)
def test_the_published_dates_give_the_published_closest_approach(mission):
    encounters, published = FLOWN[mission]
    found = periapsis_radius(*flybys(encounters))
    assert found == pytest.approx(published, rel=0.05)


@pytest.mark.parametrize("mission", FLOWN)
def test_what_flew_all_but_unpowered_needs_less_than_the_burn_that_a_scenario_allows_by_default(mission):
    """Corrections of some 10 m/s apart, none of them burned at closest approach (memory)."""
    default_max_burn_km_s = Flyby.model_fields["max_burn_km_s"].default
    assert np.all(burn(*flybys(FLOWN[mission][0])) < default_max_burn_km_s)


@pytest.mark.parametrize("venus", ["1974-02-03T17:01", "1974-02-07T17:01"])
def test_two_days_off_at_venus_is_not_mariner_10s_flight(venus):
    """The 5 % tell the dates that flew from others."""
    earth, _, mercury = MARINER_10
    found = periapsis_radius(*flybys([earth, ("venus", venus), mercury]))
    assert found != pytest.approx(FLOWN["Mariner 10"][1], rel=0.05)

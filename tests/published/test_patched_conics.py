"""Textbook examples of departures and captures.

Values from Curtis, Orbital Mechanics for Engineering Students (memory), chapter 8; he uses mean radii of the
planets' orbits and GM rounded to six digits, so that his are used here too.
"""

import math
from datetime import date

import numpy as np
import pytest
from scipy.optimize import brentq, minimize_scalar

from porkgrid import lambert
from porkgrid.physics.burns import apsis_burn, cheapest_periapsis, shape_burn
from porkgrid.physics.constants import GM_SUN_KM3_S2
from porkgrid.sky.bodies import find_body
from porkgrid.sky.epochs import jd_from_date
from porkgrid.sky.kernel import open_ephemeris
from porkgrid.sky.states import state_table
from porkgrid.survey.legs import LegOption, solve_leg

GM_SUN, GM_EARTH, GM_MARS = 1.327e11, 398_600.0, 42_830.0
EARTH_ORBIT_KM, MARS_ORBIT_KM = 149.6e6, 227.9e6
EARTH_KM, MARS_KM = 6378.0, 3380.0


def hohmann_flight(short_of_180_deg=1e-6):
    """r1, r2, time of flight and circular velocities of a transfer just short of half a turn.

    At 180° itself the plane is undefined; a millionth of a degree off, the speeds change by 1e-8.
    """
    angle = math.radians(180.0 - short_of_180_deg)
    r1 = np.array([EARTH_ORBIT_KM, 0.0, 0.0])
    r2 = MARS_ORBIT_KM * np.array([math.cos(angle), math.sin(angle), 0.0])
    tof = math.pi * math.sqrt(((EARTH_ORBIT_KM + MARS_ORBIT_KM) / 2.0) ** 3 / GM_SUN)
    east1, east2 = np.array([0.0, 1.0, 0.0]), np.array([-math.sin(angle), math.cos(angle), 0.0])
    return (
        r1,
        r2,
        tof,
        *(math.sqrt(GM_SUN / r) * east for r, east in ((EARTH_ORBIT_KM, east1), (MARS_ORBIT_KM, east2))),
    )


def test_example_8_4_leaving_earth_for_mars_on_the_hohmann_ellipse():
    """v∞ 2.943 km/s; departure from a 300 km circular orbit 3.590 km/s."""
    r1, r2, tof, earth, _ = hohmann_flight()
    v1, _ = lambert(r1, r2, tof, GM_SUN, pole=(0.0, 0.0, 1.0))
    v_inf = float(np.linalg.norm(v1 - earth))
    assert v_inf == pytest.approx(2.943, abs=0.0006)
    radius = EARTH_KM + 300.0
    assert float(apsis_burn(v_inf, radius, radius, GM_EARTH)) == pytest.approx(3.590, abs=0.0006)


def test_example_8_5_arriving_at_mars_with_the_best_periapsis_for_a_7_hour_orbit():
    """Approach v∞ 2.648 km/s. The periapsis that captures for least into an ellipse of given shape, if the
    shape makes it an orbit of 7 h: radius 5447 km, capture 1.470 km/s.
    """
    r1, r2, tof, _, mars = hohmann_flight()
    _, v2 = lambert(r1, r2, tof, GM_SUN, pole=(0.0, 0.0, 1.0))
    v_inf = float(np.linalg.norm(v2 - mars))
    assert v_inf == pytest.approx(2.648, abs=0.0006)

    def burn(periapsis, e):
        return float(apsis_burn(v_inf, periapsis, periapsis * (1.0 + e) / (1.0 - e), GM_MARS))

    def best_periapsis(e):
        return minimize_scalar(burn, bounds=(500.0, 60_000.0), args=(e,), options={"xatol": 1e-3}).x

    def hours(e):
        axis = best_periapsis(e) / (1.0 - e)
        return 2.0 * math.pi * math.sqrt(axis**3 / GM_MARS) / 3600.0

    e = brentq(lambda e: hours(e) - 7.0, 0.05, 0.9)
    assert best_periapsis(e) == pytest.approx(5447.0, abs=10.0)  # a hundredth of an hour is 8 km
    assert burn(best_periapsis(e), e) == pytest.approx(1.470, abs=0.0006)


def test_example_8_5_by_the_closed_form_of_the_best_periapsis():
    """v∞ 2.648 km/s, 7 h: radius 5447 km, capture 1.470 km/s. With r = a(1 − e) the closed form fixes the
    shape by the period alone: 1 + e = 2 gm/(a v∞²).
    """
    axis = (GM_MARS * (7.0 * 3600.0 / (2.0 * math.pi)) ** 2) ** (1.0 / 3.0)
    e = 2.0 * GM_MARS / (axis * 2.648**2) - 1.0
    radius = cheapest_periapsis(2.648, e, GM_MARS)
    assert float(radius) == pytest.approx(5447.0, abs=10.0)  # a hundredth of an hour is 8 km
    assert float(radius) == pytest.approx(axis * (1.0 - e), rel=1e-12)
    assert float(shape_burn(2.648, radius, e, GM_MARS)) == pytest.approx(1.470, abs=0.0006)


def test_example_8_8_earth_1996_11_07_to_mars_1997_09_12():
    """v∞ 3.165 km/s out, 2.885 km/s in; ±0.02, for his planets move on mean elements and ours as in DE440."""
    ephemeris = open_ephemeris()
    tables = [
        state_table(ephemeris, find_body(name, {}), [jd_from_date(day)])
        for name, day in (("earth", date(1996, 11, 7)), ("mars", date(1997, 9, 12)))
    ]
    leg = solve_leg(*tables, LegOption())
    assert np.linalg.norm(leg.v_inf_out) == pytest.approx(3.165, abs=0.02)
    assert np.linalg.norm(leg.v_inf_in) == pytest.approx(2.885, abs=0.02)


def test_a_hohmann_flight_to_mars_takes_259_days():
    """Practice; from the radii above 258.8 days. It is the longest of the ways that leave along the orbit."""
    _, _, tof, earth, _ = hohmann_flight()
    assert tof / 86_400.0 == pytest.approx(259.0, abs=0.5)
    assert np.linalg.norm(earth) == pytest.approx(math.sqrt(GM_SUN / EARTH_ORBIT_KM))
    assert pytest.approx(GM_SUN_KM3_S2, rel=1e-3) == GM_SUN

"""The season on Mars."""

import datetime as dt

import numpy as np
import pytest

from porkgrid.sky.bodies import BODIES, pole_axes
from porkgrid.sky.epochs import jd_from_date
from porkgrid.sky.kernel import open_ephemeris
from porkgrid.sky.seasons import mars_ls_deg


def ls_on(jd):
    position, velocity = open_ephemeris().states(BODIES["mars"], jd)
    return mars_ls_deg(position, velocity, jd)


# First days of Mars years 36, 37 and 38: calendar of Clancy and others (2000), tabulated by Piqueux and
# others (2015) (memory).
@pytest.mark.parametrize("first_day", [dt.date(2021, 2, 7), dt.date(2022, 12, 26), dt.date(2024, 11, 12)])
def test_a_mars_year_starts_on_the_day_of_the_calendar(first_day):
    midnight = jd_from_date(first_day)
    before, after = ls_on(np.array([midnight, midnight + 1.0]))
    assert before > 359.0
    assert after < 1.0


def test_ls_rises_by_a_full_turn_in_a_mars_year_and_fastest_near_perihelion():
    dates = jd_from_date(dt.date(2021, 2, 7)) + np.arange(1.0, 680.0)
    ls = ls_on(dates)
    rise = np.diff(ls)
    assert (rise > 0.0).all()
    # Mars passes perihelion at Ls = 251 degrees (memory; Allison and McEwen 2000).
    assert ls[np.argmax(rise)] == pytest.approx(251.0, abs=3.0)


def test_the_pole_precesses_about_the_orbit_at_the_measured_rate():
    # 7594 milliarcseconds a year, backwards (Konopliv and others 2006; memory).
    years = 100.0
    dates = 2451545.0 + np.array([0.0, years * 365.25])
    poles = pole_axes(BODIES["mars"], dates)[:, 2]
    position, velocity = open_ephemeris().states(BODIES["mars"], dates)
    normal = np.cross(position[:, 0], velocity[:, 0])
    normal /= np.linalg.norm(normal)
    backwards = -np.radians(7.594 * years / 3600.0) * np.cross(normal, poles[0])
    moved = poles[1] - poles[0]
    assert np.linalg.norm(moved - backwards) <= 0.03 * np.linalg.norm(backwards)

"""What the Earth sees of a flight: distances, the angle to the Sun, and conjunctions."""

from __future__ import annotations

import datetime as dt

import numpy as np
import pytest

from porkgrid.physics.constants import AU_KM
from porkgrid.sky.bodies import find_body
from porkgrid.sky.epochs import jd_from_date
from porkgrid.sky.kernel import open_ephemeris
from porkgrid.survey.sightlines import Sightlines, conjunctions, sightlines

THREE_DEG = np.radians(3.0)


def seen_of(body: str, first: dt.date, days: int) -> Sightlines:
    """A body of the kernel as a spacecraft would be seen that stays with it."""
    ephemeris = open_ephemeris()
    jd = jd_from_date(first) + np.arange(0.0, days, 0.5)
    position, _ = ephemeris.states(find_body(body, {}), jd)
    return sightlines(ephemeris, jd, position.T)


@pytest.mark.parametrize(
    ("first", "conjunction"),
    [
        # Solar conjunctions of Mars, as the agencies gave them out to their Mars missions (memory)
        (dt.date(2019, 5, 1), dt.date(2019, 9, 2)),
        (dt.date(2021, 6, 1), dt.date(2021, 10, 8)),
        (dt.date(2023, 7, 1), dt.date(2023, 11, 18)),
    ],
)
def test_mars_goes_behind_the_sun_when_it_did(first: dt.date, conjunction: dt.date) -> None:
    (found,) = conjunctions(seen_of("mars", first, 250), THREE_DEG)
    assert found.beyond
    # Conjunction in longitude and least angle are up to a day apart
    assert found.least_jd == pytest.approx(jd_from_date(conjunction), abs=1.5)
    assert found.first_jd < found.least_jd < found.last_jd


def test_venus_passed_this_side_of_the_sun_in_its_transit() -> None:
    # Transit of Venus: 2012-06-06, middle 01:29 UT, least separation of the centres 554 arcseconds (memory;
    # from the Earth's centre and with light time, which the geometry here leaves out)
    (found,) = conjunctions(seen_of("venus", dt.date(2012, 5, 20), 40), THREE_DEG)
    assert not found.beyond
    assert found.least_jd == pytest.approx(jd_from_date(dt.datetime(2012, 6, 6, 1, 29)), abs=0.5)
    assert np.degrees(found.least_rad) * 3600.0 < 1200.0


def test_distances_and_angle_are_those_of_the_triangle() -> None:
    seen = seen_of("jupiter", dt.date(2030, 1, 1), 400)
    sides = seen.earth_sun_km, seen.earth_km, seen.sun_km
    a, b, c = (side / AU_KM for side in sides)
    assert np.allclose(np.cos(seen.angle_rad), (a * a + b * b - c * c) / (2.0 * a * b), atol=1e-12)


def made(angles_deg: list[float], earth_au: float = 2.0) -> Sightlines:
    """A flight with these angles, one a day."""
    k = len(angles_deg)
    far, own = np.full(k, earth_au * AU_KM), np.full(k, AU_KM)
    return Sightlines(2.4e6 + np.arange(k), far, far, np.radians(angles_deg), own)


def test_a_stretch_begins_and_ends_where_the_angle_crosses_the_bound() -> None:
    (found,) = conjunctions(made([5.0, 4.0, 2.0, 1.0, 2.0, 4.0, 5.0]), THREE_DEG)
    assert (found.first_jd, found.last_jd) == pytest.approx((2.4e6 + 1.5, 2.4e6 + 4.5), abs=1e-6)
    assert found.least_jd == 2.4e6 + 3
    assert np.degrees(found.least_rad) == pytest.approx(1.0)


def test_stretches_at_the_ends_of_a_flight_and_beside_a_gap_are_cut_there() -> None:
    found = conjunctions(made([1.0, 5.0, 2.0, float("nan"), 2.0, 5.0, 1.0]), THREE_DEG)
    spans = [(each.first_jd - 2.4e6, each.last_jd - 2.4e6) for each in found]
    expected = [(0.0, 0.5), (1.0 + 2.0 / 3.0, 2.0), (4.0, 4.0 + 1.0 / 3.0), (5.5, 6.0)]
    assert np.allclose(spans, expected, atol=1e-6)


def test_a_flight_that_stays_clear_has_none() -> None:
    assert conjunctions(made([5.0, 3.0, 4.0]), THREE_DEG) == []


def test_no_angle_is_given_where_the_spacecraft_is_at_the_earth() -> None:
    ephemeris = open_ephemeris()
    jd = jd_from_date(dt.date(2030, 1, 1)) + np.arange(3.0)
    earth, _ = ephemeris.states(find_body("earth", {}), jd)
    away = np.array([0.0, 0.005, 0.02])[:, None] * AU_KM * np.array([1.0, 0.0, 0.0])
    assert np.isnan(sightlines(ephemeris, jd, earth.T + away).angle_rad).tolist() == [True, True, False]

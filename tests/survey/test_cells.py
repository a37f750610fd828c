"""What cells know before measures: energies, speeds, asymptotes and the axes they are given in."""

import numpy as np
import pytest

from porkgrid.physics.lambert import FLOWN, NO_TRANSFER, NOT_AFTER
from porkgrid.survey.cells import Cells


def declination_to(pole, vector):
    return np.arcsin(np.dot(pole, vector) / np.linalg.norm(vector))


def test_the_energy_is_the_square_of_the_excess_speed(rook_cells):
    flown = rook_cells.status == FLOWN
    np.testing.assert_allclose(rook_cells.c3[flown], rook_cells.v_inf_departure[flown] ** 2, rtol=1e-14)
    speed = np.linalg.norm(rook_cells.legs[0].v_inf_in, axis=0)
    np.testing.assert_allclose(rook_cells.v_inf_arrival[flown], speed[flown], rtol=1e-14)


def test_at_the_earth_declinations_are_in_the_icrf_axes(rook_cells):
    v = rook_cells.legs[0].v_inf_out[:, 10, 30]
    expected = declination_to([0.0, 0.0, 1.0], v)
    assert rook_cells.departure_declination_rad[10, 30] == pytest.approx(expected, abs=1e-14)


def test_at_mars_declinations_are_to_the_pole_of_mars(petrel_cells):
    """Pole at J2000 from the IAU report (Archinal and others 2011); it moves 0.04° by 2033."""
    ra, dec = np.radians([317.68143, 52.88650])
    pole = [np.cos(dec) * np.cos(ra), np.cos(dec) * np.sin(ra), np.sin(dec)]
    for cell in [(0, 10), (7, 15), (13, 19)]:
        v = petrel_cells.legs[0].v_inf_out[:, *cell]
        found = petrel_cells.departure_declination_rad[cell]
        assert found == pytest.approx(declination_to(pole, v), abs=np.radians(0.05))
        assert abs(found - declination_to([0.0, 0.0, 1.0], v)) > np.radians(1.0)


def test_axes_are_given_for_every_date_of_their_own_end(petrel_cells):
    n, m = petrel_cells.c3.shape
    assert n != m
    assert petrel_cells.departure_axes.shape == (n, 3, 3)
    assert petrel_cells.arrival_axes.shape == (m, 3, 3)
    np.testing.assert_allclose(petrel_cells.arrival_axes[5], np.eye(3), atol=1e-15)  # of the Earth


def test_a_route_is_flown_where_every_leg_is_and_else_says_why_not(rook_cells):
    leg = rook_cells.legs[0]
    worse = type(leg)(**{**vars_of(leg), "status": np.where(leg.tof_days > 400.0, NO_TRANSFER, FLOWN)})
    both = Cells(rook_cells.departure, rook_cells.arrival, rook_cells.earth_at_arrival, [leg, worse])
    assert np.all(both.status[leg.tof_days > 400.0] == NO_TRANSFER)
    assert np.all(both.status[leg.tof_days <= 0.0] == NOT_AFTER)
    assert np.all(both.status[(leg.tof_days > 0.0) & (leg.tof_days <= 400.0)] == FLOWN)


def vars_of(leg):
    return {name: getattr(leg, name) for name in leg.__dataclass_fields__}

"""Hohmann and bi-elliptic transfers against published numbers."""

import numpy as np
import pytest
from scipy.optimize import brentq

from porkgrid.physics.burns import apsis_burn
from porkgrid.physics.transfers import bielliptic, hohmann

FAR = 1e9  # radii of the inner circle: a parabola, to nine digits


def gain(ratio: float, stretch: float) -> float:
    """What the bi-elliptic by way of r2 · stretch saves against Hohmann between circles 1 and r2 = ratio."""
    return float(
        hohmann(1.0, ratio, 1.0).total_km_s - bielliptic(1.0, ratio, ratio * stretch, 1.0).total_km_s
    )


def test_curtis_example_8_4_from_earth_to_mars_on_the_hohmann_ellipse():
    """Curtis, Orbital Mechanics for Engineering Students, ex. 8.4 (memory): v∞ 2.943 km/s, departure from
    300 km 3.590 km/s. His radii and GM.
    """
    flight = hohmann(149.6e6, 227.9e6, 1.327e11)
    assert float(flight.departure_km_s) == pytest.approx(2.943, abs=0.0006)
    radius = 6378.0 + 300.0
    assert float(apsis_burn(flight.departure_km_s, radius, radius, 398_600.0)) == pytest.approx(
        3.590, abs=0.0006
    )


def test_curtis_example_8_5_arrives_at_mars_at_2_648_km_s():
    """Curtis, ex. 8.5 (memory)."""
    assert float(hohmann(149.6e6, 227.9e6, 1.327e11).arrival_km_s) == pytest.approx(2.648, abs=0.0006)


def test_a_hohmann_flight_to_mars_takes_259_days():
    """Practice."""
    assert float(hohmann(149.6e6, 227.9e6, 1.327e11).tof_s) / 86_400.0 == pytest.approx(259.0, abs=0.5)


def test_the_bielliptic_begins_to_pay_at_a_ratio_of_11_94():
    """Orbital mechanics texts (memory): never better under 11.94. There it pays only by way of infinity."""
    assert brentq(lambda ratio: gain(ratio, FAR), 5.0, 15.0) == pytest.approx(11.94, abs=0.005)


def test_the_bielliptic_always_pays_above_a_ratio_of_15_58():
    """Orbital mechanics texts (memory): above 15.58 any radius past the target's will do."""
    assert brentq(lambda ratio: gain(ratio, 1.0 + 1e-5), 12.0, 20.0) == pytest.approx(15.58, abs=0.005)


@pytest.mark.parametrize("ratio", [1.5, 5.0, 11.9])
def test_under_the_lower_ratio_no_mid_radius_pays(ratio):
    assert all(gain(ratio, stretch) < 0.0 for stretch in 1.0 + np.geomspace(1e-4, FAR, 200))


@pytest.mark.parametrize("ratio", [15.62, 30.0, 200.0])
def test_above_the_upper_ratio_every_mid_radius_pays(ratio):
    assert all(gain(ratio, stretch) > 0.0 for stretch in 1.0 + np.geomspace(1e-4, FAR, 200))

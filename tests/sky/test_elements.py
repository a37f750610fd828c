"""Small bodies placed from osculating elements."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from porkgrid.physics.conics import icrf_to_ecliptic
from porkgrid.physics.constants import AU_KM, DAY_S, GM_SUN_KM3_S2
from porkgrid.sky.elements import Elements, elements_states, perihelion_epoch_jd

EPOCH_JD = 2462000.5
ELEMENTS = st.builds(
    Elements,
    st.just(EPOCH_JD),
    st.floats(0.1, 4.0),
    st.one_of(st.floats(0.0, 0.95), st.sampled_from([0.999999, 1.0, 1.000001]), st.floats(1.05, 4.0)),
    st.floats(0.0, 180.0),
    st.floats(0.0, 360.0),
    st.floats(0.0, 360.0),
    st.floats(EPOCH_JD - 800.0, EPOCH_JD + 800.0),
)
DATES = np.linspace(EPOCH_JD - 1500.0, EPOCH_JD + 1500.0, 31)


@given(ELEMENTS)
def test_every_date_has_the_energy_the_momentum_and_the_plane_of_the_elements(elements):
    position, velocity = elements_states(elements, DATES)
    r, v = icrf_to_ecliptic(position.T), icrf_to_ecliptic(velocity.T)
    q_km = elements.q_au * AU_KM
    fall = GM_SUN_KM3_S2 / q_km
    energy = 0.5 * np.sum(v * v, axis=-1) - GM_SUN_KM3_S2 / np.linalg.norm(r, axis=-1)
    np.testing.assert_allclose(energy, -0.5 * fall * (1.0 - elements.e), atol=1e-12 * fall)

    i, node = math.radians(elements.i_deg), math.radians(elements.node_deg)
    pole = np.array([math.sin(i) * math.sin(node), -math.sin(i) * math.cos(node), math.cos(i)])
    momentum = math.sqrt(GM_SUN_KM3_S2 * q_km * (1.0 + elements.e))
    np.testing.assert_allclose(np.cross(r, v), np.tile(momentum * pole, (31, 1)), atol=1e-12 * momentum)


@given(ELEMENTS)
def test_the_body_is_at_its_perihelion_on_the_perihelion_date(elements):
    position, velocity = elements_states(elements, np.array([elements.perihelion_jd]))
    assert np.linalg.norm(position) == pytest.approx(elements.q_au * AU_KM, rel=1e-14)
    assert abs(np.sum(position * velocity)) <= 1e-14 * np.linalg.norm(position) * np.linalg.norm(velocity)


@given(ELEMENTS)
def test_velocity_is_the_slope_of_position(elements):
    half = 0.02  # days
    before, _ = elements_states(elements, DATES - half)
    after, _ = elements_states(elements, DATES + half)
    position, velocity = elements_states(elements, DATES)
    slope = (after - before) / (2.0 * half * DAY_S)
    # The third derivative of motion is of the size gm v / r³.
    distance, speed = np.linalg.norm(position, axis=0), np.linalg.norm(velocity, axis=0)
    curvature = GM_SUN_KM3_S2 * speed / np.minimum(distance, 1e12) ** 3 * (half * DAY_S) ** 2
    assert (np.linalg.norm(slope - velocity, axis=0) <= curvature + 1e-6 * speed).all()


def test_states_are_laid_out_by_axis_and_lie_together_in_memory():
    elements = Elements(EPOCH_JD, 0.9, 0.3, 5.0, 10.0, 20.0, EPOCH_JD)
    position, velocity = elements_states(elements, DATES)
    assert position.shape == velocity.shape == (3, 31)
    assert position.flags.c_contiguous
    assert velocity.flags.c_contiguous


@given(st.floats(0.3, 30.0), st.floats(-720.0, 720.0))
def test_a_mean_anomaly_means_the_perihelion_nearest_the_epoch(a_au, anomaly_deg):
    period_days = 365.2568983 * a_au**1.5  # Gaussian year: 2 pi / k, k = 0.01720209895
    perihelion = perihelion_epoch_jd(EPOCH_JD, a_au, anomaly_deg, GM_SUN_KM3_S2)
    assert abs(perihelion - EPOCH_JD) <= 0.5 * period_days * (1.0 + 1e-6)
    turned = (EPOCH_JD - perihelion) / period_days - anomaly_deg / 360.0
    assert turned == pytest.approx(round(turned), abs=1e-6)


def test_a_hyperbolas_mean_anomaly_counts_from_its_only_perihelion():
    expected = EPOCH_JD - 900.0 / 360.0 * 365.2568983
    got = perihelion_epoch_jd(EPOCH_JD, -1.0, 900.0, GM_SUN_KM3_S2)
    assert got == pytest.approx(expected, abs=1e-3)
    late = perihelion_epoch_jd(EPOCH_JD, -1.0, -900.0, GM_SUN_KM3_S2)
    assert late - EPOCH_JD == pytest.approx(EPOCH_JD - got, abs=1e-6)

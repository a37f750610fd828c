"""The tables of states that a grid reads."""

import time

import numpy as np

from porkgrid.sky.bodies import BODIES
from porkgrid.sky.kernel import open_ephemeris
from porkgrid.sky.states import state_table

DATES = 2462000.5 + np.arange(6000) * 0.25


def test_a_table_holds_its_body_its_dates_and_contiguous_states():
    ephemeris = open_ephemeris()
    table = state_table(ephemeris, BODIES["mars"], DATES)
    assert table.body is BODIES["mars"]
    np.testing.assert_array_equal(table.jd, DATES)
    for part in (table.position, table.velocity):
        assert part.shape == (3, 6000)
        assert part.dtype == np.float64
        assert part.flags.c_contiguous
    alone, _ = ephemeris.states(BODIES["mars"], DATES[4321:4322])
    np.testing.assert_array_equal(table.position[:, 4321:4322], alone)


def test_velocity_is_the_slope_of_position():
    table = state_table(open_ephemeris(), BODIES["mars"], DATES)
    at = table.position
    slope = (8 * (at[:, 3:-1] - at[:, 1:-3]) - (at[:, 4:] - at[:, :-4])) / (12 * 0.25 * 86400)
    # The five-point slope is off by h⁴/30 times the fifth derivative, 24 km/s (2 pi / 687 d)⁴: below 1e-10.
    np.testing.assert_allclose(slope, table.velocity[:, 2:-2], rtol=0.0, atol=1e-9)


def test_six_thousand_states_take_milliseconds():
    ephemeris = open_ephemeris()
    seconds = []
    for _ in range(5):
        start = time.perf_counter()
        state_table(ephemeris, BODIES["earth"], DATES)
        seconds.append(time.perf_counter() - start)
    assert min(seconds) < 0.1  # about 20 ms on the machine it was written on; date by date takes 0.5 s

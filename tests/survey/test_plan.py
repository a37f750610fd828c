"""What a sweep settles before it starts."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from survey_scenarios import LOOPS, PETREL, changed, limited

from porkgrid.survey.plan import Plan

# What a candidate is made of, which every survey keeps
FLOWN = ("departure_epoch_jd_tdb", "arrival_epoch_jd_tdb", "leg1_revs", "leg1_branch")

HERON = """
[bodies.heron]
epoch = 2029-01-01
a_au = 1.2
e = 0.1
i_deg = 3
node_deg = 10
argument_deg = 20
mean_anomaly_deg = 30
"""


class Sized(Plan):
    """Only the tiling of a plan, for a grid of a given shape."""

    def __init__(self, shape):
        object.__setattr__(self, "sides", shape)
        object.__setattr__(self, "options", ((),))  # of one leg

    @property
    def shape(self):
        return self.sides


@given(st.integers(1, 3000), st.integers(1, 4000))
def test_tiles_cover_every_cell_once_in_chunks_of_the_store(rows, columns):
    plan = Sized((rows, columns))
    height, width = plan.chunks
    covered = np.zeros((rows, columns), np.uint8)
    for number, tile in enumerate(plan.tiles):
        assert tile.number == number
        assert tile.rows.start % height == 0
        assert tile.columns.start % width == 0
        assert 0 < tile.cells <= height * width <= plan.tile_cells
        assert tile.cells == covered[tile.rows, tile.columns].size
        covered[tile.rows, tile.columns] += 1
    assert np.all(covered == 1)


def test_a_window_has_its_dates_at_both_ends(rook):
    departure, arrival = (table.jd for table in rook.tables)
    assert (departure[0], departure[1] - departure[0]) == (2_462_015.5, 5.0)  # 2028-09-01
    assert (arrival[0], arrival[1] - arrival[0]) == (2_462_182.5, 7.0)  # 2029-02-15
    assert 2_462_227.5 - 5.0 < departure[-1] <= 2_462_227.5  # 2029-04-01
    assert rook.shape == (len(departure), len(arrival)) == (43, 59)


def test_everything_is_stored_where_the_scenario_lists_no_measures(rook):
    assert rook.stored == tuple(rook.measures)


def test_a_list_of_measures_keeps_also_how_cells_are_flown_and_what_limits_and_ranks(plan_of):
    plan = plan_of(
        'measures = ["rla_deg"]\n' + changed(LOOPS, ("[limits]", '[rank]\nby = "tof_days"\n[limits]'))
    )
    assert set(plan.stored) == {"rla_deg", "c3_km2_s2", "sun_min_au", "tof_days", *FLOWN}


def test_orbits_are_radii_from_the_centre_of_the_body_they_go_round(rook, petrel, loops):
    """Equatorial radii of the IAU report: Earth 6378.1366 km, Mars 3396.19 km."""
    assert rook.parking.periapsis_km == pytest.approx(6578.1366)
    assert rook.parking.apoapsis_km == pytest.approx(6678.1366)
    assert rook.parking.inclination_rad == pytest.approx(np.radians(28.5))
    assert rook.capture.apoapsis_km == pytest.approx(36_396.19)
    assert petrel.parking.periapsis_km == pytest.approx(3746.19)
    assert petrel.parking.inclination_rad is None
    assert loops.parking is loops.capture is petrel.capture is None


def test_ranking_is_as_asked_and_else_by_what_the_route_has(plan_of, rook, loops):
    assert (rook.rank_by, rook.rank_sign) == ("dv_total_km_s", 1.0)
    assert loops.rank_by == "c3_km2_s2"
    plan = plan_of(PETREL + '[rank]\nby = "tof_days"\norder = "most"\n')
    assert (plan.rank_by, plan.rank_sign) == ("tof_days", -1.0)


def test_the_route_names_its_bodies_and_marks_those_moved_by_elements(plan_of, rook):
    assert rook.route == "Earth → Mars"
    text = changed(limited(LOOPS, ""), ('"mars"', '"heron"')) + HERON
    assert plan_of(text).route == "Earth → Heron (two-body elements)"

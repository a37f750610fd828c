"""What forbids a cell, against comparing each cell's numbers with each limit."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as arrays

from porkgrid.physics.lambert import FLOWN, NO_PLANE, NO_TRANSFER, NOT_AFTER
from porkgrid.scenario import Limit
from porkgrid.survey.limits import REASONS, Bound, blocked_by, bounds_of, flag_names, flag_titles

BOUND = st.one_of(st.none(), st.floats(-100.0, 100.0))
VALUES = arrays.arrays(float, 20, elements=st.one_of(st.floats(-150.0, 150.0), st.just(np.nan)))


@pytest.fixture(scope="module")
def measures(rook):
    return rook.measures


@given(BOUND, BOUND, VALUES)
def test_a_bound_forbids_exactly_what_is_not_within_it(measures, least, most, values):
    assume(least is not None or most is not None)  # the scenario refuses a limit without ends
    bound = Bound(measures["dla_deg"], least, most)
    for value, forbidden, excess in zip(values, bound.forbids(values), bound.excess(values), strict=True):
        inside = (least is None or value >= least) and (most is None or value <= most)
        assert forbidden == (not inside)  # comparisons with NaN are false
        if not np.isnan(value):
            below = 0.0 if least is None else least - value
            above = 0.0 if most is None else value - most
            assert excess == max(0.0, below, above)


def test_the_ends_of_a_limit_are_allowed(measures):
    bound = Bound(measures["dla_deg"], -28.5, 28.5)
    assert bound.forbids(np.array([-28.5, 28.5])).tolist() == [False, False]
    assert bound.forbids(np.nextafter([-28.5, 28.5], [-90.0, 90.0])).tolist() == [True, True]


@settings(max_examples=30, deadline=None)
@given(
    st.dictionaries(
        st.sampled_from(["c3_km2_s2", "dla_deg", "tof_days", "arrival_sep_deg", "arrival_mars_ls_deg"]),
        st.tuples(st.floats(-30.0, 60.0), st.floats(0.0, 400.0)),
        min_size=1,
    )
)
def test_every_bit_is_the_direct_comparison_of_its_measure(rook_cells, measures, ends):
    limits = {name: Limit(min=least, max=least + span) for name, (least, span) in ends.items()}
    word = blocked_by(rook_cells, bounds_of(limits, measures))
    flown = rook_cells.status == FLOWN
    for bit, (name, limit) in enumerate(limits.items(), start=3):
        values = np.broadcast_to(measures[name].compute(rook_cells), word.shape)
        outside = (values < limit.min) | (values > limit.max)
        assert np.array_equal((word >> bit & 1) == 1, outside & flown)
    assert np.all(word[flown] >> 3 << 3 == word[flown])
    assert np.all(word >> (3 + len(limits)) == 0)


@pytest.mark.parametrize(("status", "bit"), [(NOT_AFTER, 0), (NO_PLANE, 1), (NO_TRANSFER, 2)])
def test_a_cell_without_a_flight_has_the_bit_of_its_reason_and_no_other(rook_cells, rook, status, bit):
    leg = rook_cells.legs[0]
    all_so = replace(rook_cells, legs=[replace(leg, status=np.full_like(leg.status, status))])
    assert np.all(blocked_by(all_so, rook.bounds) == 1 << bit)


def test_flags_are_the_reasons_then_the_limits_in_the_scenarios_order(rook):
    names = flag_names(rook.bounds)
    assert names[:3] == ["arrival_before_departure", "plane_undefined", "no_transfer"] == list(REASONS)
    assert names[3:] == ["c3_km2_s2", "dla_deg", "v_inf_arrival_km_s", "arrival_sep_deg"]
    assert len(flag_titles(rook.bounds)) == len(names)


@pytest.mark.parametrize(
    ("name", "least", "most", "title"),
    [
        ("c3_km2_s2", None, 25.0, "C3 at most 25 km²/s²"),
        ("dla_deg", -28.5, 28.5, "DLA −28.5 to 28.5°"),
        ("v_inf_arrival_km_s", None, 4.5, "arrival v∞ at most 4.5 km/s"),
        ("arrival_sep_deg", 30.0, None, "Sun–Earth–body angle at arrival at least 30°"),
        ("dv_total_km_s", None, 6.0, "total Δv at most 6 km/s"),
        ("arrival_mars_ls_deg", 0.0, 90.0, "Mars Ls at arrival 0 to 90°"),
        ("leg1_revs", None, 0.0, "leg 1 revolutions at most 0"),
    ],
)
def test_titles_say_the_limit_in_words(measures, name, least, most, title):
    assert Bound(measures[name], least, most).title == title


def test_a_negative_limit_of_one_side_is_set_with_a_minus_sign_too(measures):
    assert Bound(measures["dla_deg"], -5.0, None).title == "DLA at least −5°"
    assert Bound(measures["dla_deg"], None, -5.0).title == "DLA at most −5°"

"""The trade front holds exactly the allowed cells that no other beats in everything."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as arrays
from survey_scenarios import ROOK, changed

from porkgrid.errors import RequestError
from porkgrid.survey import view
from porkgrid.survey.trade import Front, front_table, non_dominated, spread, trade_front, write_front

BOTH = st.sampled_from([2, 3])


def brute(costs: np.ndarray) -> np.ndarray:
    """Every row against every other, as the definition says."""
    no_more = np.all(costs[:, None] <= costs[None, :], axis=-1)
    less = np.any(costs[:, None] < costs[None, :], axis=-1)
    return np.flatnonzero(~np.any(no_more & less, axis=0))


def few_values(top: int) -> st.SearchStrategy[np.ndarray]:
    shape = st.tuples(st.integers(0, 60), BOTH)
    return arrays.arrays(np.float64, shape, elements=st.integers(0, top).map(float))


@settings(deadline=None)  # the first call compiles
@given(few_values(3) | few_values(12))
def test_the_front_equals_brute_force_with_many_ties(costs):
    np.testing.assert_array_equal(non_dominated(costs), brute(costs))


@settings(deadline=None)
@given(arrays.arrays(np.float64, st.tuples(st.integers(0, 60), BOTH), elements=st.floats(allow_nan=False)))
def test_the_front_equals_brute_force_for_any_numbers_and_infinities(costs):
    np.testing.assert_array_equal(non_dominated(costs), brute(costs))


def test_the_front_equals_brute_force_where_every_row_is_on_it():
    angle = np.linspace(0.0, 0.5 * np.pi, 500)
    circle = np.column_stack([1.0 - np.cos(angle), 1.0 - np.sin(angle)])
    assert len(non_dominated(circle)) == 500
    sphere = np.abs(np.random.default_rng(3).normal(size=(500, 3)))
    sphere = 1.0 - sphere / np.linalg.norm(sphere, axis=1)[:, None]
    np.testing.assert_array_equal(non_dominated(sphere), brute(sphere))


def test_rows_with_equal_costs_stand_on_the_front_together():
    costs = np.array([[1.0, 2.0], [2.0, 1.0], [1.0, 2.0], [2.0, 2.0]])
    assert non_dominated(costs).tolist() == [0, 1, 2]


def brute_front(survey, measures, signs) -> set[tuple[int, int]]:
    whole = survey.grid["blocked_by"]
    values = [survey.grid[name].broadcast_like(whole).transpose(*whole.dims).values for name in measures]
    costs = np.stack(values, axis=-1).astype(float) * signs
    allowed = (whole.values == 0) & ~np.isnan(costs).any(axis=-1)
    rows, columns = np.nonzero(allowed)
    on = brute(costs[allowed])
    return set(zip(rows[on].tolist(), columns[on].tolist(), strict=True))


@pytest.mark.parametrize(
    ("by", "traded"),
    [
        (None, ["tof_days"]),
        ("c3_km2_s2", ["v_inf_arrival_km_s", "tof_days"]),
        ("arrival_epoch_jd_tdb", ["dv_total_km_s", "departure_epoch_jd_tdb"]),
        ("arrival_sep_deg", ["c3_km2_s2"]),
    ],
)
def test_the_front_of_a_survey_equals_brute_force_over_its_allowed_cells(survey, by, traded):
    front = trade_front(survey, by, traded)
    cells = set(zip(front.rows.tolist(), front.columns.tolist(), strict=True))
    assert len(cells) == len(front.rows) > 1
    assert cells == brute_front(survey, front.measures, front.signs)
    assert front.allowed == survey.provenance["cells_allowed"]


def test_a_front_read_in_bands_is_the_front_of_the_whole(survey, monkeypatch):
    whole = trade_front(survey, None, ["tof_days"])
    monkeypatch.setattr(view, "BAND_CELLS", 3 * survey.grid.sizes["arrival"])
    in_bands = trade_front(survey, None, ["tof_days"])
    np.testing.assert_array_equal(in_bands.rows, whole.rows)
    np.testing.assert_array_equal(in_bands.values, whole.values)


def test_the_front_begins_with_the_best_of_the_rank_measure_and_its_costs_rise(survey):
    front = trade_front(survey, None, ["tof_days"])
    assert front.values[0, 0] == pytest.approx(survey.candidates["dv_total_km_s"].iloc[0], rel=1e-6)
    assert np.all(np.diff(front.costs[:, 0]) >= 0.0)
    assert np.all(np.diff(front.costs[:, 1]) <= 0.0)


def test_an_order_given_turns_the_ranked_measure_round(survey):
    front = trade_front(survey, "c3_km2_s2", ["tof_days"], "most")
    cells = set(zip(front.rows.tolist(), front.columns.tolist(), strict=True))
    assert cells == brute_front(survey, ("c3_km2_s2", "tof_days"), (-1.0, 1.0))


def test_a_survey_that_allows_nothing_has_an_empty_front_and_an_empty_table(sweep_text):
    closed = sweep_text(changed(ROOK, ("c3_km2_s2 = { max = 25 }", "c3_km2_s2 = { max = 0.1 }")))
    front = trade_front(closed, None, ["tof_days"])
    assert len(front.rows) == front.allowed == 0
    assert front_table(closed, front, 5).empty


@settings(deadline=None)
@given(arrays.arrays(np.float64, st.tuples(st.integers(1, 40), BOTH), elements=st.floats(-1e6, 1e6)),
       st.integers(3, 50))  # fmt: skip
def test_a_spread_keeps_the_ends_and_as_many_as_asked(costs, keep):
    front = costs[non_dominated(costs)]
    chosen = spread(front, keep)
    assert len(set(chosen.tolist())) == len(chosen) == min(keep, len(front))
    for measure in range(front.shape[1]):
        assert front[chosen, measure].min() == front[:, measure].min()


def test_a_spread_is_even():
    angle = np.linspace(0.0, 0.5 * np.pi, 1000) ** 3 / (0.5 * np.pi) ** 2  # crowded at one end
    circle = np.column_stack([1.0 - np.cos(angle), 1.0 - np.sin(angle)])
    steps = np.diff(np.sort(angle[spread(circle, 17)]))
    assert steps.max() < 2.1 * steps.min()


def test_the_table_of_a_front_has_every_measure_at_the_cells_of_the_front(survey, tmp_path):
    front = trade_front(survey, None, ["tof_days"])
    table = front_table(survey, front, 7)
    assert len(table) == 7
    assert set(survey.plan.measures) <= set(table.columns)
    chosen = front.values[spread(front.costs, 7)]
    np.testing.assert_allclose(table[list(front.measures)].to_numpy(), chosen, rtol=1e-6)
    elsewhere = type(survey)(tmp_path, survey.provenance)
    path = write_front(elsewhere, table)
    assert path == str(tmp_path / "trade.csv")
    assert (tmp_path / "trade.csv").read_text().splitlines()[0].startswith("rank,departure,arrival,")


@pytest.mark.parametrize(
    ("by", "traded", "said"),
    [
        (None, ["tof_dayz"], "does not store 'tof_dayz'; the nearest is 'tof_days'"),
        ("c3", ["tof_days"], "does not store 'c3'"),
        (None, ["dv_total_km_s"], "names a measure twice, or the one ranked by (dv_total_km_s)"),
        (None, ["tof_days", "tof_days"], "names a measure twice"),
        (None, ["tof_days", "c3_km2_s2", "dla_deg"], "takes one measure or two, not 3"),
    ],
)
def test_a_trade_that_makes_no_sense_is_refused(survey, by, traded, said):
    with pytest.raises(RequestError) as refused:
        trade_front(survey, by, traded)
    assert said in str(refused.value)
    assert str(survey.path) in str(refused.value)


def test_the_costs_of_a_front_turn_measures_of_which_more_is_better():
    front = Front(("a", "b"), (1.0, -1.0), np.array([0]), np.array([0]), np.array([[3.0, 4.0]]), 1)
    assert front.costs.tolist() == [[3.0, -4.0]]

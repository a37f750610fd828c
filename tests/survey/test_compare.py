"""Comparisons take the best of each survey and say in words what one route gives against another."""

import numpy as np
import pandas as pd
import pytest
from survey_scenarios import LOOPS, PETREL, ROOK, changed, limited, shrink_tiles

from porkgrid.errors import RequestError
from porkgrid.survey.answers import answer, answer_to, telling_measure
from porkgrid.survey.compare import burn_split, compare, comparison_table
from porkgrid.survey.period import launch_periods
from porkgrid.survey.sweep import sweep

# The same flight a day's drive later, held to less, so that it costs more; another name for a name's sake.
RAVEN = changed(
    ROOK,
    ('name = "Rook to Mars"', 'name = "Raven to Mars, late"'),
    ("first = 2028-09-01", "first = 2028-12-15"),
)
CLOSED = limited(changed(ROOK, ('name = "Rook to Mars"', 'name = "Jay to Mars"')), "c3_km2_s2 = { max = 1 }")


@pytest.fixture(scope="module")
def swept(scenario_of, tmp_path_factory):
    """Sweep a text under a folder name of its own; the same text is swept once."""
    done = {}

    def of(name: str, text: str):
        if name not in done:
            with pytest.MonkeyPatch.context() as patch:
                shrink_tiles(patch)
                done[name] = sweep(scenario_of(text), tmp_path_factory.mktemp("compared") / name, workers=1)
        return done[name]

    return of


@pytest.fixture(scope="module")
def raven(swept):
    return swept("raven", RAVEN)


@pytest.fixture(scope="module")
def pair(survey, raven):
    return compare([survey, raven], days=20)


def test_each_entry_has_the_best_candidate_and_the_best_period_of_its_survey(survey, raven, pair):
    for one, entry in zip((survey, raven), pair.entries, strict=True):
        first = one.candidates.iloc[0]
        assert entry.best["departure"] == first["departure"]
        assert entry.best["dv_total_km_s"] == first["dv_total_km_s"]
        best = launch_periods(one, 20, keep=1)[0]
        assert (entry.period.first, entry.period.last, entry.period.worst) == (
            best.first,
            best.last,
            best.worst,
        )


def test_another_measure_picks_other_dates(survey):
    entry = compare([survey], by="v_inf_arrival_km_s").entries[0]
    grid = survey.grid
    slow = grid["v_inf_arrival_km_s"].where(grid["blocked_by"] == 0)
    assert entry.best["v_inf_arrival_km_s"] == pytest.approx(float(slow.min()), rel=1e-6)
    assert entry.by == "v_inf_arrival_km_s"


def test_baselines_come_once_for_each_pair_of_ends(survey, raven, swept):
    petrel = swept("petrel", PETREL)
    routes = [each.route for each in compare([survey, petrel, raven], days=20).yardsticks]
    assert routes == ["Earth → Mars", "Mars → Earth"]


def test_a_pair_gets_one_sentence_and_four_surveys_six(survey, raven, swept, pair):
    assert len(pair.sentences) == 1
    four = [survey, raven, swept("closed", CLOSED), swept("loops", LOOPS)]
    assert len(compare(four, days=20).sentences) == 6


def test_the_sentence_has_the_differences_of_the_best_dates(pair):
    rook, raven = (entry.best for entry in pair.entries)
    days = round(raven["departure_epoch_jd_tdb"] - rook["departure_epoch_jd_tdb"])
    dearer = raven["dv_total_km_s"] - rook["dv_total_km_s"]
    assert days > 0
    assert dearer > 0.0
    said = pair.sentences[0]
    assert said.startswith(f"Rook to Mars leaves {days} days earlier than “Raven to Mars, late”, takes ")
    share = 100.0 * dearer / raven["dv_total_km_s"]
    assert said.endswith(f"saves {dearer:.2f} km/s of Δv ({share:.0f} %).")


def test_a_survey_alone_is_laid_beside_the_baselines(survey):
    alone = compare([survey], days=20)
    assert len(alone.sentences) == 2
    assert " than the Hohmann floor" in alone.sentences[0]
    assert " than the phased bi-elliptic" in alone.sentences[1]


def test_a_survey_without_a_period_that_long_says_how_long_it_could_be(survey):
    entry = compare([survey], days=190).entries[0]
    allowed = (survey.grid["blocked_by"].values == 0).any(axis=1)
    runs = "".join("x" if each else " " for each in allowed).split()
    assert entry.period is None
    assert entry.no_period == f"none of 190 days; the longest is {5 * max(map(len, runs))}"


def test_a_survey_that_allows_nothing_is_shown_and_said_so(survey, swept):
    comparison = compare([survey, swept("closed", CLOSED)], days=20)
    closed = comparison.entries[1]
    assert (closed.best, closed.period, closed.no_period) == (None, None, "no dates are allowed")
    expected = "Jay to Mars has no allowed dates: there is nothing to lay side by side."
    assert comparison.sentences == (expected,)
    assert len(comparison_table(comparison)) == 4


def test_two_surveys_of_one_name_are_told_apart_by_their_folders(survey, swept):
    again = swept("again", ROOK)
    names = [entry.name for entry in compare([survey, again], days=20).entries]
    assert names == [f"Rook to Mars ({survey.path})", f"Rook to Mars ({again.path})"]


def test_the_table_has_a_row_a_route_and_the_measures_by_name(pair):
    table = comparison_table(pair)
    assert table["name"].tolist() == [
        "Rook to Mars",
        "Raven to Mars, late",
        "Hohmann floor",
        "phased bi-elliptic",
    ]
    assert table["kind"].tolist() == ["survey", "survey", "baseline", "baseline"]
    assert set(pair.entries[0].survey.plan.measures) <= set(table.columns)
    assert table["period_worst_c3_km2_s2"].notna().tolist() == [True, True, False, False]
    assert table["deep_space_burn_km_s"].notna().tolist() == [False, False, False, True]


def test_the_split_of_burns_adds_up_to_the_total(pair):
    for entry in pair.entries:
        split = burn_split(entry.best)
        assert [title for title, _ in split] == ["departure", "capture"]
        assert sum(value for _, value in split) == pytest.approx(entry.best["dv_total_km_s"], rel=1e-12)


def test_the_split_names_flybys_in_flying_order():
    measures = {
        "flyby2_burn_km_s": 0.3,
        "dv_capture_km_s": 1.0,
        "flyby1_burn_km_s": 0.2,
        "dv_departure_km_s": 3.0,
    }
    assert [title for title, _ in burn_split(measures)] == ["departure", "flyby 1", "flyby 2", "capture"]


def test_the_same_folder_twice_is_refused(survey):
    with pytest.raises(RequestError, match="given twice"):
        compare([survey, survey])


def test_a_measure_that_one_survey_does_not_store_is_refused_by_folder(survey, swept):
    loops = swept("loops", LOOPS)
    with pytest.raises(RequestError) as refused:
        compare([survey, loops], by="dv_total_km_s")
    assert str(refused.value).startswith(f"{loops.path}: the survey does not store 'dv_total_km_s'; ")
    assert len(refused.value.faults) == 1


def test_surveys_that_share_no_measure_are_refused_with_both_folders(swept):
    by_energy = swept(
        "energy",
        'measures = ["c3_km2_s2"]\n' + limited(changed(ROOK, ("[rank]", '[rank]\nby = "c3_km2_s2"')), ""),
    )
    by_speed = swept("speed", 'measures = ["tof_days", "arrival_sep_deg"]\n' + limited(
        changed(ROOK, ("[rank]", '[rank]\nby = "v_inf_arrival_km_s"')), ""))  # fmt: skip
    with pytest.raises(RequestError) as refused:
        compare([by_energy, by_speed])
    assert f"{by_energy.path} and {by_speed.path}: they store no measure in common" in str(refused.value)


def test_a_period_of_no_days_is_refused(survey):
    with pytest.raises(RequestError, match="--days 0: a launch period has one day at least"):
        compare([survey], days=0)


BASE = {
    "departure_epoch_jd_tdb": 2_464_000.5,
    "tof_days": 300.0,
    "v_inf_arrival_km_s": 3.0,
    "c3_km2_s2": 12.0,
}


@pytest.mark.parametrize(
    ("change", "said"),
    [
        ({}, "A leaves on the same day as B, takes as long and needs as much C3."),
        ({"departure_epoch_jd_tdb": 2_464_001.5}, "A leaves 1 day later than B, takes as long and"),
        ({"departure_epoch_jd_tdb": 2_463_848.5}, "A leaves 5 months earlier than B, takes as long and"),
        ({"departure_epoch_jd_tdb": 2_465_461.5}, "A leaves 4.0 years later than B,"),
        ({"tof_days": 396.0}, "takes 96 days longer and"),
        ({"tof_days": 299.0}, "takes 1 day less and"),
        ({"v_inf_arrival_km_s": 3.29}, "takes as long and needs as much C3."),
        ({"v_inf_arrival_km_s": 3.4}, "takes as long, arrives 0.4 km/s faster and needs"),
        ({"v_inf_arrival_km_s": 2.0}, "arrives 1.0 km/s slower and"),
        ({"c3_km2_s2": 9.0}, "saves 3.0 km²/s² of C3 (25 %)."),
        ({"c3_km2_s2": 12.1}, "needs 0.1 km²/s² more C3 (under 1 %)."),
    ],
)
def test_the_sentence_says_what_differs(change, said):
    assert said in answer("A", BASE | change, "B", BASE)


@pytest.mark.parametrize(
    ("name", "mine", "others", "said"),
    [
        ("propellant_kg", 4116.0, 4426.0, "saves 310 kg of propellant (7 %)."),
        ("propellant_kg", 4426.0, 4116.0, "needs 310 kg more propellant (8 %)."),
        ("delivered_mass_kg", 1100.0, 1000.0, "delivers 100 kg more (10 %)."),
        ("delivered_mass_kg", 900.0, 1000.0, "delivers 100 kg less (10 %)."),
        ("low_orbit_mass_kg", 20_000.0, 25_000.0, "saves 5,000 kg in low orbit (20 %)."),
        ("dv_total_km_s", 5.0, 4.0, "costs 1.00 km/s more Δv (25 %)."),
        ("dv_total_km_s", 4.001, 4.0, "costs as much Δv."),
    ],
)
def test_the_sentence_ends_with_the_most_telling_measure(name, mine, others, said):
    assert answer("A", BASE | {name: mine}, "B", BASE | {name: others}).endswith(said)


def test_propellant_tells_more_than_mass_more_than_speed_and_a_missing_value_tells_nothing():
    both = {"propellant_kg": 1.0, "delivered_mass_kg": 1.0, "dv_total_km_s": 1.0, "c3_km2_s2": 1.0}
    assert telling_measure(both, both) == "propellant_kg"
    assert telling_measure(both, both | {"propellant_kg": np.nan}) == "delivered_mass_kg"
    assert telling_measure({"c3_km2_s2": 1.0}, both) == "c3_km2_s2"
    assert telling_measure({}, both) is None


def test_names_with_commas_stand_in_quotes_and_a_closed_survey_is_named():
    assert answer("A, 2034", BASE, "B", BASE).startswith("“A, 2034” leaves on the same day as B, ")
    assert answer("A", None, "B", None).startswith("A and B have no allowed dates")
    assert answer("A", BASE, "B", None).startswith("B has no allowed dates")
    assert (
        answer_to("A", None, "floor", BASE)
        == "A has no allowed dates: there is nothing to lay beside the floor."
    )


def test_beside_a_baseline_dates_do_not_count():
    floor = {"tof_days": 259.0, "v_inf_arrival_km_s": 3.0, "dv_total_km_s": 4.0}
    said = answer_to("A", BASE | {"dv_total_km_s": 4.4}, "Hohmann floor", floor)
    assert said == "A takes 41 days longer than the Hohmann floor and costs 0.40 km/s more Δv (10 %)."
    assert answer_to("A", pd.Series(floor).to_dict(), "floor", floor) == (
        "A takes as long as the floor and costs as much Δv."
    )


def test_a_capture_that_only_one_route_makes_is_said():
    braking = BASE | {"dv_total_km_s": 5.0, "dv_capture_km_s": 1.0}
    passing = BASE | {"dv_total_km_s": 4.0}
    assert answer("A", braking, "B", passing).endswith(
        "costs 1.00 km/s more Δv (25 %), its capture included."
    )
    said = answer("A", passing, "B", braking)
    assert said.endswith("saves 1.00 km/s of Δv (20 %), the capture of B included.")
    assert answer("A", braking, "B", braking).endswith("costs as much Δv.")


def test_baselines_have_the_orbits_of_the_survey_that_knows_most(survey, swept):
    yardstick = compare([swept("loops", LOOPS), survey], days=20).yardsticks[0]
    assert yardstick.of == "Rook to Mars"
    assert "dv_capture_km_s" in yardstick.baselines[0].measures

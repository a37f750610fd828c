"""The survey in Python: a method for each command, which gives what the command gives, and shows itself."""

from __future__ import annotations

import inspect
import json
import warnings

import pandas as pd
import pytest
from command import porkgrid as command
from survey_scenarios import ROOK, changed, limited, written

import porkgrid
from porkgrid.commands.chart import chart
from porkgrid.commands.compare import compare
from porkgrid.commands.handoff import handoff
from porkgrid.commands.page import page
from porkgrid.commands.period import period
from porkgrid.commands.rank import rank
from porkgrid.commands.slip import slip

HOSTILE = "<script>alert(1)</script> & co"
DAILY = changed(
    ROOK,
    (
        "first = 2028-09-01\nlast = 2029-04-01\nstep_days = 5.0",
        "first = 2028-11-01\nlast = 2029-01-10\nstep_days = 1.0",
    ),
    ('name = "Rook to Mars"', f'name = "{HOSTILE}"'),
)

# Options that say how a command prints, or are a method's other arguments or another method.
OF_COMMANDS_ONLY = {"survey", "surveys", "as_json", "formats", "trade"}
OTHERWISE_CALLED = {"gaps": "gap_days"}


@pytest.fixture(scope="module")
def survey(tmp_path_factory):
    folder = tmp_path_factory.mktemp("methods")
    return porkgrid.sweep(porkgrid.load_scenario(written(folder, DAILY)), folder / "survey", workers=1)


@pytest.mark.parametrize(
    "of", [chart, rank, period, slip, compare, handoff, page], ids=lambda of: of.__name__
)
def test_every_command_that_takes_a_survey_has_a_method_with_its_options(of):
    method = inspect.signature(getattr(porkgrid.Survey, of.__name__)).parameters
    asked = {OTHERWISE_CALLED.get(name, name) for name in inspect.signature(of).parameters}
    where = {"out"} if of is compare else set()  # the method writes nothing
    assert asked - OF_COMMANDS_ONLY - where <= set(method)


def test_rank_gives_what_the_command_prints(survey):
    told = json.loads(command("rank", survey.path, "--by", "c3_km2_s2", "--keep", "3", "--json").stdout)
    table = survey.rank(by="c3_km2_s2", keep=3)
    assert table["departure"].to_list() == [each["departure"] for each in told]
    assert table["c3_km2_s2"].to_list() == pytest.approx([each["c3_km2_s2"] for each in told])


def test_period_gives_what_the_command_writes_and_writes_when_asked(survey):
    survey.period(days=7)
    assert not list(survey.path.rglob("period-7*"))
    report = survey.period(days=7, hold="arrival", gap_days=1, formats=["svg"])
    table = pd.read_csv(survey.path / "period-7-hold-arrival-gaps-1.csv")
    first = table[table["period"] == 1]
    assert first["departure"].to_list() == report.periods[0].table["departure"].to_list()
    assert (survey.path / "figures" / "period-7-hold-arrival-gaps-1.svg").exists()


def test_slip_gives_what_the_command_prints(survey):
    told = json.loads(command("slip", survey.path, "--json").stdout)
    assert survey.slip()["last_departure"].to_list() == [each["last_departure"] for each in told]


def test_methods_refuse_what_the_commands_refuse(survey):
    with pytest.raises(porkgrid.RequestError, match="does not store 'c3'"):
        survey.rank(by="c3")
    with pytest.raises(porkgrid.RequestError, match="given twice"):
        survey.compare(survey)
    with pytest.raises(porkgrid.RequestError, match="give either --candidate N or --dates"):
        survey.handoff()
    with pytest.raises(porkgrid.RequestError, match="no candidate 99"):
        survey.chart(path=99)


def test_what_a_survey_gives_shows_itself_with_hostile_names_as_text(survey):
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        for each in (survey, survey.scenario, survey.compare(days=5)):
            shown = each._repr_html_()
            assert "<script" not in shown
            assert "&lt;script&gt;alert(1)&lt;/script&gt; &amp; co" in shown
        report = survey.period(days=5)
        assert "<script" not in report._repr_html_()


def test_a_survey_shows_its_candidates_and_its_caution(survey):
    shown = survey._repr_html_()
    best = survey.candidates.iloc[0]
    assert best["departure"] in shown
    assert f"{best['dv_total_km_s']:.3f}" in shown
    assert "not for flight operations" in shown


def test_a_scenario_shows_its_limits_with_their_bounds(survey):
    shown = survey.scenario._repr_html_()
    assert "dla_deg" in shown
    assert "-28.5" in shown
    assert "from 200 × 300 km at 28.5°" in shown


def test_a_period_shows_its_days_and_what_it_requires(survey):
    best = survey.period(days=5).periods[0]
    shown = best._repr_html_()
    assert all(day in shown for day in best.table["departure"])
    assert "abs_dla_deg" in shown
    assert f"{best.worst:.3f}" in shown


def test_a_comparison_shows_its_sentences(survey):
    comparison = survey.compare(days=5)
    assert "Hohmann floor" in comparison._repr_html_()
    assert f"{comparison.entries[0].best['dv_total_km_s']:.3f}" in comparison._repr_html_()


def test_each_is_one_line_in_a_plain_prompt(survey):
    report = survey.period(days=5)
    for each in (survey, survey.scenario, report, report.periods[0], survey.compare(days=5)):
        assert "\n" not in repr(each)
        assert repr(each).startswith(f"<{type(each).__name__} ")


def test_a_survey_that_allows_nothing_shows_itself_too(tmp_path):
    text = limited(ROOK, "c3_km2_s2 = { max = 2 }")
    closed = porkgrid.sweep(porkgrid.load_scenario(written(tmp_path, text)), tmp_path / "survey", workers=1)
    assert "0 candidates" in closed._repr_html_()
    assert "no dates are allowed" in closed.compare(days=5)._repr_html_()

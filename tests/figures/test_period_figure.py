"""The figure of a launch period, read as a reader does."""

from __future__ import annotations

import numpy as np
import pytest
from matplotlib.patches import Rectangle
from survey_scenarios import ROOK, changed, limited, written

from porkgrid.figures.period import draw_period
from porkgrid.figures.style import SMALL_PT, save_figure
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.periodreport import report_periods
from porkgrid.survey.sweep import sweep

SEASON = changed(
    ROOK,
    (
        "first = 2028-09-01\nlast = 2029-04-01\nstep_days = 5.0",
        "first = 2028-10-15\nlast = 2029-01-20\nstep_days = 1.0",
    ),
)
ENERGY_ONLY = changed(
    limited('measures = ["c3_km2_s2", "v_inf_arrival_km_s"]\n' + ROOK, "c3_km2_s2 = { max = 18 }"),
    ("parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 300, inclination_deg = 28.5 }\n", ""),
    ("capture = { periapsis_altitude_km = 400, apoapsis_altitude_km = 33000 }\n", ""),
    (
        "first = 2028-09-01\nlast = 2029-04-01\nstep_days = 5.0",
        "first = 2028-09-01\nlast = 2033-06-30\nstep_days = 5.0",
    ),
    ("last = 2030-03-31", "last = 2034-06-30"),
)


@pytest.fixture(scope="module")
def swept(tmp_path_factory):
    def sweep_text(text):
        folder = tmp_path_factory.mktemp("swept")
        return sweep(load_scenario(written(folder, text)), folder / "survey", workers=1)

    return sweep_text


@pytest.fixture(scope="module")
def season(swept):
    return swept(SEASON)


@pytest.fixture(scope="module")
def years(swept):
    return swept(ENERGY_ONLY)


def drawn(survey, days, **asked):
    report = report_periods(survey, days, **asked)
    return draw_period(survey, report), report


@pytest.mark.parametrize(
    ("days", "asked"),
    [
        (21, {}),
        (1, {}),
        (30, {"hold": "arrival"}),
        (21, {"gap_days": 5}),
        (12, {"by": "c3_km2_s2"}),
        (12, {"by": "tof_days"}),
        (12, {"by": "arrival_epoch_jd_tdb"}),
    ],
)
def test_texts_of_a_season_do_not_overlap_and_stay_on_the_slide(
    season, placed_texts, overlapping, days, asked
):
    figure, _ = drawn(season, days, **asked)
    texts = placed_texts(figure)
    assert overlapping(texts) == []
    width, height = figure.bbox.width, figure.bbox.height
    assert [
        t.get_text() for t, box in texts if box.x0 < 0 or box.y0 < 0 or box.x1 > width or box.y1 > height
    ] == []
    assert min(text.get_fontsize() for text, _ in texts) >= SMALL_PT


def test_texts_of_several_seasons_do_not_overlap(years, placed_texts, overlapping):
    figure, report = drawn(years, 20)
    assert len(report.opportunities) > 1
    texts = placed_texts(figure)
    assert overlapping(texts) == []
    said = {text.get_text() for text, _ in texts}
    for each in report.opportunities:
        assert any(text.startswith(f"{each.first} to {each.last}") for text in said)


def test_the_period_its_worst_day_and_what_it_requires_are_said(season, placed_texts):
    figure, report = drawn(season, 21)
    best = report.periods[0]
    said = "\n".join(text.get_text() for text, _ in placed_texts(figure))
    assert f"launch period {best.first} to {best.last}, 21 days" in said
    assert f"worst day: {best.worst_on}, {best.worst:.3f} km/s" in said
    assert f"21 days: {best.worst:.3f} km/s" in said
    assert "greatest |DLA|" in said
    for each in report.periods[1:]:
        assert f"{each.first} to {each.last}" in said


def test_lengths_that_no_period_has_are_said(season, placed_texts):
    figure, report = drawn(season, 12, hold="arrival")
    longest = int(np.isfinite(report.worst).sum())
    assert longest < 60
    said = [text.get_text() for text, _ in placed_texts(figure)]
    assert any(f"no period longer than {longest} days" in text for text in said)


def test_the_burns_of_each_day_stack_up_to_their_sum(season):
    figure, report = drawn(season, 12)
    axes = next(each for each in figure.axes if each.get_ylabel() == "Δv (km/s)")
    bars = [
        patch
        for patch in axes.get_children()
        if isinstance(patch, Rectangle) and 0.5 < patch.get_width() < 1.0
    ]
    solid = [bar for bar in bars if bar.get_alpha() == 1.0]
    assert len(solid) == 2 * 12
    tops = sorted(bar.get_y() + bar.get_height() for bar in solid)[12:]
    np.testing.assert_allclose(tops, np.sort(report.periods[0].table["dv_total_km_s"]), rtol=1e-12)
    assert len(bars) - len(solid) == 2 * len(report.neighbours) > 0


def test_a_route_without_burns_has_no_panel_of_them(years):
    figure, _ = drawn(years, 20)
    labels = [axes.get_ylabel() for axes in figure.axes]
    assert not any("Δv" in label for label in labels)
    assert any("C3" in label for label in labels)


def test_the_figure_is_the_same_bytes_every_time(season, tmp_path):
    first, second = (save_figure(drawn(season, 12)[0], tmp_path / name, ["svg"])[0] for name in ("a", "b"))
    assert first.read_bytes() == second.read_bytes()

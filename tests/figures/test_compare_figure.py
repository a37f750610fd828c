"""The figure of a comparison: legible for one route or many, with names of any length."""

from __future__ import annotations

from collections.abc import Callable

import pytest
from matplotlib.figure import Figure
from survey_scenarios import LOOPS, PETREL, ROOK, changed, limited, written

from porkgrid.figures.compare import draw_comparison
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.compare import burn_split, compare
from porkgrid.survey.surveys import Survey
from porkgrid.survey.sweep import sweep

LONG = "Orbiter of many words, and then a few words more, to Mars the long way round, 2028"[:80]
TEXTS = {
    "rook": ROOK,
    "long": changed(ROOK, ('"Rook to Mars"', f'"{LONG}"'),
                    ("c3_km2_s2 = { max = 25 }", "c3_km2_s2 = { max = 20 }")),
    "no capture": changed(ROOK, ('"Rook to Mars"', '"Rail past Mars"'),
                          ("capture = { periapsis_altitude_km = 400, apoapsis_altitude_km = 33000 }\n", "")),
    "closed": limited(changed(ROOK, ('"Rook to Mars"', '"Jay to Mars"')), "c3_km2_s2 = { max = 1 }"),
    "no burns": LOOPS,
    "home": PETREL,
}  # fmt: skip


@pytest.fixture(scope="module")
def surveys(tmp_path_factory) -> dict[str, Survey]:
    swept = {}
    for name, text in TEXTS.items():
        folder = tmp_path_factory.mktemp("compare")
        swept[name] = sweep(load_scenario(written(folder, text)), folder / "survey", workers=1)
    return swept


CASES = [
    ["rook"],
    ["rook", "long"],
    ["rook", "no capture"],
    ["long", "rook", "home", "closed"],
    ["no burns"],
    ["no burns", "rook"],
    ["closed"],
    ["rook", "long", "no capture", "closed", "no burns", "home"],
]


def figure_of(surveys: dict[str, Survey], names: list[str]) -> Figure:
    return draw_comparison(compare([surveys[name] for name in names], days=20))


@pytest.mark.parametrize("names", CASES, ids=" + ".join)
def test_no_text_stands_on_another_or_leaves_the_slide(
    surveys: dict[str, Survey], names: list[str], placed_texts: Callable, overlapping: Callable
) -> None:
    figure = figure_of(surveys, names)
    placed = placed_texts(figure)
    assert overlapping(placed) == []
    assert min(text.get_fontsize() for text, _ in placed) >= 8.0
    width, height = figure.bbox.size
    assert all(b.x0 >= 0 and b.y0 >= 0 and b.x1 <= width and b.y1 <= height for _, b in placed)


def test_stacked_bars_are_as_long_as_the_burns(surveys: dict[str, Survey]) -> None:
    comparison = compare([surveys["rook"]], days=20)
    sheet = draw_comparison(comparison).axes[0]
    colours = {tuple(patch.get_facecolor()[:3]): [] for patch in sheet.patches}
    for patch in sheet.patches:
        colours[tuple(patch.get_facecolor()[:3])].append(patch.get_width())
    split = dict(burn_split(comparison.entries[0].best))
    # of each colour: the bars row by row, then the swatch of the key
    departure = next(widths for widths in colours.values() if len(widths) == 4 and widths[-1] == 0.22)
    floor = comparison.yardsticks[0].baselines[0].measures["dv_departure_km_s"]
    assert departure[0] / departure[1] == pytest.approx(split["departure"] / floor)


def test_values_periods_and_sentences_stand_in_the_figure(
    surveys: dict[str, Survey], placed_texts: Callable
) -> None:
    comparison = compare([surveys["rook"], surveys["home"]], days=20)
    texts = [text.get_text() for text, _ in placed_texts(draw_comparison(comparison))]
    for entry in comparison.entries:
        assert f"{entry.best['dv_total_km_s']:.3f}" in texts
        assert f"launch period {entry.period.first[:10]} – {entry.period.last[:10]}" in texts
    assert comparison.sentences[0] in texts


def test_where_no_route_has_burns_the_first_panel_is_c3(
    surveys: dict[str, Survey], placed_texts: Callable
) -> None:
    texts = [text.get_text() for text, _ in placed_texts(figure_of(surveys, ["no burns"]))]
    assert "C3 (km²/s²)" in texts
    assert "Δv by manoeuvre (km/s)" not in texts


def test_a_survey_that_allows_nothing_has_a_row_that_says_so(
    surveys: dict[str, Survey], placed_texts: Callable
) -> None:
    texts = [text.get_text() for text, _ in placed_texts(figure_of(surveys, ["closed", "rook"]))]
    assert "no dates are allowed" in texts

"""The porkchop chart says what the data say, and nothing stands on anything else."""

from __future__ import annotations

from collections.abc import Callable
from functools import cache

import numpy as np
import pandas as pd
import pytest
import synthetic_porkchop as grids
import xarray as xr
from matplotlib.figure import Figure
from synthetic_porkchop import C3, CASES, EVERY_CASE

from porkgrid.figures.chart import draw_chart
from porkgrid.figures.levels import value_scale
from porkgrid.survey.view import DayBests

FLYBY = "flyby1_epoch_jd_tdb"


@cache
def chart_of(case: str) -> Figure:
    make, keep, apart, lines = CASES[case]
    view = make()
    candidates = grids.candidates_of(view, C3, keep, apart)
    return draw_chart(view, grids.bests_of(view, C3), candidates, C3, lines)


def words(placed: list) -> str:
    return "\n".join(text.get_text() for text, _ in placed)


@pytest.mark.parametrize("case", EVERY_CASE)
def test_no_text_stands_on_another_or_leaves_the_slide_or_is_too_small(
    case: str, placed_texts: Callable, overlapping: Callable
) -> None:
    figure = chart_of(case)
    placed = placed_texts(figure)
    assert overlapping(placed) == []
    assert min(text.get_fontsize() for text, _ in placed) >= 8.0
    width, height = figure.bbox.size
    outside = [t.get_text() for t, b in placed if b.x0 < 0 or b.y0 < 0 or b.x1 > width or b.y1 > height]
    assert outside == []


def test_the_key_names_each_limit_that_alone_forbids_a_cell(placed_texts: Callable) -> None:
    texts = [text.get_text() for text, _ in placed_texts(chart_of("three limits"))]
    for title in ("C3 at most 25 km²/s²", "DLA from −28.5 to 28.5 deg", "flight time at most 340 days"):
        assert title in texts
    assert "several limits at once" in texts


def test_limits_without_a_hatch_of_their_own_are_named_together(placed_texts: Callable) -> None:
    departure, arrival = grids.dates("2028-10-01", 40), grids.dates("2029-04-01", 40)
    row = np.arange(40)[:, None] + np.zeros((1, 40))
    limits = {f"band{k}": (f"band number {k}", (row >= 4 * k) & (row < 4 * k + 3)) for k in range(8)}
    view = grids.porkchop(departure, arrival, limits=limits, c3_max=None)
    figure = draw_chart(view, grids.bests_of(view, C3), grids.candidates_of(view, C3, 0), C3, None)
    text = words(placed_texts(figure))
    assert "one of: band number 6, band number 7" in text


def test_too_many_limits_for_the_header_are_counted(placed_texts: Callable) -> None:
    header = next(
        t for t in words(placed_texts(chart_of("thirteen limits"))).split("\n") if "and" in t and "more" in t
    )
    named = (
        words(placed_texts(chart_of("thirteen limits")))
        .split("Limits: ")[1]
        .split("… and")[0]
        .count("at most")
    )
    assert f"… and {13 - named} more" in header


def test_the_headline_gives_the_best_value_and_its_departure_date(placed_texts: Callable) -> None:
    view = grids.usual()
    bests = grids.bests_of(view, C3)
    figure = draw_chart(view, bests, grids.candidates_of(view, C3, 3), C3, None)
    at = int(np.nanargmin(bests.departure_best))
    day = str(bests.departure[at].astype("datetime64[D]"))
    assert f"least allowed C3 {bests.departure_best[at]:.2f} km²/s², leaving {day}" in words(
        placed_texts(figure)
    )


def test_the_table_gives_dates_flight_times_and_values_of_the_candidates(placed_texts: Callable) -> None:
    view = grids.usual()
    candidates = grids.candidates_of(view, C3, 5)
    figure = draw_chart(view, grids.bests_of(view, C3), candidates, C3, None)
    placed = placed_texts(figure)
    rows = {
        tuple(text.get_text().replace("\u2007", " ").split()): text.get_position()[1] for text, _ in placed
    }
    for i, row in candidates.iterrows():
        days = (pd.Timestamp(row["arrival"]) - pd.Timestamp(row["departure"])).total_seconds() / 86_400
        dates = [
            pd.Timestamp(row[end]).strftime("%Y-%m-%d" if days % 1 == 0 else "%Y-%m-%dT%H")
            for end in ("departure", "arrival")
        ]
        found = [cells for cells in rows if len(cells) == 4 and cells[0] == str(int(i) + 1)]  # type: ignore[call-overload]
        assert len(found) == 1
        assert [cell[:10] for cell in found[0][1:3]] == [date[:10] for date in dates]
        assert found[0][3] == f"{days:.0f}"
        assert any(text.get_text() == f"{row[C3]:.2f}" for text, _ in placed)


def test_markers_are_numbered_in_the_order_of_the_table(placed_texts: Callable) -> None:
    texts = [
        text.get_text()
        for text, _ in placed_texts(chart_of("a cluster of twenty"))
        if text.get_weight() == "bold"
    ]
    assert [text for text in texts if text.isdigit()] == [str(n) for n in range(1, 21)]


def test_open_windows_are_written_with_first_and_last_date_and_length(placed_texts: Callable) -> None:
    view = grids.usual(150, 335)
    bests = grids.bests_of(view, C3)
    days = bests.departure[np.isfinite(bests.departure_best)].astype("datetime64[D]")
    length = int((days[-1] - days[0]) / np.timedelta64(1, "D")) + 1
    assert length == days.size  # one window, so that first and last are those of the run
    figure = draw_chart(view, bests, grids.candidates_of(view, C3, 0), C3, None)
    assert f"{days[0]} – {days[-1]} · {length} d" in words(placed_texts(figure))


def test_a_grid_without_an_allowed_cell_is_drawn_and_says_so(placed_texts: Callable) -> None:
    text = words(placed_texts(chart_of("all forbidden")))
    assert "No cell of this grid is allowed" in text
    assert "no departure day has an allowed value" in text


def test_a_measure_without_values_is_drawn_and_says_so(placed_texts: Callable) -> None:
    assert "C3 has no value anywhere on this grid." in words(placed_texts(chart_of("no values")))


def test_names_are_shown_letter_by_letter_and_never_read_as_mathematics(placed_texts: Callable) -> None:
    placed = placed_texts(chart_of("hostile words"))
    title = next(text for text, _ in placed if text.get_text() == grids.HOSTILE)
    assert title.get_parse_math() is False
    assert f"Ephemeris: DE440 · porkgrid 0.1.0 · {grids.HOSTILE}" in words(placed)


def test_a_thinned_grid_says_so_beside_kernel_and_version(placed_texts: Callable) -> None:
    thinned = "drawn from every 2. departure and every 3. arrival date"
    view = grids.usual(thinned=thinned, caution="Beware.")
    figure = draw_chart(view, grids.bests_of(view, C3), grids.candidates_of(view, C3, 1), C3, None)
    footer = f"Ephemeris: DE440 · porkgrid 0.1.0 · {thinned} · Beware."
    assert footer in words(placed_texts(figure))


def test_line_ends_in_a_name_become_blanks(placed_texts: Callable) -> None:
    view = grids.usual(title="one\ntwo\tthree\x00 four")
    figure = draw_chart(view, grids.bests_of(view, C3), grids.candidates_of(view, C3, 1), C3, None)
    assert "one two three four" in [text.get_text() for text, _ in placed_texts(figure)]


def test_a_survey_ranked_by_the_most_calls_the_greatest_best(placed_texts: Callable) -> None:
    view = grids.with_delivered_mass()
    bests = grids.bests_of(view, "delivered_mass_kg", "most")
    figure = draw_chart(view, bests, grids.candidates_of(view, C3, 0), "delivered_mass_kg", None)
    text = words(placed_texts(figure))
    assert f"greatest allowed delivered mass {np.nanmax(bests.departure_best):.1f} kg" in text
    assert "delivered mass (kg), higher is better" in text


def epoch_at(view: xr.Dataset, candidate: pd.Series) -> float:
    dates = {end: np.datetime64(str(candidate[end])) for end in ("departure", "arrival")}
    return view[FLYBY].sel(dates, method="nearest").item()


def date_chart(**dates: object) -> tuple[Figure, xr.Dataset, DayBests]:
    view = grids.with_flyby_dates(**dates)  # type: ignore[arg-type]
    bests = grids.bests_of(view, FLYBY)
    candidates = grids.candidates_of(view, C3, 4)
    epochs = [epoch_at(view, row) for _, row in candidates.iterrows()]
    return draw_chart(view, bests, candidates.assign(**{FLYBY: epochs}), FLYBY, C3), view, bests


@pytest.mark.parametrize("days_apart", [0.0, 0.002, 0.02, 0.4, 3.0, 40.0])
def test_an_epoch_is_drawn_as_calendar_dates_that_collide_with_nothing(
    days_apart: float, placed_texts: Callable, overlapping: Callable
) -> None:
    figure, _, _ = date_chart(days_apart=days_apart)
    placed = placed_texts(figure)
    assert overlapping(placed) == []
    text = words(placed)
    assert "flyby 1 date (TDB)" in text
    assert "earliest flyby 1 date" in text
    assert "is better" not in text
    assert "JD" not in text
    assert "24620" not in text  # no Julian date anywhere


def test_the_headline_and_the_table_of_an_epoch_give_its_days(placed_texts: Callable) -> None:
    figure, view, bests = date_chart()
    days = np.floor(bests.departure_best - 2_440_587.5).astype("datetime64[D]")
    at = int(np.nanargmin(bests.departure_best))
    leaving = bests.departure[at].astype("datetime64[D]")
    placed = placed_texts(figure)
    assert f"earliest allowed flyby 1 date {days[at]}, leaving {leaving}" in words(placed)
    candidates = grids.candidates_of(view, C3, 4)
    texts = [text.get_text() for text, _ in placed]
    for _, row in candidates.iterrows():
        day = np.datetime64("1970-01-01") + int(np.floor(epoch_at(view, row) - 2_440_587.5))
        assert str(day) in texts


def test_the_strips_reach_every_allowed_days_value_also_beyond_the_colours(placed_texts: Callable) -> None:
    view = grids.usual(c3_max=400)
    bests = grids.bests_of(view, C3)
    figure = draw_chart(view, bests, grids.candidates_of(view, C3, 3), C3, None)
    _, _, below, beside = figure.axes
    for axes, get_limits, best in (
        (below, below.get_ylim, bests.departure_best),
        (beside, beside.get_xlim, bests.arrival_best),
    ):
        low, high = get_limits()
        assert low <= np.nanmin(best)
        assert high >= np.nanmax(best)
        drawn = np.concatenate([np.concatenate(line.get_data()) for line in axes.lines])
        assert np.isin(best[np.isfinite(best)], drawn).all()
    scale = value_scale(view[C3].values[view["blocked_by"].values == 0], "least")
    assert scale is not None
    assert max(np.nanmax(bests.departure_best), np.nanmax(bests.arrival_best)) > scale.levels[-1]


def test_flight_time_guides_are_labelled_with_the_flight_time_at_their_end(placed_texts: Callable) -> None:
    view = grids.usual()
    figure = draw_chart(view, grids.bests_of(view, C3), grids.candidates_of(view, C3, 0), C3, None)
    panel = figure.axes[1]
    edge_days = panel.get_xlim()[1], panel.get_ylim()
    inches_per_day = (panel.get_window_extent().height / figure.dpi) / (edge_days[1][1] - edge_days[1][0])
    bottom = panel.get_window_extent().y0 / figure.dpi
    labels = [
        text
        for text, _ in placed_texts(figure)
        if text.get_text().endswith(" d")
        and text.get_text()[:-2].isdigit()
        and text.get_position()[0] > 7.8
        and text.get_rotation() == 0.0
        and text.get_position()[0] < 8.3
    ]
    assert len(labels) >= 3
    for label in labels:
        arrival = edge_days[1][0] + (label.get_position()[1] - bottom) / inches_per_day
        assert arrival - edge_days[0] == pytest.approx(float(label.get_text()[:-2]), abs=0.5)


def test_a_measure_that_is_not_stored_is_refused_by_name() -> None:
    view = grids.usual()
    with pytest.raises(KeyError, match="entry_speed"):
        draw_chart(view, grids.bests_of(view, C3), grids.candidates_of(view, C3, 0), "entry_speed_km_s", None)

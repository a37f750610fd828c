"""The small pieces that figures are built from."""

from __future__ import annotations

import numpy as np
import pytest
import synthetic_porkchop as grids

from porkgrid.figures.dates import (
    cell_edges,
    date_ticks,
    dates_around,
    dates_from_days,
    dates_from_iso,
    days_from_dates,
)
from porkgrid.figures.ground import ALLOWED, BEFORE_DEPARTURE, FIRST_LIMIT, OTHER_ALONE, SEVERAL, read_ground
from porkgrid.figures.hatches import hatch_coverage, hatch_tiles
from porkgrid.figures.levels import round_levels, value_scale, value_text
from porkgrid.figures.measured import plain_symbol
from porkgrid.figures.palette import LIMIT_COLOURS, depth_colours
from porkgrid.figures.placement import Box, Room, place_markers
from porkgrid.figures.raster import cut_turns, raster_for
from porkgrid.figures.strips import open_windows
from porkgrid.figures.text import pack, shorten, width_in, wrap


def luminance(rgb: np.ndarray) -> np.ndarray:
    """Relative luminance, WCAG 2 (IEC 61966-2-1)."""
    linear = np.where(rgb <= 0.04045, rgb / 12.92, ((rgb + 0.055) / 1.055) ** 2.4)
    return linear @ np.array([0.2126, 0.7152, 0.0722])


def test_the_value_ramp_grows_lighter_at_every_step_so_that_it_prints_in_grey() -> None:
    assert (np.diff(luminance(depth_colours(12))) > 0.01).all()


def test_limit_colours_differ_from_each_other() -> None:
    distance = np.linalg.norm(LIMIT_COLOURS[:, None] - LIMIT_COLOURS[None], axis=-1)
    assert distance[~np.eye(len(LIMIT_COLOURS), dtype=bool)].min() > 0.3


def test_hatches_differ_and_none_covers_most_of_its_ground() -> None:
    tiles = hatch_tiles()
    assert ((tiles.mean(axis=(1, 2)) > 0.05) & (tiles.mean(axis=(1, 2)) < 0.4)).all()
    for i in range(len(tiles)):
        for j in range(i):
            assert np.abs(tiles[i] - tiles[j]).mean() > 0.04


def test_a_picture_without_hatches_has_no_ink() -> None:
    assert not hatch_coverage(np.full((30, 50), -1)).any()


@pytest.mark.parametrize(("low", "high"), [(8.92, 61.3), (-30.2, 30.1), (2462000.5, 2462120.5), (1e-7, 3e-7)])
def test_levels_are_round_and_enclose_the_range_without_waste(low: float, high: float) -> None:
    levels = round_levels(low, high, 10)
    step = levels[1] - levels[0]
    assert 5 <= len(levels) <= 13
    assert levels[0] <= low < levels[1]
    assert levels[-2] < high <= levels[-1] + 1e-9 * abs(high)
    mantissa = step / 10 ** np.floor(np.log10(step) + 1e-9)
    assert min(abs(mantissa - nice) for nice in (1, 2, 2.5, 5)) < 1e-6


@pytest.mark.parametrize("value", [12.5, 0.0, -3.0, 2462000.5])
def test_a_constant_gets_one_band_around_it(value: float) -> None:
    levels = round_levels(value, value, 10)
    assert len(levels) == 2
    assert levels[0] <= value < levels[1]


def test_walls_do_not_stretch_the_scale_away_from_the_best_values() -> None:
    values = np.concatenate([np.linspace(9.0, 30.0, 600), np.linspace(100.0, 90_000.0, 400)])
    scale = value_scale(values, "least")
    assert scale is not None
    assert scale.levels[0] <= 9.0
    assert scale.levels[-1] < 60.0


def test_for_the_most_the_darkest_band_holds_the_greatest_value() -> None:
    values = np.linspace(0.0, 100.0, 400)
    for order, best in (("least", 0.0), ("most", 100.0)):
        scale = value_scale(values, order)
        assert scale is not None
        bands = luminance(scale.colours)
        assert bands[scale.band_of(np.array([best - 1e-6 * (order == "most")]))[0]] == bands.min()


def test_no_finite_value_gives_no_scale() -> None:
    assert value_scale(np.array([np.nan, np.inf]), "least") is None


def test_values_are_written_with_the_decimals_of_their_step() -> None:
    assert [value_text(v, s) for v, s in ((12.0, 2.5), (8.904, 0.01), (-30.0, 10.0), (0.0, 0.05))] == [
        "12.0",
        "8.90",
        "−30",
        "0.00",
    ]


@pytest.mark.parametrize("first", ["2028-10-15", "2028-12-31", "2029-01-01", "1969-12-25", "2032-02-29"])
@pytest.mark.parametrize(
    "span", [0.0, 0.4, 1.0, 3.0, 20.0, 45.0, 92.0, 124.0, 400.0, 1200.0, 5500.0, 40_000.0]
)
def test_round_dates_around_a_range_enclose_it_closely(first: str, span: float) -> None:
    start = float(days_from_dates(np.array([first], "datetime64[D]"))[0]) + 0.25
    marks = dates_around(start, start + span, 12)
    assert 2 <= len(marks) <= 16
    assert (np.diff(marks) > 0.0).all()
    assert marks[0] <= start < marks[1]
    assert marks[-2] < start + span <= marks[-1] or len(marks) == 2
    assert (marks[-1] - marks[0]) <= max(span, 1.0) + 2.0 * np.diff(marks).max()


@pytest.mark.parametrize("span", [0.4, 1.0, 3.0, 20.0, 45.0, 92.0, 124.0, 400.0, 1200.0, 5500.0, 40_000.0])
def test_date_ticks_are_few_inside_the_range_and_at_the_dates_they_name(span: float) -> None:
    first = float(days_from_dates(np.array(["2028-10-15"], "datetime64[D]"))[0]) - 0.5
    ticks, labels = date_ticks(first, first + span, 8)
    assert 2 <= len(ticks) <= 9
    assert first <= ticks[0] <= ticks[-1] <= first + span
    for tick, label in zip(ticks, labels, strict=True):
        if ":" in label:
            assert str(dates_from_days(tick).astype("datetime64[m]"))[11:] == label
        else:
            assert days_from_dates(np.array([label], "datetime64[ms]"))[0] == tick


def test_dates_with_and_without_a_time_of_day_are_read_together() -> None:
    dates = dates_from_iso(["2028-11-30", "2028-11-30T12:00"])
    assert dates[1] - dates[0] == np.timedelta64(12, "h")


def test_cell_edges_lie_half_way_between_dates_and_half_a_step_outside() -> None:
    np.testing.assert_array_equal(cell_edges(np.array([0.0, 2.0, 6.0])), [-1.0, 1.0, 4.0, 8.0])
    np.testing.assert_array_equal(cell_edges(np.array([5.0])), [4.5, 5.5])


def test_cells_are_sorted_by_the_limits_that_forbid_them() -> None:
    view = grids.usual()
    bits, kind = view["blocked_by"].values, read_ground(view).kind
    np.testing.assert_array_equal(kind == ALLOWED, bits == 0)
    np.testing.assert_array_equal(kind == FIRST_LIMIT + 1, bits == 16)
    np.testing.assert_array_equal(kind == SEVERAL, (bits != 0) & ((bits & (bits - 1)) != 0))


def test_arrival_before_departure_is_no_limit() -> None:
    view = grids.porkchop(grids.dates("2028-10-01", 60), grids.dates("2028-10-20", 60))
    ground = read_ground(view)
    assert ground.flags == ["C3 at most 25 km²/s²"]
    np.testing.assert_array_equal(ground.kind == BEFORE_DEPARTURE, view["blocked_by"].values == 1)


def test_the_limits_that_forbid_the_most_alone_get_the_hatches() -> None:
    row = np.arange(60)[:, None] + np.zeros((1, 30))
    limits = {f"l{k}": (f"limit {k}", (row >= k * (k + 1)) & (row < k * (k + 1) + k + 1)) for k in range(7)}
    view = grids.porkchop(
        grids.dates("2028-10-01", 60), grids.dates("2029-04-01", 30), limits=limits, c3_max=None
    )
    ground = read_ground(view)
    assert ground.hatched == [1, 2, 3, 4, 5, 6]
    assert ground.hatch_of(0) is None
    assert (ground.kind[0] == OTHER_ALONE).all()


def test_each_pixel_shows_the_cell_it_lies_in() -> None:
    view = grids.porkchop(grids.dates("2028-10-01", 4), grids.dates("2029-10-01", 3))
    raster = raster_for(view, 0.2, 0.15)  # ten pixels a cell
    picture = raster.cells(np.arange(12).reshape(4, 3))
    assert picture.shape == (30, 40)
    np.testing.assert_array_equal(picture[5::10, 5::10], np.arange(12).reshape(4, 3).T[::-1])


def test_values_between_cells_are_interpolated_and_missing_neighbours_are_not_spread() -> None:
    view = grids.porkchop(grids.dates("2028-10-01", 5), grids.dates("2029-10-01", 4))
    raster = raster_for(view, 0.25, 0.2)
    plane = raster.departure[:, None] + 2.0 * raster.arrival[None, :]
    smooth = raster.between(plane, "km/s")
    inner = smooth[6:-6, 6:-6]
    expected = raster.x_px[None, 6:-6] + 2.0 * raster.y_px[6:-6, None]
    np.testing.assert_allclose(inner, expected, rtol=1e-12)
    holed = plane.copy()
    holed[2, 1] = np.nan
    missing = ~np.isfinite(raster.between(holed, "km/s"))
    np.testing.assert_array_equal(missing, ~np.isfinite(raster.cells(holed)))


def test_an_angle_is_not_drawn_across_its_jump_from_360_to_0() -> None:
    angle = np.array([[350.0, 355.0, 1.0, 5.0]])
    np.testing.assert_array_equal(np.isnan(cut_turns(angle, "deg")), [[False, False, True, False]])
    np.testing.assert_array_equal(cut_turns(angle, "km/s"), angle)


def test_windows_are_the_runs_of_allowed_days_with_both_ends_counted() -> None:
    best = np.array([1.0, 2.0, np.nan, np.nan, 3.0, np.nan, 4.0, 5.0])
    windows = open_windows(grids.dates("2028-12-30", 8), best)
    assert [w.texts[0] for w in windows] == [
        "2028-12-30 – 2028-12-31 · 2 d",
        "2029-01-03 · 1 d",
        "2029-01-05 – 2029-01-06 · 2 d",
    ]


def test_a_window_of_steps_within_a_day_is_one_day_long() -> None:
    (window,) = open_windows(grids.dates("2028-12-30", 4, 0.25), np.ones(4))
    assert window.days == 1


def test_markers_in_one_place_spread_without_meeting_and_stay_inside() -> None:
    room = Room(Box(0.0, 0.0, 3.0, 2.0))
    places = place_markers([(1.5, 1.0)] * 20, [False] * 20, 0.2, room)
    assert None not in places
    assert places[0] == (1.5, 1.0)
    points = np.array(places, dtype=float)
    apart = np.abs(points[:, None] - points[None]).max(axis=-1)
    assert apart[~np.eye(20, dtype=bool)].min() >= 0.2 - 1e-12
    assert ((points >= 0.1) & (points <= [2.9, 1.9])).all()


def test_markers_that_find_no_room_are_dropped() -> None:
    places = place_markers([(0.15, 0.15)] * 3, [False] * 3, 0.2, Room(Box(0.0, 0.0, 0.3, 0.3)))
    assert places == [(0.15, 0.15), None, None]


def test_a_marker_that_would_hide_a_small_window_stands_beside_it() -> None:
    (place,) = place_markers([(1.0, 1.0)], [True], 0.2, Room(Box(0.0, 0.0, 2.0, 2.0)))
    assert place is not None
    assert np.hypot(place[0] - 1.0, place[1] - 1.0) > 0.1


def test_text_is_cut_to_its_room_and_no_shorter() -> None:
    text = "a_name_that_is_far_too_long_for_its_room"
    cut = shorten(text, 1.5, 9.0)
    assert cut.endswith("…")
    assert text.startswith(cut[:-1])
    one_letter_more = text[: len(cut)] + "…"
    assert width_in(cut, 9.0) <= 1.5 < width_in(one_letter_more, 9.0)
    assert shorten("short", 1.5, 9.0) == "short"


def test_wrapped_text_keeps_all_words_when_there_is_room() -> None:
    text = "one two three four five six seven"
    lines = wrap(text, 1.0, 9.0, 9)
    assert " ".join(lines) == text
    assert all(width_in(line, 9.0) <= 1.0 for line in lines)


def test_a_list_that_does_not_fit_counts_the_rest() -> None:
    items = [f"limit number {n}" for n in range(20)]
    lines = pack("Limits: ", items, 5.0, 8.5, 2)
    named = sum(line.count("limit number") for line in lines)
    assert 0 < named < 20
    assert lines[-1].endswith(f"… and {20 - named} more")
    assert len(lines) <= 2


@pytest.mark.parametrize(
    ("symbol", "text"),
    [
        ("$C_3$", "C3"),
        (r"total $\Delta v$", "total Δv"),
        (r"departure $v_\infty$", "departure v∞"),
        (r"Mars $L_s$ at arrival", "Mars Ls at arrival"),
        ("DLA", "DLA"),
    ],
)
def test_symbols_are_written_in_plain_letters(symbol: str, text: str) -> None:
    assert plain_symbol(symbol) == text

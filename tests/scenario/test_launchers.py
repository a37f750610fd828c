"""Launcher tables: what is read, how it is interpolated, and how every fault of a file is told."""

import warnings
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from porkgrid.scenario.launchers import Capability, DlaPenalty, read_capability, read_dla_penalty

DEMOS = Path(__file__).parents[2] / "scenarios" / "launchers"
HEADER = "c3_km2_s2,injected_mass_kg\n"
PENALTY = "dla_deg,mass_factor\n"


@pytest.fixture
def table(tmp_path):
    """A function that writes a table to a file."""

    def write(text):
        path = tmp_path / "puffin.csv"
        path.write_bytes(text if isinstance(text, bytes) else text.encode())
        return path

    return write


def refusals(read, path):
    """Faults of a file without its name, and that nothing was read beside them."""
    found, faults = read(path)
    assert found is None
    assert faults
    assert all(fault.startswith(f"{path}: ") and fault.isprintable() for fault in faults)
    return [fault.removeprefix(f"{path}: ") for fault in faults]


@st.composite
def capabilities(draw):
    """Tables of any steepness: steps of C3 and of mass over six decades."""
    count = draw(st.integers(2, 12))
    steps = st.lists(st.floats(1e-3, 1e3), min_size=count - 1, max_size=count - 1)
    c3 = np.cumsum([draw(st.floats(-60.0, 50.0)), *draw(steps)])
    mass = np.cumsum([draw(st.floats(0.0, 1e4)), *draw(steps)])[::-1]
    return Capability("any", Path("any.csv"), tuple(c3.tolist()), tuple(mass.tolist()))


@settings(deadline=None)  # the first call imports scipy
@given(capabilities())
def test_the_interpolated_mass_passes_through_the_rows(capability):
    mass = capability.mass_kg(capability.c3_km2_s2)
    np.testing.assert_allclose(mass, capability.injected_mass_kg, rtol=1e-12, atol=1e-9)


@settings(deadline=None)
@given(capabilities(), st.integers(0, 2**32 - 1))
def test_the_interpolated_mass_never_rises_and_stays_between_its_neighbours(capability, seed):
    c3, mass = np.array(capability.c3_km2_s2), np.array(capability.injected_mass_kg)
    between = np.sort(np.random.default_rng(seed).uniform(c3[0], c3[-1], 500))
    found = capability.mass_kg(between)
    rounding = 1e-12 * mass[0]
    assert np.all(np.diff(found) <= rounding)
    row = np.searchsorted(c3, between, side="right") - 1
    assert np.all(found <= mass[row] + rounding)
    assert np.all(found >= mass[np.minimum(row + 1, len(mass) - 1)] - rounding)
    assert found.min() >= mass[-1]


@settings(deadline=None)
@given(capabilities(), st.floats(1e-6, 1e6))
def test_there_is_no_mass_outside_the_table(capability, beyond):
    c3 = capability.c3_km2_s2
    outside = capability.mass_kg([c3[0] - beyond, c3[-1] + beyond, np.nan, np.inf, -np.inf])
    assert np.isnan(outside).all()


def test_two_rows_are_joined_by_a_straight_line(table):
    capability, _ = read_capability(table(HEADER + "0,2000\n10,1000\n"))
    assert capability.mass_kg([0.0, 2.5, 5.0, 10.0]) == pytest.approx([2000.0, 1750.0, 1500.0, 1000.0])


def test_rounding_leaves_no_mass_below_nothing_at_the_end_of_the_table(table):
    """Unmended, the cubic of these rows ends at −1.1e-13 kg."""
    capability, _ = read_capability(table(HEADER + "10.4,664\n19.1,0\n"))
    assert float(capability.mass_kg(19.1)) == 0.0


def test_a_smooth_curve_is_met_better_than_by_straight_lines(table):
    c3 = np.linspace(0.0, 60.0, 13)
    curve = 3000.0 * np.exp(-c3 / 40.0)
    capability, _ = read_capability(
        table(HEADER + "".join(f"{x},{y}\n" for x, y in zip(c3, curve, strict=True)))
    )
    fine = np.linspace(0.0, 60.0, 601)
    exact = 3000.0 * np.exp(-fine / 40.0)
    error = np.abs(capability.mass_kg(fine) - exact).max()
    assert error < 0.2 * np.abs(np.interp(fine, c3, curve) - exact).max()


def test_a_grid_of_c3_gives_a_grid_of_masses_and_says_nothing_of_what_is_outside():
    capability, _ = read_capability(DEMOS / "kittiwake-medium.csv")
    grid = np.array([[0.0, 10.0, np.nan], [20.0, 1e9, -1e9]], dtype=np.float32)
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        mass = capability.mass_kg(grid)
    assert mass.shape == grid.shape
    np.testing.assert_array_equal(np.isnan(mass), [[False, False, True], [False, True, True]])
    assert float(capability.mass_kg(10.0)) == mass[0, 1]


def test_comments_blank_lines_spaces_quotes_and_line_ends_do_not_change_a_table(table):
    plain, _ = read_capability(table(HEADER + "0,2400\n10.5,0\n"))
    rows = '0.0 , "2.4e3"\r\n  # more\r\n"10.5",-0\r\n\n'
    text = f"\ufeff# a note, with; marks\r\n\r\n {HEADER.strip()} \r\n{rows}"
    decorated, faults = read_capability(table(text))
    assert faults == []
    assert decorated == plain
    assert hash(decorated) == hash(plain)
    assert decorated == plain
    assert (plain.c3_km2_s2, plain.injected_mass_kg) == ((0.0, 10.5), (2400.0, 0.0))


def test_tables_are_equal_by_their_numbers_not_by_their_place(tmp_path):
    for name, last in (("auk.csv", 900), ("gull.csv", 900), ("tern.csv", 901)):
        (tmp_path / name).write_text(f"{HEADER}0,1000\n10,{last}\n")
    auk, gull, tern = (read_capability(tmp_path / f"{name}.csv")[0] for name in ("auk", "gull", "tern"))
    assert (auk.name, gull.name) == ("auk", "gull")
    assert auk == gull
    assert len({auk, gull, tern}) == 2


def test_all_faults_of_a_table_are_told_in_the_order_of_its_lines(table):
    text = HEADER + "0,2350\n\n5,2400\n5,24x0\n5,2000\n12;3\n13,nan\n14,-4\n15\n16,,\n17,\n"
    assert refusals(read_capability, table(text)) == [
        "line 4: injected_mass_kg 2400 is not less than the 2350 of line 2; mass must fall as C3 grows",
        'line 5: injected_mass_kg is the text "24x0"; give a plain number such as 2400 or 10.5',
        "line 6: c3_km2_s2 5 is not more than the 5 of line 4; rows must go up in c3_km2_s2",
        "line 7: holds a semicolon; separate values with commas and write decimals with a point: 10.5,2400",
        "line 8: injected_mass_kg is nan; give a finite number",
        "line 9: injected_mass_kg must be 0 or more, not -4",
        "line 10: has one value; give 2: c3_km2_s2,injected_mass_kg",
        "line 11: has 3 values; give 2: c3_km2_s2,injected_mass_kg",
        "line 12: injected_mass_kg is empty; give a number",
    ]


@pytest.mark.parametrize(
    ("text", "fault"),
    [
        (HEADER + "0,2400\n", "has one row under the header; give at least two"),
        (HEADER, "has no rows under the header; give at least two"),
        ("", "holds no table; give the header c3_km2_s2,injected_mass_kg and at least two rows"),
        ("# only a note\n", "holds no table"),
        ("0,2\n5,1\n", "line 1: numbers, where the header is missing; put c3_km2_s2,injected_mass_kg above"),
        ("c3,mass\n0,2\n5,1\n", 'line 1: the header must be c3_km2_s2,injected_mass_kg, not "c3,mass"'),
        ("injected_mass_kg,c3_km2_s2\n2,0\n", "line 1: the header must be c3_km2_s2,injected_mass_kg"),
        ("c3_km2_s2;injected_mass_kg\n", "line 1: holds a semicolon; the header must be c3_km2_s2,inj"),
        (HEADER + "0,2\n1,1_0\n", 'line 3: injected_mass_kg is the text "1_0"; give a plain number'),
        (HEADER + "0,2\n٣,1\n", 'line 3: c3_km2_s2 is the text "٣"; give a plain number'),
        (HEADER + "0,2\n1e400,1\n", "line 3: c3_km2_s2 is 1e400; give a number of at most 1e+12"),
        (HEADER + "0,2\n1e-300,1\n", "line 3: c3_km2_s2 must be at least 1e-06 above that of line 2"),
        (HEADER + "0,2\n1,2\n", "line 3: injected_mass_kg 2 is not less than the 2 of line 2"),
        (HEADER + "0,0\n1,-1\n", "line 3: injected_mass_kg must be 0 or more, not -1"),
        (HEADER + '0,2\n"1,1\n2,0\n', "line 3: is not CSV (unexpected end of data); numbers need no quotes"),
        (HEADER + "0,2\n1,\x1b[31m\n", 'line 3: injected_mass_kg is the text "\\x1b[31m"; give a plain'),
        (HEADER.encode() + b"0,2\n1,\xb2\n", "line 3: is not UTF-8 text (byte 0xb2); save the file as UTF-8"),
        (b"\0" * 1_000_001, "is larger than a megabyte; give a table of at most 10000 rows"),
        (HEADER + "1,1\n" * 10_001, "has 10001 rows; give 10000 or fewer"),
    ],
)
def test_a_bad_table_is_refused_with_its_line_and_what_would_be_right(table, text, fault):
    faults = refusals(read_capability, table(text))
    assert len(faults) == 1
    assert faults[0].startswith(fault)


def test_the_rows_under_a_forgotten_header_are_checked_too(table):
    faults = refusals(read_capability, table("0,2000\n5,2100\n"))
    assert [fault.partition(":")[0] for fault in faults] == ["line 1", "line 2"]


def test_a_file_of_another_kind_is_not_told_line_by_line_to_its_end(table):
    faults = refusals(read_capability, table(HEADER + "prose\n" * 500))
    assert len(faults) == 21
    assert faults[-1] == "faults not shown: 480; mend these first"


def test_as_many_rows_as_are_allowed_are_read(table):
    capability, faults = read_capability(
        table(HEADER + "".join(f"{n},{10_000 - n}\n" for n in range(10_000)))
    )
    assert faults == []
    assert float(capability.mass_kg(4321.5)) == pytest.approx(5678.5)


def test_a_missing_file_is_told_with_the_nearest_name_beside_it(tmp_path):
    (tmp_path / "puffin.csv").write_text(HEADER)
    assert refusals(read_capability, tmp_path / "pufin.csv") == [
        f"no such file; did you mean {tmp_path / 'puffin.csv'}?"
    ]
    assert "header c3_km2_s2,injected_mass_kg" in refusals(read_capability, tmp_path / "none" / "x.csv")[0]
    assert "header dla_deg,mass_factor" in refusals(read_dla_penalty, tmp_path / "zzz")[0]


def test_what_is_no_regular_file_is_refused_without_waiting_for_it(tmp_path):
    assert refusals(read_capability, tmp_path) == ["is a folder; give a CSV file"]
    assert refusals(read_capability, Path("/dev/zero")) == ["is no file; give a CSV file"]
    assert "is not a possible file name" in read_capability(tmp_path / "a\0b")[1][0]


def test_a_penalty_counts_declination_alike_north_and_south_and_ends_with_its_table(table):
    penalty, faults = read_dla_penalty(table(PENALTY + "0,1\n28.5,1\n40,0.9\n57,0.7\n"))
    assert faults == []
    found = penalty.factor([0.0, -28.5, 20.0, 40.0, -40.0, 57.0, -57.1, 90.0, np.nan])
    assert found[:6] == pytest.approx([1.0, 1.0, 1.0, 0.9, 0.9, 0.7])
    assert np.isnan(found[6:]).all()
    assert found[:6].max() <= 1.0


def test_a_penalty_never_eases_with_declination():
    penalty, _ = read_dla_penalty(DEMOS / "kittiwake-heavy-dla.csv")
    factor = penalty.factor(np.linspace(0.0, penalty.dla_deg[-1], 2001))
    assert np.all(np.diff(factor) <= 0.0)
    assert factor[0] == 1.0


def test_all_faults_of_a_penalty_are_told(table):
    rising = "the factor must not rise as the declination grows"
    text = PENALTY + "5,0.9\n30,1.2\n20,0\n95,0.5\n"
    assert refusals(read_dla_penalty, table(text)) == [
        "line 2: the first row must be at dla_deg 0, not 5",
        "line 3: mass_factor must be above 0 and at most 1, not 1.2",
        f"line 3: mass_factor 1.2 is more than the 0.9 of line 2; {rising}",
        "line 4: mass_factor must be above 0 and at most 1, not 0",
        "line 4: dla_deg 20 is not more than the 30 of line 3; rows must go up in dla_deg",
        "line 5: dla_deg must be 0 to 90, one row for north and south, not 95",
        f"line 5: mass_factor 0.5 is more than the 0 of line 4; {rising}",
    ]


def test_penalties_are_equal_by_their_numbers(table):
    first, _ = read_dla_penalty(table(PENALTY + "0,1\n60,0.5\n"))
    again, _ = read_dla_penalty(table("# again\n" + PENALTY + "0,1.0\n60.0,.5\n"))
    other, _ = read_dla_penalty(table(PENALTY + "0,1\n60,0.6\n"))
    assert isinstance(first, DlaPenalty)
    assert first == again
    assert first != other


@pytest.mark.parametrize("name", ["kittiwake-medium", "kittiwake-heavy"])
def test_the_demo_launchers_say_that_they_are_invented_and_fall_smoothly(name):
    capability, faults = read_capability(DEMOS / f"{name}.csv")
    assert faults == []
    assert "invented" in (DEMOS / f"{name}.csv").read_text().splitlines()[0]
    c3, mass = np.array(capability.c3_km2_s2), np.array(capability.injected_mass_kg)
    slopes = np.diff(mass) / np.diff(c3)
    assert np.all(np.diff(slopes) > -1.0)  # kg per km²/s²: convex but for the rounding to 5 kg

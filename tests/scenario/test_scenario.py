"""What read_scenario understands of a file, and what it says of a file that is wrong in itself."""

from __future__ import annotations

from datetime import date, datetime
from pathlib import Path

import numpy as np
import pytest

from porkgrid.scenario import BodySpec, Draft, Encounter, Scenario, body_of, read_scenario

PLAIN = """
name = "Wren to Mars"

[[encounter]]
body = "earth"
first = 2028-10-15
last = 2029-02-15

[[encounter]]
body = "mars"
first = 2029-05-01
last = 2030-03-31
"""

WITH_FLYBY = """
name = "Wren by way of Venus"
[[encounter]]
body = "earth"
first = 2028-10-15
last = 2029-02-15
[[encounter]]
body = "venus"
first = 2029-03-01
last = 2029-08-01
[[encounter]]
body = "mars"
first = 2029-09-01
last = 2030-03-31
"""

CLOSED = """
epoch = 2030-01-01
a_au = 1.2
e = 0.1
i_deg = 3
node_deg = 10
argument_deg = 20
mean_anomaly_deg = 30
"""


@pytest.fixture
def read(tmp_path: Path):
    def read_text(text: str | bytes) -> Draft:
        path = tmp_path / "wren.toml"
        path.write_bytes(text.encode() if isinstance(text, str) else text)
        return read_scenario(path)

    return read_text


@pytest.fixture
def faults(read):
    """The faults of a text, as {key: sentence}."""
    return lambda text: {fault.key: fault.text for fault in read(text).faults}


def encounter(**keys) -> Encounter:
    return Encounter(**({"body": "mars", "first": date(2030, 1, 1), "last": date(2030, 1, 11)} | keys))


def accepted(draft: Draft) -> Scenario:
    assert draft.faults == ()
    assert draft.scenario is not None
    return draft.scenario


# What a right file becomes


def test_a_plain_file_gets_the_defaults(read):
    scenario = accepted(read(PLAIN))
    assert [each.step_days for each in scenario.encounters] == [1.0, 1.0]
    assert [(leg.max_revs, leg.retrograde) for leg in scenario.legs] == [(0, False)]
    rank = scenario.rank
    assert (rank.by, rank.order, rank.keep, rank.apart_days) == (None, None, 20, 10.0)
    assert scenario.measures is None
    assert scenario.limits == {}


def test_the_text_of_the_file_is_kept_as_given(read):
    assert accepted(read(PLAIN)).text == PLAIN


def test_dates_and_date_times_stay_what_they_are(read):
    text = PLAIN.replace("first = 2029-05-01", "first = 2029-05-01T06:30:00")
    assert accepted(read(text)).encounters[1].first == datetime(2029, 5, 1, 6, 30)


def test_an_encounter_between_the_ends_is_a_flyby_with_the_usual_bounds(read):
    first, middle, last = accepted(read(WITH_FLYBY)).encounters
    assert middle.flyby is not None
    assert (middle.flyby.min_altitude_km, middle.flyby.max_burn_km_s) == (None, 0.2)
    assert first.flyby is None
    assert last.flyby is None


def test_kernels_are_looked_for_beside_the_scenario(read, tmp_path):
    scenario = accepted(read('kernels = ["sky/a.bsp", "/b.bsp"]' + PLAIN))
    assert scenario.kernels == (tmp_path / "sky/a.bsp", Path("/b.bsp"))


def test_a_byte_order_mark_and_windows_line_ends_are_fine(read):
    accepted(read(b"\xef\xbb\xbf" + PLAIN.replace("\n", "\r\n").encode()))


@pytest.mark.parametrize(
    ("name", "slug"),
    [
        ("Wren to Mars, 2028", "wren-to-mars-2028"),
        ("  Étoile // Übung  ", "etoile-ubung"),
        ("../../etc/passwd", "etc-passwd"),
        ("火星へ", "火星へ"),
    ],
)
def test_the_slug_is_a_name_for_one_folder(read, name, slug):
    assert accepted(read(PLAIN.replace("Wren to Mars", name))).slug == slug


# Dates of a window


def test_a_window_has_both_its_ends():
    jd = encounter().epochs_jd()
    # 2000-01-01 12:00 is JD 2451545.0 (the definition of J2000), 10957.5 days before 2030-01-01 00:00
    assert jd[0] == 2451545.0 - 0.5 + 10958
    assert np.array_equal(np.diff(jd), np.ones(10))


def test_a_step_that_does_not_divide_the_window_stops_short_of_its_end():
    assert len(encounter(step_days=3.0).epochs_jd()) == 4  # days 0, 3, 6, 9 of 10


def test_a_step_of_a_tenth_reaches_the_end_in_spite_of_rounding():
    assert len(encounter(step_days=0.1).epochs_jd()) == 101


def test_a_step_longer_than_the_window_leaves_one_date():
    assert len(encounter(step_days=500.0).epochs_jd()) == 1


def test_a_window_of_one_day_is_one_date():
    assert len(encounter(last=date(2030, 1, 1)).epochs_jd()) == 1


# Bodies of the user's own


def spec(**keys) -> BodySpec:
    base = {"epoch": date(2030, 1, 1), "e": 0.0, "i_deg": 0.0, "node_deg": 0.0, "argument_deg": 0.0}
    return BodySpec(**(base | keys))


def test_a_quarter_turn_of_mean_anomaly_at_one_au_is_a_quarter_of_the_gaussian_year():
    elements = body_of("heron", spec(a_au=1.0, mean_anomaly_deg=90.0)).elements
    assert elements is not None
    # Gaussian year 365.2568983 days: IAU 1938 definition of the Gaussian constant (memory)
    assert elements.epoch_jd - elements.perihelion_jd == pytest.approx(365.2568983 / 4, abs=1e-5)


def test_mean_anomaly_past_half_a_turn_counts_to_the_perihelion_ahead():
    elements = body_of("heron", spec(a_au=1.0, mean_anomaly_deg=270.0)).elements
    assert elements is not None
    assert elements.perihelion_jd - elements.epoch_jd == pytest.approx(365.2568983 / 4, abs=1e-5)


def test_semi_major_axis_and_eccentricity_give_the_perihelion_distance():
    elements = body_of("heron", spec(a_au=2.0, e=0.25, mean_anomaly_deg=0.0)).elements
    assert elements is not None
    assert elements.q_au == 1.5


def test_a_parabola_is_taken_by_its_perihelion():
    elements = body_of("heron", spec(q_au=0.8, e=1.0, perihelion=date(2031, 1, 1))).elements
    assert elements is not None
    assert (elements.q_au, elements.perihelion_jd - elements.epoch_jd) == (0.8, 365.0)


def with_body(keys: str, name: str = "heron") -> str:
    return PLAIN + f"[bodies.{name}]\n" + keys


def test_bodies_by_elements_and_by_number_are_accepted(read):
    text = with_body(CLOSED) + "[bodies.egret]\nnaif_id = 20000433\ngm_km3_s2 = 4.5e-4"
    bodies = accepted(read(text)).own_bodies
    assert bodies["heron"].motion == "two-body elements"
    assert (bodies["egret"].motion, bodies["egret"].naif_id) == ("kernel", 20000433)


@pytest.mark.parametrize(
    ("old", "new", "key", "says"),
    [
        ("a_au = 1.2", "a_au = 1.2\nq_au = 1.1", "a_au", "keep one"),
        ("a_au = 1.2", "", "q_au", "give q_au or a_au"),
        ("a_au = 1.2", "a_au = -1.2", "a_au", "above 0"),
        ("a_au = 1.2", "q_au = -1.2", "q_au", "not the number -1.2"),
        ("a_au = 1.2", "a_au = 0.005", "a_au", "inside the Sun"),
        ("e = 0.1", "e = -0.1", "e", "0 or more"),
        ("e = 0.1", "e = 1.1", "a_au", "give q_au and perihelion"),
        ("e = 0.1", "e = 1", "mean_anomaly_deg", "give perihelion"),
        ("e = 0.1", "", "e", "missing"),
        ("e = 0.1", "e = inf", "e", "finite"),
        ("i_deg = 3", "i_deg = 181", "i_deg", "180 or less"),
        ("mean_anomaly_deg = 30", "", "perihelion", "mean_anomaly_deg"),
        (
            "mean_anomaly_deg = 30",
            "mean_anomaly_deg = 30\nperihelion = 2030-01-01",
            "mean_anomaly_deg",
            "one",
        ),
        ("epoch = 2030-01-01", "", "epoch", "missing"),
        ("epoch = 2030-01-01", "epoch = 2462502.5", "epoch", "bare date"),
        ("e = 0.1", "e = 0.1\nnaif_id = 77", "naif_id", "one or the other"),
        ("e = 0.1", "e = 0.1\nH = 20", "H", "no such key"),
    ],
)
def test_elements_that_do_not_make_an_orbit_are_refused(faults, old, new, key, says):
    assert old in CLOSED
    found = faults(with_body(CLOSED.replace(old, new)))
    assert says in found[f"bodies.heron.{key}"]


def test_a_body_of_nothing_is_refused(faults):
    assert "give naif_id, or elements" in faults(with_body("gm_km3_s2 = 1.0"))["bodies.heron"]


@pytest.mark.parametrize(
    ("name", "says"),
    [
        ("earth", "built-in"),
        ("MARS", "built-in"),
        ('"4"', "not a name"),
        ('""', "not a name"),
        ('" a"', "blanks"),
    ],
)
def test_names_of_bodies_that_would_mislead_are_refused(read, name, says):
    assert any(says in fault.text for fault in read(with_body(CLOSED, name)).faults)


def test_names_of_bodies_that_differ_in_capitals_only_are_refused(faults):
    found = faults(with_body(CLOSED) + "[bodies.Heron]" + CLOSED)
    assert "capitals only" in found["bodies.Heron"]


def test_the_number_of_a_built_in_body_is_refused_under_another_name(faults):
    assert '"earth"' in faults(with_body("naif_id = 399"))["bodies.heron.naif_id"]


# Files that are no scenario


def test_a_missing_file_is_a_fault(tmp_path):
    (fault,) = read_scenario(tmp_path / "absent.toml").faults
    assert fault.key == ""
    assert "no such file" in fault.text


def test_a_missing_suffix_is_noticed(tmp_path):
    (tmp_path / "wren.toml").write_text(PLAIN)
    assert "wren.toml?" in read_scenario(tmp_path / "wren").faults[0].text


def test_a_folder_is_a_fault(tmp_path):
    assert "folder" in read_scenario(tmp_path).faults[0].text


def test_an_impossible_path_is_a_fault():
    assert read_scenario("a\0b").faults[0].text
    assert read_scenario("x" * 5000).faults[0].text


@pytest.mark.parametrize("text", ["", "  \n\n", "\ufeff"])
def test_an_empty_file_is_a_fault(read, text):
    assert "empty" in read(text).faults[0].text


def test_a_file_of_comments_only_lacks_its_sections(faults):
    found = faults("# nothing yet\n")
    assert "missing" in found["name"]
    assert "missing" in found["encounter"]


def test_a_file_in_another_encoding_is_a_fault_at_its_line(read):
    (fault,) = read(b'# one\nname = "\xe9toile"\n').faults
    assert "line 2" in fault.text
    assert "0xe9" in fault.text


def test_a_huge_file_is_not_read(read):
    assert "megabyte" in read("#" * 1_000_001).faults[0].text


@pytest.mark.parametrize(
    ("text", "place"),
    [
        ("name = Wren", "line 1, column 8"),
        ("\n\nname = 'a\n", "line 3, column 10"),
        ("name = 'a'\nname = 'b'\n# more", "line 2, column 11"),
        ("a = 1\nb =", "line 2, column 4"),
        ("first = 2028-1-1\n", "line 1, column 13"),
    ],
)
def test_a_syntax_error_is_told_by_line_and_column(read, text, place):
    (fault,) = read(text).faults
    assert fault.key == place


def test_numbers_and_nesting_that_python_cannot_take_are_faults(read):
    assert "digits" in read("a = " + "9" * 5000).faults[0].text
    assert "deep" in read("a = " + "[" * 100_000).faults[0].text
    assert read(PLAIN.replace('"mars"', "0x" + "f" * 5000)).faults


# Keys and values at fault, each against the same right file


@pytest.mark.parametrize(
    ("old", "new", "key", "says"),
    [
        ('name = "Wren to Mars"', "", "name", "missing"),
        ('"Wren to Mars"', "5", "name", "must be a text in quotes, not the number 5"),
        ('"Wren to Mars"', '"!?"', "name", "letter or digit"),
        ('"Wren to Mars"', '"a\\nb"', "name", "one line"),
        ('"Wren to Mars"', f'"{"w" * 81}"', "name", "81 characters"),
        ('"Wren to Mars"', '"Wren"\nencounters = 1', "encounters", 'did you mean "encounter"?'),
        ('"Wren to Mars"', '"Wren"\nqqqq = 1', "qqqq", "valid here: name,"),
        ('"Wren to Mars"', '"Wren"\nkernels = "a.bsp"', "kernels", "must be a list"),
        ('"Wren to Mars"', '"Wren"\nkernels = ["a", 7]', "kernels", "entry 2 must be a text"),
        ('"Wren to Mars"', '"Wren"\nmeasures = []', "measures", "an empty list"),
        ('"Wren to Mars"', '"Wren"\nmeasures = ["tof_days", "tof_days"]', "measures", "twice"),
        ('"Wren to Mars"', '"Wren"\nleg = 3', "leg", "[[leg]]"),
        ('"Wren to Mars"', '"Wren"\nrank = "c3"', "rank", "must be a table"),
        ('"Wren to Mars"', '"Wren"\nlimits = [1]', "limits", "must be a table"),
        ('"Wren to Mars"', '"Wren"\nbodies = 1', "bodies", "must be a table"),
        ('body = "earth"', "", "encounter 1, body", "missing"),
        ('body = "earth"', "body = 3.99", "encounter 1, body", "the number 3.99"),
        ('body = "earth"', "body = true", "encounter 1, body", "the truth value true"),
        ('body = "earth"', 'Body = "earth"', "encounter 1, Body", 'did you mean "body"?'),
        ("first = 2028-10-15", "", "encounter 1, first", "missing; give for example first = 2028-11-30"),
        ("2028-10-15", '"2028-10-15"', "encounter 1, first", "without quotes"),
        ("2028-10-15", "20281015", "encounter 1, first", "the number 20281015"),
        ("2028-10-15", "12:00:00", "encounter 1, first", "the time of day 12:00:00"),
        ("2028-10-15", "2028-10-15T00:00:00Z", "encounter 1, first", "UTC offset"),
        ("2028-10-15", "2028-10-15T00:00:00+01:00", "encounter 1, first", "write 2028-10-15T00:00:00"),
        ("2029-02-15", "2028-02-15", "encounter 1, last", "2028-02-15 is before first, 2028-10-15"),
        ("2029-02-15", "2028-10-14T23:59:59", "encounter 1, last", "before first"),
        ("2029-02-15", "2029-02-15\nstep_days = 0", "encounter 1, step_days", "above 0"),
        ("2029-02-15", "2029-02-15\nstep_days = -1", "encounter 1, step_days", "above 0"),
        ("2029-02-15", "2029-02-15\nstep_days = nan", "encounter 1, step_days", "finite"),
        ("2029-02-15", "2029-02-15\nstep_days = inf", "encounter 1, step_days", "finite"),
        ("2029-02-15", '2029-02-15\nstep_days = "1"', "encounter 1, step_days", 'a number, not the text "1"'),
        ("2029-02-15", "2029-02-15\nstep_days = 1e-300", "encounter 1, step_days", "finer than a second"),
        ("2029-02-15", "2029-02-15\nstep_days = 0.0001", "encounter 1, step_days", "1,000,000 dates"),
        ("2029-02-15", "9999-12-31", "encounter 1, step_days", "1,000,000 dates"),
        ("2029-02-15", "2029-02-15\nflyby = {}", "encounter 1, flyby", "between the first and the last"),
        ("2029-02-15", "2029-02-15\ncapture = {}", "encounter 1, capture", "last encounter"),
        ("2030-03-31", "2030-03-31\nparking = {}", "encounter 2, parking", "first encounter"),
        ("2030-03-31", "2030-03-31\nflyby = {}", "encounter 2, flyby", "between the first and the last"),
        ("2030-03-31", "2030-03-31\n[[leg]]\n[[leg]]", "leg", "2 given for 2 encounters; give 1"),
        ("2030-03-31", "2030-03-31\n[[leg]]\nmax_revs = -1", "leg 1, max_revs", "0 or more"),
        ("2030-03-31", "2030-03-31\n[[leg]]\nmax_revs = 1.0", "leg 1, max_revs", "a whole number"),
        ("2030-03-31", "2030-03-31\n[[leg]]\nmax_revs = 1000", "leg 1, max_revs", "20 or less"),
        ("2030-03-31", "2030-03-31\n[[leg]]\nretrograde = 1", "leg 1, retrograde", "true or false"),
        ("2030-03-31", "2030-03-31\n[leg]", "leg", "double brackets"),
        ("2030-03-31", "2030-03-31\n[limits]\ntof_days = 300", "limits.tof_days", "{ max = 25 }"),
        ("2030-03-31", "2030-03-31\n[limits]\ntof_days = {}", "limits.tof_days.max", "neither min nor max"),
        (
            "2030-03-31",
            "2030-03-31\n[limits.tof_days]\nmin = 2\nmax = 1",
            "limits.tof_days.max",
            "below min, 2",
        ),
        ("2030-03-31", "2030-03-31\n[limits.tof_days]\nmost = 1", "limits.tof_days.most", "no such key"),
        ("2030-03-31", "2030-03-31\n[limits.tof_days]\nmax = inf", "limits.tof_days.max", "finite"),
        ("2030-03-31", '2030-03-31\n[rank]\norder = "lest"', "rank.order", "must be 'least' or 'most'"),
        ("2030-03-31", "2030-03-31\n[rank]\nkeep = 0", "rank.keep", "1 or more"),
        ("2030-03-31", "2030-03-31\n[rank]\nkeep = 2.5", "rank.keep", "a whole number"),
        ("2030-03-31", "2030-03-31\n[rank]\napart_days = -1", "rank.apart_days", "0 or more"),
        ("2030-03-31", "2030-03-31\n[rank]\napart = 3", "rank.apart", 'did you mean "apart_days"?'),
        ("2030-03-31", "2030-03-31\n[rank]\nby = 3", "rank.by", "text in quotes"),
    ],
)
def test_a_wrong_value_is_named_with_its_key_and_what_would_be_right(faults, old, new, key, says):
    assert old in PLAIN
    assert says in faults(PLAIN.replace(old, new))[key]


@pytest.mark.parametrize(
    ("orbit", "key", "says"),
    [
        ("{ periapsis_altitude_km = -1, apoapsis_altitude_km = 5 }", "periapsis_altitude_km", "0 or more"),
        ("{ periapsis_altitude_km = 400, apoapsis_altitude_km = 300 }", "apoapsis_altitude_km", "swap"),
        ("{ periapsis_altitude_km = 400 }", "apoapsis_altitude_km", "missing"),
        ("{ periapsis_altitude = 400 }", "periapsis_altitude", '"periapsis_altitude_km"'),
        ("{ inclination_deg = 181 }", "inclination_deg", "180 or less"),
    ],
)
def test_a_parking_orbit_that_cannot_be_is_refused(faults, orbit, key, says):
    text = PLAIN.replace("2029-02-15", f"2029-02-15\nparking = {orbit}")
    assert says in faults(text)[f"encounter 1, parking.{key}"]


def test_an_orbit_that_is_no_table_is_shown_one(faults):
    text = PLAIN.replace("2030-03-31", "2030-03-31\ncapture = 400")
    assert "{ periapsis_altitude_km = 400," in faults(text)["encounter 2, capture"]


def test_one_encounter_is_no_route(faults):
    assert "only one" in faults(PLAIN[: PLAIN.rindex("[[")])["encounter"]


def test_single_brackets_are_explained(faults):
    text = 'name = "Wren"\n[encounter]\nbody = "earth"\n'
    assert "[[encounter]] in double brackets" in faults(text)["encounter"]


def test_a_route_of_eleven_encounters_is_refused(faults):
    one = WITH_FLYBY.split("[[encounter]]")[2]
    assert "10 or fewer" in faults('name = "Wren"\n' + ("[[encounter]]" + one) * 11)["encounter"]


def test_limits_beyond_the_bits_of_a_flag_are_refused(faults):
    def limits(count: int) -> str:
        return PLAIN + "[limits]\n" + "".join(f"m{n} = {{ max = 1 }}\n" for n in range(count))

    assert "limits" not in faults(limits(28))
    assert "29 are given; give 28 or fewer" in faults(limits(29))["limits"]


def test_faults_of_every_section_are_found_in_one_reading(faults):
    text = """
    nam = "Wren"
    measures = 4
    [[encounter]]
    body = 1.5
    first = "soon"
    last = 2029-02-15
    step_days = 0
    parking = { periapsis_altitude_km = -4, apoapsis_altitude_km = "far" }
    [[encounter]]
    body = "mars"
    first = 2029-05-01
    last = 2028-03-31
    step_days = nan
    [[leg]]
    max_revs = "none"
    [limits]
    tof_days = {}
    [rank]
    keep = 0
    [bodies.heron]
    e = -1
    """
    assert set(faults(text)) >= {
        "nam",
        "name",
        "measures",
        "encounter 1, body",
        "encounter 1, first",
        "encounter 1, step_days",
        "encounter 1, parking.periapsis_altitude_km",
        "encounter 1, parking.apoapsis_altitude_km",
        "encounter 2, last",
        "encounter 2, step_days",
        "leg 1, max_revs",
        "limits.tof_days.max",
        "rank.keep",
        "bodies.heron.e",
        "bodies.heron.epoch",
        "bodies.heron.q_au",
    }


def test_what_is_right_is_kept_where_something_is_wrong(read):
    draft = read(PLAIN.replace("last = 2029-02-15", "last = true") + "[limits]\ntof_days = {}")
    assert draft.scenario is None
    assert draft.outlines[0].body == "earth"
    assert draft.outlines[0].first == date(2028, 10, 15)
    assert draft.outlines[0].last is None
    assert draft.limits == ("tof_days",)

"""Launchers, spacecraft and stacks of a scenario file: what is taken, and how faults are told."""

import pytest
from survey_scenarios import ROOK, changed

from porkgrid.scenario import read_scenario

TABLE = "c3_km2_s2,injected_mass_kg\n0,4000\n30,1900\n"
LAUNCHER = '\n[launcher]\nname = "Kittiwake"\ntable = "launcher.csv"\n'
CRAFT = "\n[spacecraft]\nisp_s = 320\ndry_mass_kg = 900\n"
STACK = """
[stack]
payload_kg = 2000

[[stack.stage]]
isp_s = 450
structural_fraction = 0.1
ascent_dv_km_s = 1.5
flies = ["departure"]

[[stack.stage]]
isp_s = 320
structural_fraction = 0.12
flies = ["capture"]
"""
NO_PARKING = changed(
    ROOK,
    ("parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 300, inclination_deg = 28.5 }\n", ""),
)


@pytest.fixture
def read(tmp_path):
    """Read a scenario's text that lies beside a launcher's table."""

    def read_text(text: str):
        (tmp_path / "launcher.csv").write_text(TABLE)
        path = tmp_path / "scenario.toml"
        path.write_text(text)
        return read_scenario(path)

    return read_text


def test_a_launcher_comes_with_the_numbers_of_its_table(read):
    draft = read(ROOK + LAUNCHER)
    assert draft.faults == ()
    launcher = draft.scenario.launcher
    assert (launcher.name, launcher.c3_km2_s2, launcher.injected_mass_kg) == (
        "Kittiwake", (0.0, 30.0), (4000.0, 1900.0),
    )  # fmt: skip


def test_a_launcher_without_a_name_has_that_of_its_file(read):
    assert read(ROOK + changed(LAUNCHER, ('name = "Kittiwake"\n', ""))).scenario.launcher.name == "launcher"


def test_stages_are_kept_from_the_lowest_up(read):
    stack = read(ROOK + STACK).scenario.stack
    assert [stage.isp_s for stage in stack.stages] == [450.0, 320.0]
    assert stack.payload_kg == 2000.0


@pytest.mark.parametrize(
    ("text", "key", "words"),
    [
        (ROOK + '\n[launcher]\ntable = "other.csv"\n', "launcher.table", "no such file"),
        (ROOK + "\n[launcher]\n", "launcher.table", "missing; give for example table ="),
        (ROOK + LAUNCHER + 'tabel = "x.csv"\n', "launcher.tabel", 'did you mean "table"?'),
        (ROOK + CRAFT + "isp = 300\n", "spacecraft.isp", 'did you mean "isp_s"?'),
        (ROOK + changed(CRAFT, ("320", "0")), "spacecraft.isp_s", "must be above 0"),
        (ROOK + changed(CRAFT, ("dry_mass_kg = 900\n", "")), "spacecraft.dry_mass_kg", "no [launcher]"),
        (NO_PARKING + CRAFT, "spacecraft", "needs a parking orbit"),
        (NO_PARKING + STACK, "stack", "needs a parking orbit"),
        (ROOK + LAUNCHER + STACK, "stack", "is given beside [launcher]"),
        (ROOK + CRAFT + STACK, "spacecraft", "is given beside [stack]"),
        (ROOK + changed(STACK, ("payload_kg = 2000\n", "")), "stack.payload_kg", "missing"),
        (ROOK + "\n[stack]\npayload_kg = 100\n", "stack.stage", "missing; give each under [[stack.stage]]"),
        (ROOK + changed(STACK, ("0.12", "1.0")), "stack.stage 2, structural_fraction", "must be below 1"),
        (ROOK + changed(STACK, ('["capture"]', '["captrue"]')), "stack.stage 2, flies", 'mean "capture"?'),
        (ROOK + changed(STACK, ('["capture"]', '["departure"]')), "stack.stage 2, flies", "flown by stage 1"),
        (ROOK + changed(STACK, ('["capture"]', "[]")), "stack.stage 2, flies", "name its burns"),
        (ROOK + changed(STACK, ('flies = ["departure"]\n', "")), "stack", "no stage flies departure"),
        (
            ROOK + changed(STACK, ('["departure"]', '["dep"]'), ('["capture"]', '["departure"]'),
                           ('["dep"]', '["capture"]')),
            "stack.stage 2, flies", "departure comes before what stage 1 flies",
        ),
        (
            ROOK + changed(STACK, ("ascent_dv_km_s = 1.5\n", ""), ("0.12\n", "0.12\nascent_dv_km_s = 1\n")),
            "stack.stage 2, ascent_dv_km_s", "the ascent comes first",
        ),
        (ROOK + "\n[capture]\n", "capture", "no such key"),
        (
            changed(ROOK, ("apoapsis_altitude_km = 33000", "apoapsis_altitude_km = 500, eccentricity = 0.5")),
            "encounter 2, capture.eccentricity", "give one",
        ),
        (
            changed(ROOK, (", apoapsis_altitude_km = 33000", "")),
            "encounter 2, capture.eccentricity", "missing; give apoapsis_altitude_km, or eccentricity",
        ),
        (
            changed(ROOK, ("apoapsis_altitude_km = 33000", "eccentricity = 1.0")),
            "encounter 2, capture.eccentricity", "must be below 1",
        ),
    ],
)  # fmt: skip
def test_a_fault_is_told_with_its_key_and_what_would_be_right(read, text, key, words):
    draft = read(text)
    assert draft.scenario is None
    told = [fault.text for fault in draft.faults if fault.key == key]
    assert any(words in each for each in told), draft.faults


def test_every_fault_of_a_launchers_table_is_told_with_its_line(read, tmp_path):
    draft = read(ROOK + LAUNCHER)
    (tmp_path / "launcher.csv").write_text("c3_km2_s2,injected_mass_kg\n0,4000\n10,4100\n20,heavy\n")
    draft = read_scenario(tmp_path / "scenario.toml")
    told = [fault.line("s") for fault in draft.faults if fault.key == "launcher.table"]
    assert any("line 3" in each for each in told)
    assert any("line 4" in each for each in told)

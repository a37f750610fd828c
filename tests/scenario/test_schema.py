"""The JSON Schema of scenario files: what it lets in and what it refuses, as the reader does."""

from __future__ import annotations

import copy
import json
import tomllib
from datetime import date
from pathlib import Path

import jsonschema
import pytest

from porkgrid.errors import RequestError
from porkgrid.scenario.schema import scenario_schema
from porkgrid.scenario.sections import SECTIONS
from porkgrid.survey.admit import load_routes
from porkgrid.survey.measures import all_entries, measures_for

SCENARIOS = sorted((Path(__file__).parents[2] / "scenarios").glob("*.toml"))
SCHEMA = scenario_schema(all_entries())
VALIDATOR = jsonschema.Draft7Validator(SCHEMA, format_checker=jsonschema.FormatChecker())


def as_json(table: dict) -> dict:
    """A table as validators of TOML see it: dates are texts."""
    return json.loads(json.dumps(table, default=lambda each: each.isoformat()))


def refused(table: dict) -> bool:
    return not VALIDATOR.is_valid(as_json(table))


def given(name: str) -> dict:
    return tomllib.loads(next(path for path in SCENARIOS if path.stem == name).read_text())


def changed(table: dict, *path_and_value) -> dict:
    """A copy of a table with the value at a path replaced, or removed where the value is ...."""
    *path, key, value = path_and_value
    copied = copy.deepcopy(table)
    place = copied
    for each in path:
        place = place[each]
    if value is ...:
        del place[key]
    else:
        place[key] = value
    return copied


def test_it_is_a_schema_of_draft_7():
    jsonschema.Draft7Validator.check_schema(SCHEMA)


@pytest.mark.parametrize("path", SCENARIOS, ids=lambda path: path.stem)
def test_every_shipped_scenario_validates(path):
    errors = VALIDATOR.iter_errors(as_json(tomllib.loads(path.read_text())))
    assert [each.message for each in errors] == []


MARS, HERON, STACK = given("earth-mars-2028"), given("earth-heron-2033"), given("earth-mars-2033-stack")
CAMPAIGN = given("mars-2034-campaign")
OWN = next(iter(HERON["bodies"]))
WRONG = {
    "no name": changed(MARS, "name", ...),
    "a name of 81 letters": changed(MARS, "name", "x" * 81),
    "a name that is a number": changed(MARS, "name", 3),
    "an unknown table": changed(MARS, "limit", {"c3_km2_s2": {"max": 3}}),
    "one encounter": changed(MARS, "encounter", MARS["encounter"][:1]),
    "encounters as one table": changed(MARS, "encounter", MARS["encounter"][0]),
    "a body that is a list": changed(MARS, "encounter", 0, "body", ["mars"]),
    "no first date": changed(MARS, "encounter", 0, "first", ...),
    "a date that is none": changed(MARS, "encounter", 0, "first", "soon"),
    "a date with an offset": changed(MARS, "encounter", 0, "first", "2028-09-01T00:00:00+01:00"),
    "a date that is a number": changed(MARS, "encounter", 0, "first", 2028),
    "a step of zero": changed(MARS, "encounter", 0, "step_days", 0),
    "a step that is a text": changed(MARS, "encounter", 0, "step_days", "1"),
    "an unknown key of an encounter": changed(MARS, "encounter", 0, "step", 1.0),
    "a label on a single route": changed(MARS, "encounter", 0, "label", "home"),
    "half a parking orbit": changed(MARS, "encounter", 0, "parking", {"periapsis_altitude_km": 200}),
    "an inclination of 200": changed(MARS, "encounter", 0, "parking", "inclination_deg", 200),
    "a capture orbit without a shape": changed(
        MARS, "encounter", 1, "capture", {"periapsis_altitude_km": 400}
    ),
    "a capture orbit of two shapes": changed(MARS, "encounter", 1, "capture", "eccentricity", 0.5),
    "an eccentricity of 1": changed(MARS, "encounter", 1, "capture", {"eccentricity": 1.0}),
    "21 revolutions": changed(MARS, "leg", [{"max_revs": 21}]),
    "half a revolution": changed(MARS, "leg", [{"max_revs": 0.5}]),
    "retrograde as a text": changed(MARS, "leg", [{"retrograde": "yes"}]),
    "a limit on nothing": changed(MARS, "limits", "tof_days", {}),
    "a limit that is a number": changed(MARS, "limits", "tof_days", 350),
    "a limit on an unknown measure": changed(MARS, "limits", "c3", {"max": 20}),
    "a limit on leg 0": changed(MARS, "limits", "leg0_tof_days", {"max": 20}),
    "a limit with another key": changed(MARS, "limits", "tof_days", {"most": 20}),
    "ranking by an unknown measure": changed(MARS, "rank", "by", "dv"),
    "an order that is none": changed(MARS, "rank", "order", "best"),
    "keeping none": changed(MARS, "rank", "keep", 0),
    "a launcher without a table": changed(MARS, "launcher", {"name": "Kittiwake"}),
    "a spacecraft without an engine": changed(MARS, "spacecraft", {"dry_mass_kg": 100}),
    "a negative mass": changed(MARS, "spacecraft", "dry_mass_kg", -1),
    "no kernels in the list": changed(MARS, "kernels", []),
    "a kernel twice": changed(MARS, "kernels", ["a.bsp", "a.bsp"]),
    "an unknown measure to store": changed(MARS, "measures", ["speed"]),
    "a body with an id and elements": changed(HERON, "bodies", OWN, "naif_id", 2_000_001),
    "a body of no place": changed(HERON, "bodies", OWN, {"radius_km": 1.0}),
    "a body without an inclination": changed(HERON, "bodies", OWN, "i_deg", ...),
    "a body inclined by 181 degrees": changed(HERON, "bodies", OWN, "i_deg", 181.0),
    "a stack without stages": changed(STACK, "stack", "stage", ...),
    "a stage of structure alone": changed(STACK, "stack", "stage", 0, "structural_fraction", 1.0),
    "a stack without payload": changed(STACK, "stack", "payload_kg", ...),
    "a stack and a launcher": changed(STACK, "launcher", {"table": "launchers/kittiwake-medium.csv"}),
    "a stack and a spacecraft": changed(STACK, "spacecraft", {"isp_s": 320}),
    "a route without a name": changed(CAMPAIGN, "route", 0, "name", ...),
    "a route of one stop": changed(CAMPAIGN, "route", 0, "stops", ["earth"]),
    "a route with an unknown key": changed(CAMPAIGN, "route", 0, "legs", []),
}


@pytest.mark.parametrize("what", WRONG)
def test_what_the_reader_refuses_the_schema_refuses(what, tmp_path):
    import tomli_w

    file = tmp_path / "wrong.toml"
    file.write_text(tomli_w.dumps(WRONG[what]))
    with pytest.raises(RequestError):
        load_routes(file)
    assert refused(WRONG[what])


def test_a_date_with_a_time_validates():
    assert not refused(changed(MARS, "encounter", 0, "first", "2028-09-01T12:00:00"))
    assert not refused(changed(MARS, "encounter", 0, "first", date(2028, 9, 1)))


def test_it_knows_every_section_that_the_reader_knows():
    assert set(SCHEMA["properties"]) == {*SECTIONS, "route"}


def test_every_measure_of_a_long_route_can_be_limited_and_ranked_by():
    features = frozenset(need for entry in all_entries() for need in entry.needs) | {"stage 1", "stage 2"}
    for name in measures_for(4, features):
        assert not refused(changed(changed(MARS, "limits", {name: {"max": 1}}), "rank", "by", name)), name


def test_descriptions_carry_units():
    models = SCHEMA["$defs"]
    assert models["Parking"]["properties"]["inclination_deg"]["description"] == "Inclination, degrees."
    assert models["Encounter"]["properties"]["step_days"]["description"].endswith(", days.")
    assert "km²/s²" in SCHEMA["properties"]["limits"]["properties"]["c3_km2_s2"]["description"]


def test_every_key_has_a_description():
    for name, model in SCHEMA["$defs"].items():
        for key, each in model["properties"].items():
            assert each.get("description"), f"{name}.{key}"

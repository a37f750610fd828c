"""Whatever a scenario file holds, load_scenario admits it or raises RequestError: never anything else."""

from __future__ import annotations

import copy
import math
import tomllib
from collections.abc import Sequence
from datetime import time, timedelta, timezone
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from toml_text import document, places

from porkgrid.errors import RequestError
from porkgrid.survey.admit import load_scenario

SCENARIOS = [
    path.read_text(encoding="utf-8") for path in (Path(__file__).parents[2] / "scenarios").glob("*.toml")
]
WITH_ALL = """
name = "Wren"
description = "by way of Venus"
kernels = ["lost.bsp"]
measures = ["tof_days"]

[[encounter]]
body = "earth"
first = 2028-10-15
last = 2029-02-15
step_days = 5.0
parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200, inclination_deg = 28.5 }
[[encounter]]
body = "venus"
first = 2029-03-01
last = 2029-08-01
flyby = { min_altitude_km = 300, max_burn_km_s = 1 }
[[encounter]]
body = "heron"
first = 2029-09-01T12:00:00
last = 2030-03-31
capture = { periapsis_altitude_km = 400, apoapsis_altitude_km = 33000 }
[[leg]]
max_revs = 1
retrograde = false
[[leg]]
[limits]
c3_km2_s2 = { max = 25 }
dla_deg = { min = -28.5, max = 28.5 }
[rank]
by = "dv_total_km_s"
order = "least"
keep = 20
apart_days = 10
[bodies.heron]
epoch = 2029-01-01
a_au = 1.2
e = 0.1
i_deg = 3
node_deg = 10
argument_deg = 20
mean_anomaly_deg = 30
gm_km3_s2 = 60
radius_km = 470
[bodies.egret]
epoch = 2029-01-01
q_au = 1.2
e = 1.1
i_deg = 3
node_deg = 10
argument_deg = 20
perihelion = 2029-06-01
[bodies.stilt]
naif_id = 20000433
"""
TABLES = [tomllib.loads(text) for text in (*SCENARIOS, WITH_ALL)]

odd = st.sampled_from([0, -1, 1, 0.0, -0.5, 1e-300, 1e308, math.nan, math.inf, -math.inf, 10**30, 10**400])
zones = st.none() | st.just(timezone(timedelta(hours=2)))
dates = st.dates() | st.datetimes(timezones=zones) | st.just(time(12))
words = st.sampled_from(["", "earth", "Mars ", "sun", "heron", "stilt", "tof_days", "2028-10-15", "\n"])
scalars = odd | st.integers() | st.floats() | st.booleans() | dates | words | st.text(max_size=8)
keys = words | st.sampled_from(["body", "max", "first", "parking", "flyby", "capture", "naif_id", "by"])
values = st.recursive(
    scalars,
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(keys, inner, max_size=3),
    max_leaves=5,
)
marks = st.sampled_from(['"', "\n[[encounter]]\n", "=", "{", "}", "[", "]", "-", "9"])


@st.composite
def mutated_tables(draw) -> str:
    """A right scenario with one to four values replaced, removed, or joined by another."""
    table = copy.deepcopy(draw(st.sampled_from(TABLES)))
    for _ in range(draw(st.integers(1, 4))):
        spots = places(table)
        if not spots:
            break
        *way, last = draw(st.sampled_from(spots))
        parent = table
        for key in way:
            parent = parent[key]
        match draw(st.sampled_from(["replace", "remove", "add", "repeat"])):
            case "replace":
                parent[last] = draw(values)
            case "remove":
                del parent[last]
            case "add" if isinstance(parent, dict):
                parent[draw(keys)] = draw(values)
            case "repeat" if isinstance(parent, list):
                parent.append(copy.deepcopy(parent[last]))
    return document(table)


@st.composite
def mutated_texts(draw) -> str:
    """The text of a right scenario with a stretch of it replaced by other characters."""
    text = draw(st.sampled_from([*SCENARIOS, WITH_ALL]))
    start = draw(st.integers(0, len(text)))
    end = start + draw(st.integers(0, 30))
    return text[:start] + draw(st.text(max_size=10) | marks) + text[end:]


@pytest.fixture(scope="module")
def path(tmp_path_factory) -> Path:
    return tmp_path_factory.mktemp("fuzz") / "wren.toml"


def admitted_or_refused(path: Path, data: bytes) -> None:
    path.write_bytes(data)
    faults: Sequence[str] = ()
    try:
        scenario = load_scenario(path)
    except RequestError as error:
        faults = error.faults
        refused = True
    else:
        refused = False
        assert scenario.slug
        assert all(1 <= len(each.epochs_jd()) <= 1_000_000 for each in scenario.encounters)
        assert len(scenario.legs) == len(scenario.encounters) - 1
    assert refused == bool(faults)
    for fault in faults:
        assert fault.startswith(f"{path}: ")
        assert len(fault.splitlines()) == 1
        assert len(fault) < 1000


@settings(max_examples=150, deadline=None)
@given(text=mutated_tables())
def test_a_scenario_with_values_changed_is_admitted_or_refused(path, text):
    admitted_or_refused(path, text.encode())


@settings(max_examples=100, deadline=None)
@given(text=mutated_texts())
def test_a_scenario_with_characters_changed_is_admitted_or_refused(path, text):
    admitted_or_refused(path, text.encode(errors="surrogatepass"))


@settings(max_examples=50, deadline=None)
@given(data=st.binary(max_size=40))
def test_a_file_of_any_bytes_is_refused(path, data):
    path.write_bytes(data)
    with pytest.raises(RequestError):
        load_scenario(path)


def test_the_scenarios_that_are_changed_are_right_but_for_a_missing_kernel(path):
    for text in SCENARIOS:
        admitted_or_refused(path, text.encode())
    path.write_text(WITH_ALL, encoding="utf-8")
    with pytest.raises(RequestError) as caught:
        load_scenario(path)
    (fault,) = caught.value.faults
    assert "lost.bsp: no such kernel file" in fault

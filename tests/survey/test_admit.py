"""What load_scenario admits to a sweep and what it refuses, whatever the file holds."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

from porkgrid.errors import RequestError
from porkgrid.scenario import Scenario
from porkgrid.survey.admit import load_routes, load_scenario

SCENARIOS = Path(__file__).parents[2] / "scenarios"

FULL = """
name = "Wren to Mars"
measures = ["c3_km2_s2", "tof_days"]

[[encounter]]
body = "earth"
first = 2028-10-15
last = 2029-02-15
parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200, inclination_deg = 28.5 }

[[encounter]]
body = "mars"
first = 2029-05-01
last = 2030-03-31
capture = { periapsis_altitude_km = 400, apoapsis_altitude_km = 33000 }

[[leg]]
max_revs = 0

[limits]
c3_km2_s2 = { max = 25 }

[rank]
by = "dv_total_km_s"
"""

HERON = """
[bodies.heron]
epoch = 2029-01-01
a_au = 1.2
e = 0.1
i_deg = 3
node_deg = 10
argument_deg = 20
mean_anomaly_deg = 30
"""

VENUS = """
[[encounter]]
body = "venus"
first = 2029-03-01
last = 2029-08-01

[[encounter]]
body = "mars\""""


@pytest.fixture
def load(tmp_path: Path):
    def load_text(text: str) -> Scenario:
        path = tmp_path / "wren.toml"
        path.write_text(text, encoding="utf-8")
        return load_scenario(path)

    return load_text


@pytest.fixture
def faults(load, tmp_path):
    """The faults of a text without the file's name, which each must start with."""

    def faults_of(text: str) -> list[str]:
        with pytest.raises(RequestError) as caught:
            load(text)
        start = f"{tmp_path / 'wren.toml'}: "
        assert all(fault.startswith(start) for fault in caught.value.faults)
        return [fault.removeprefix(start) for fault in caught.value.faults]

    return faults_of


def changed(old: str, new: str) -> str:
    assert old in FULL
    return FULL.replace(old, new)


# What is admitted


@pytest.mark.parametrize("path", sorted(SCENARIOS.glob("*.toml")), ids=lambda path: path.stem)
def test_the_scenarios_that_come_along_are_admitted(path):
    for scenario in load_routes(path):
        assert scenario.description
        assert scenario.rank.by


def test_the_scenario_of_many_seasons_is_about_thirty_million_cells():
    scenario = load_scenario(SCENARIOS / "earth-mars-2030-2044.toml")
    departures, arrivals = (len(each.epochs_jd()) for each in scenario.encounters)
    assert 29e6 < departures * arrivals < 33e6


def test_a_full_file_is_admitted(load):
    assert load(FULL).slug == "wren-to-mars"


@pytest.mark.parametrize("body", ['"MARS"', "4", '"4"'])
def test_bodies_are_known_by_name_in_any_case_and_by_number(load, body):
    load(changed('"mars"', body))


def test_a_route_with_a_flyby_is_admitted(load):
    text = changed('[[encounter]]\nbody = "mars"', VENUS).replace("[[leg]]", "[[leg]]\n[[leg]]")
    assert len(load(text).legs) == 2


def test_a_body_by_elements_is_admitted_at_any_date_the_earth_is_known(load):
    text = changed('"mars"', '"heron"').replace("capture", "# capture").replace("dv_total_km_s", "c3_km2_s2")
    assert load(text + HERON).own_bodies["heron"].elements is not None


def test_a_body_may_be_met_again_after_a_revolution(load):
    text = changed('"mars"', '"earth"').replace("max_revs = 0", "max_revs = 1")
    assert load(text).legs[0].max_revs == 1


# What is refused, each against the same right file


@pytest.mark.parametrize(
    ("old", "new", "says"),
    [
        ('"mars"', '"marz"', """encounter 2, body: no body 'marz'; did you mean "mars"?"""),
        ('"mars"', '"zzzz"', "encounter 2, body: no body 'zzzz'; there are sun, mercury"),
        ('"mars"', "123456", "encounter 2, body: no body '123456'"),
        ('"mars"', '"sun"', "encounter 2, body: the Sun"),
        ('"mars"', '"Earth"', "leg 1, max_revs: from a body back to itself"),
        ("last = 2030-03-31", "last = 2651-01-01", "encounter 2, last: 2651-01-01 is outside what DE440 has"),
        ("first = 2028-10-15", "first = 1500-10-15", "encounter 1, first: 1500-10-15 is outside"),
        ("c3_km2_s2 = {", "c3_km_s = {", "limits.c3_km_s: there is no measure 'c3_km_s'; the nearest"),
        ("c3_km2_s2 = {", "leg2_tof_days = {", "limits.leg2_tof_days: this route has no"),
        ("capture =", "# capture =", "limits.dv_capture_km_s: this route has no 'dv_capture_km_s'; it needs"),
        ("parking =", "# parking =", "rank.by: this route has no 'dv_total_km_s'; it needs a parking orbit"),
        ('"tof_days"]', '"tof_dayz"]', "measures: there is no measure 'tof_dayz'"),
        ('name = "', 'kernels = ["lost.bsp"]\nname = "', "kernels: "),
        ('name = "', 'kernels = ["wren.toml"]\nname = "', "not an SPK file"),
    ],
)  # fmt: skip
def test_what_the_engine_cannot_do_is_refused_with_its_key(faults, old, new, says):
    text = changed(old, new).replace("[limits]", "[limits]\ndv_capture_km_s = { max = 3 }")
    assert any(says in fault for fault in faults(text))


@pytest.mark.parametrize("last", ["2028-10-15", "2028-10-01"])
def test_an_arrival_that_can_follow_no_departure_is_refused(faults, last):
    text = changed("first = 2029-05-01\nlast = 2030-03-31", f"first = 2028-09-01\nlast = {last}")
    assert faults(text) == [
        f"encounter 2, last: {last} can follow no date of the encounters before it; "
        "give a date after 2028-10-15"
    ]


def test_a_flyby_before_the_departure_is_refused_even_where_the_arrival_is_late(faults):
    early = VENUS.replace("2029-03-01", "2028-03-01").replace("2029-08-01", "2028-08-01")
    text = changed('[[encounter]]\nbody = "mars"', early).replace("[[leg]]", "[[leg]]\n[[leg]]")
    assert [fault.split(":")[0] for fault in faults(text)] == ["encounter 2, last"]


def test_orbits_about_a_body_without_gravity_are_refused(faults):
    (fault,) = faults(changed('"mars"', '"heron"') + HERON)
    assert fault.startswith("encounter 2, capture: needs gm_km3_s2 and radius_km of heron")


def test_a_parking_inclination_without_a_pole_is_refused(faults):
    text = changed('"earth"', '"heron"') + HERON + "gm_km3_s2 = 60\nradius_km = 470\n"
    (fault,) = faults(text)
    assert fault.startswith("encounter 1, parking.inclination_deg: needs the pole of heron")


def test_a_flyby_of_a_body_without_a_usual_altitude_asks_for_one(faults):
    text = changed('[[encounter]]\nbody = "mars"', VENUS.replace('"venus"', '"heron"'))
    text = text.replace("[[leg]]", "[[leg]]\n[[leg]]") + HERON + "gm_km3_s2 = 60\nradius_km = 470\n"
    (fault,) = faults(text)
    assert fault.startswith("encounter 2, flyby.min_altitude_km: missing")


def test_a_body_that_no_kernel_has_is_refused(faults):
    text = changed('"mars"', '"egret"').replace("capture =", "# capture =")
    found = faults(text + "[bodies.egret]\nnaif_id = 20000433\n")
    assert found[0].startswith("encounter 2, body: egret: no kernel has NAIF id 20000433")


def test_a_body_by_elements_needs_dates_on_which_the_earth_is_known(faults):
    text = changed('"mars"', '"heron"').replace("capture", "# capture").replace("2030-03-31", "2700-01-01")
    (fault,) = faults(text + HERON)
    assert fault.startswith("encounter 2, last: 2700-01-01 is outside what DE440 has of earth")


def test_a_missing_kernel_is_not_followed_by_complaints_of_its_bodies(faults):
    text = changed('"mars"', '"egret"').replace("capture =", "# capture =")
    (fault,) = faults('kernels = ["lost.bsp"]' + text + "[bodies.egret]\nnaif_id = 20000433\n")
    assert "lost.bsp: no such kernel file" in fault


def test_every_missing_kernel_is_named(faults):
    found = faults('kernels = ["lost.bsp", "gone.bsp"]' + FULL)
    assert [name for name in ("lost.bsp", "gone.bsp") if any(name in fault for fault in found)] == [
        "lost.bsp",
        "gone.bsp",
    ]


def test_an_unknown_body_brings_no_complaint_of_measures_it_may_have(faults):
    text = changed('"mars"', '"marz"').replace("[limits]", "[limits]\narrival_mars_ls_deg = { max = 180 }")
    assert len(faults(text)) == 1


def test_a_body_whose_own_table_is_wrong_is_not_called_unknown(faults):
    text = changed('"mars"', '"heron"').replace("capture", "# capture").replace("dv_total_km_s", "c3_km2_s2")
    (fault,) = faults(text + HERON.replace("e = 0.1", "e = -0.1"))
    assert fault.startswith("bodies.heron.e: ")


def test_faults_of_structure_and_of_the_engine_are_told_together(faults):
    text = changed('"earth"', '"erth"').replace("last = 2030-03-31", "last = 2651-01-01\nlst = 1")
    text = text.replace("max = 25", 'max = "25"').replace("dv_total_km_s", "dv_totl")
    found = {fault.split(":")[0] for fault in faults(text)}
    assert found >= {
        "encounter 1, body",
        "encounter 2, last",
        "encounter 2, lst",
        "limits.c3_km2_s2.max",
        "rank.by",
    }


def test_each_fault_is_one_line(faults):
    text = changed('"mars"', '"ma\\nrs"').replace("c3_km2_s2 = {", '"c3\\n" = {')
    found = faults(text + '"\\n" = 1\n["bodies"."x\\ny"]\n')
    assert len(found) >= 4
    assert all(len(fault.splitlines()) == 1 for fault in found)


def test_checking_a_scenario_loads_no_heavy_library():
    code = (
        "import sys; from porkgrid.survey.admit import load_scenario; load_scenario(sys.argv[1]);"
        "heavy = {'numba', 'scipy', 'pandas', 'xarray', 'matplotlib', 'zarr', 'astropy'} & set(sys.modules);"
        "print(*heavy)"
    )
    path = SCENARIOS / "earth-mars-2028.toml"
    done = subprocess.run(
        [sys.executable, "-c", code, str(path)], capture_output=True, text=True, check=False
    )
    assert (done.returncode, done.stdout.strip(), done.stderr) == (0, "", "")

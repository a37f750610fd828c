"""Requests with flybys that cannot be met, in processes of their own: clear messages, exit code 2."""

from __future__ import annotations

import subprocess
import sys

import pytest
from command import PORKGRID, assert_refused, porkgrid
from survey_scenarios import changed, limited, written

ONE = """
name = "Snipe by Venus to Mars"

[[encounter]]
body = "earth"
first = 2034-05-01
last = 2034-12-31
step_days = 10.0
parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200 }

[[encounter]]
body = "venus"
first = 2034-09-01
last = 2035-03-31
step_days = 10.0
flyby = { min_altitude_km = 400, max_burn_km_s = 0.3 }

[[encounter]]
body = "mars"
first = 2035-01-01
last = 2036-03-31
step_days = 10.0

[limits]
c3_km2_s2 = { max = 40 }
"""

TWO = changed(
    ONE,
    (
        '[[encounter]]\nbody = "mars"',
        '[[encounter]]\nbody = "earth"\nfirst = 2035-06-01\nlast = 2037-12-31\nstep_days = 1.0\n\n'
        '[[encounter]]\nbody = "jupiter"',
    ),
    ("first = 2035-01-01\nlast = 2036-03-31\nstep_days = 10.0", "first = 2038-01-01\nlast = 2040-12-31"),
)

HERON = """
[bodies.heron]
epoch = 2034-09-01
a_au = 1.165
e = 0.184
i_deg = 2.7
node_deg = 213.4
argument_deg = 71.9
mean_anomaly_deg = 260.5
"""

# Changes of the scenario, and what is said of it: the key, what is wrong, what would be right.
BAD = {
    "flyby before every departure": (
        ("first = 2034-09-01\nlast = 2035-03-31", "first = 2033-09-01\nlast = 2034-03-31"),
        "encounter 2, last: 2034-03-31 can follow no date of the encounters before it; "
        "give a date after 2034-05-01",
    ),
    "arrival before every flyby": (
        ("first = 2035-01-01\nlast = 2036-03-31", "first = 2034-06-01\nlast = 2034-08-15"),
        "encounter 3, last: 2034-08-15 can follow no date of the encounters before it; "
        "give a date after 2034-09-01",
    ),
    "burn limit of zero": (
        ("max_burn_km_s = 0.3", "max_burn_km_s = 0"),
        "encounter 2, flyby, max_burn_km_s: on a grid of dates no unpowered flyby matches exactly, "
        "so 0 allows none; give what it may miss by, such as 0.2",
    ),
    "burn limit below zero": (
        ("max_burn_km_s = 0.3", "max_burn_km_s = -0.1"),
        "encounter 2, flyby.max_burn_km_s: must be 0 or more, not the number -0.1",
    ),
    "altitude under the surface": (
        ("min_altitude_km = 400", "min_altitude_km = -400"),
        "encounter 2, flyby.min_altitude_km: must be 0 or more, not the number -400",
    ),
    "misspelt flyby key": (
        ("min_altitude_km", "min_altitud_km"),
        'encounter 2, flyby.min_altitud_km: no such key; did you mean "min_altitude_km"?',
    ),
    "flyby of a body of unknown name": (
        ('"venus"', '"venis"'),
        "encounter 2, body: no body 'venis'; did you mean \"venus\"?",
    ),
    "a limit on a flyby that the route lacks": (
        ("c3_km2_s2 =", "flyby2_altitude_km ="),
        "limits.flyby2_altitude_km: this route has no 'flyby2_altitude_km': it has 2 legs",
    ),
    "ranking by an altitude": (
        ("[limits]", '[rank]\nby = "flyby1_altitude_km"\n\n[limits]'),
        "rank, by: 'flyby1_altitude_km' does not add up over legs and burns",
    ),
}


@pytest.fixture
def refuse(tmp_path):
    """Expect the same messages of `sweep` and of `check`, and nothing where a survey would be."""

    def both(text: str, *fragments: str) -> None:
        path = written(tmp_path / "given", text)
        for command in (("sweep", path, "--out", tmp_path / "survey"), ("check", path)):
            result = porkgrid(*command)
            assert_refused(result, 2, *fragments)
            assert all(str(path) in line for line in result.stderr.splitlines())
            assert not (tmp_path / "survey").exists()

    return both


@pytest.mark.parametrize("name", BAD)
def test_a_fault_of_a_route_with_flybys_is_refused_with_one_message(refuse, name):
    change, says = BAD[name]
    refuse(changed(ONE, change), says)


def test_a_flyby_of_a_body_without_gm_is_refused_with_where_to_give_it(refuse):
    text = changed(ONE, ('"venus"', '"heron"')) + HERON
    refuse(text, "encounter 2, flyby: needs gm_km3_s2 and radius_km of heron; give it in [bodies.heron]")


def test_a_flyby_of_a_body_with_gm_and_radius_of_its_own_is_swept(tmp_path):
    """What the message asks for is enough."""
    text = limited(changed(ONE, ('"venus"', '"heron"'), ("max_burn_km_s = 0.3", "max_burn_km_s = 30")), "")
    text += HERON + "gm_km3_s2 = 5e-7\nradius_km = 0.21\n"
    result = porkgrid("check", written(tmp_path, text))
    assert result.returncode == 0, result.stderr


def test_a_leg_back_to_its_own_body_needs_a_revolution(refuse):
    refuse(changed(ONE, ('"mars"', '"venus"')), "leg 2, max_revs: from a body back to itself")


def test_more_dates_than_the_memory_holds_are_refused_with_steps_that_would_fit(tmp_path):
    """In a machine of 128 MB: the process is told so before it starts."""
    path = written(tmp_path / "given", changed(TWO, ("step_days = 10.0", "step_days = 1.0")))
    small = (
        "import os; real = os.sysconf\n"
        "os.sysconf = lambda name: 2**27 // real('SC_PAGE_SIZE') if name == 'SC_PHYS_PAGES' else real(name)\n"
    )
    result = in_machine(small, "sweep", path, "--out", tmp_path / "survey")
    assert_refused(result, 2, "encounter, step_days: legs between flybys take")
    assert str(path) in result.stderr
    assert "days would fit" in result.stderr
    assert not (tmp_path / "survey").exists()


def in_machine(setup: str, *arguments: object) -> subprocess.CompletedProcess[str]:
    """Run a command in a process that some lines have set up first."""
    code = f"{setup}\n{PORKGRID[-1]}"
    return subprocess.run(
        [sys.executable, "-c", code, *map(str, arguments)],
        capture_output=True, text=True, check=False, timeout=180,
    )  # fmt: skip


def test_all_faults_of_a_route_with_flybys_are_told_together(refuse):
    three = [BAD[name][0] for name in ("altitude under the surface", "arrival before every flyby")]
    refuse(changed(ONE, *three), "min_altitude_km: must be 0 or more", "encounter 3, last: 2034-08-15")

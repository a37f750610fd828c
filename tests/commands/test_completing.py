"""Shell completion and help texts, as a shell asks for them."""

from __future__ import annotations

import os
import re
import shlex
import subprocess
import sys
from pathlib import Path

import pytest
from typer.main import get_command

from porkgrid.cli import app

ROOT = Path(__file__).parents[2]
PROGRAM = [
    sys.executable,
    "-c",
    "import sys; sys.argv[0] = 'porkgrid'; from porkgrid.cli import main; main()",
]
COMMANDS = get_command(app).commands  # type: ignore[attr-defined]


def completed(line: str) -> list[str]:
    """What bash is offered for the last word of a command line."""
    asked = {"_PORKGRID_COMPLETE": "complete_bash", "COMP_WORDS": line, "COMP_CWORD": str(line.count(" "))}
    run = subprocess.run(PROGRAM, env=os.environ | asked, capture_output=True, text=True)
    return run.stdout.split()


def test_bash_is_shown_what_to_install():
    # so that it does not depend on the shell that runs the tests
    setting = {"_TYPER_COMPLETE_TEST_DISABLE_SHELL_DETECTION": "1"}
    show = [*PROGRAM, "--show-completion", "bash"]
    run = subprocess.run(show, env=os.environ | setting, capture_output=True, text=True)
    assert run.returncode == 0, run.stderr
    assert "complete -o default -F _porkgrid_completion porkgrid" in run.stdout
    assert subprocess.run(["bash", "-n"], input=run.stdout, text=True).returncode == 0


def test_commands_are_completed():
    assert completed("porkgrid ra") == ["rank"]


def test_bodies_are_completed_but_not_the_sun():
    offered = completed("porkgrid new earth ")
    assert "mars" in offered
    assert "sun" not in offered
    assert completed("porkgrid new earth mars --by v") == ["venus"]


@pytest.mark.parametrize(
    "line",
    [
        "porkgrid rank survey --by c3_",
        "porkgrid rank survey --trade c3_",
        "porkgrid chart survey --of c3_",
        "porkgrid chart survey --lines c3_",
        "porkgrid period survey --by c3_",
        "porkgrid slip survey --by c3_",
        "porkgrid compare survey --by c3_",
    ],
)
def test_measures_are_completed(line):
    assert completed(line) == ["c3_km2_s2"]


def test_only_measures_that_the_survey_stores_are_offered(tmp_path):
    for name in ("leg1_tof_days", "c3_km2_s2", "blocked_by", "departure"):
        (tmp_path / "grid.zarr" / name).mkdir(parents=True)
    assert completed(f"porkgrid rank {tmp_path} --by ") == ["c3_km2_s2", "leg1_tof_days"]


def test_completion_loads_none_of_the_heavy_libraries():
    code = "import sys; from porkgrid.cli import app; from porkgrid.commands import completing as c\n"
    code += "c._all_names(); c.body_names('m')\n"
    code += (
        "heavy = {'numba', 'scipy', 'xarray', 'matplotlib', 'pandas'}\nprint(heavy.intersection(sys.modules))"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True)
    assert run.stdout == "set()\n"


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_has_an_example_that_parses(name):
    command = COMMANDS[name]
    examples = re.findall(r"Example: (porkgrid .*?)(?:\n\n|\n?\Z)", command.help, re.DOTALL)
    assert examples
    for example in examples:
        words = shlex.split(example.split(" > ")[0])
        assert words[1] == name
        # raises where an option or a value is wrong
        assert command.make_context(name, words[2:]).params
        for word in words:
            if word.startswith("scenarios/"):
                assert (ROOT / word).is_file(), word

"""porkgrid new, and porkgrid check --schema, as they are run."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import pytest

from porkgrid.commands.new import new
from porkgrid.errors import RequestError


def porkgrid(*arguments, folder) -> subprocess.CompletedProcess:
    command = [sys.executable, "-c", "from porkgrid.cli import main; main()", *arguments]
    return subprocess.run(command, cwd=folder, capture_output=True, text=True, timeout=300)


@pytest.fixture(scope="module")
def written(tmp_path_factory):
    """A folder in which `new` has written a scenario, and what it said."""
    folder = tmp_path_factory.mktemp("new")
    return folder, porkgrid("new", "earth", "mars", "--year", "2033", folder=folder)


def test_the_file_is_written_here_and_named_on_standard_output(written):
    folder, run = written
    assert run.returncode == 0, run.stderr
    assert run.stdout == "earth-mars-2033.toml\n"
    assert "April 2033" in run.stderr
    assert "porkgrid sweep earth-mars-2033.toml" in run.stderr
    assert (folder / "earth-mars-2033.toml").exists()


@pytest.mark.slow
def test_check_finds_the_file_valid(written):
    folder, _ = written
    run = porkgrid("check", "earth-mars-2033.toml", folder=folder)
    assert run.returncode == 0, run.stderr
    assert "Earth to Mars, 2033" in run.stdout


@pytest.mark.slow
def test_a_sweep_of_the_file_has_candidates(written):
    folder, _ = written
    run = porkgrid("sweep", "earth-mars-2033.toml", "--json", folder=folder)
    assert run.returncode == 0, run.stderr
    told = json.loads(run.stdout)
    assert told["cells_allowed"] > 1000
    assert told["candidates"]
    assert told["candidates"][0]["departure"].startswith("2033-04")


@pytest.mark.slow
def test_a_file_that_is_there_is_replaced_only_when_asked_for(written):
    folder, _ = written
    file = folder / "mine.toml"
    file.write_text("mine\n")
    again = ["new", "earth", "venus", "--year", "2031", "--out", "mine.toml"]
    run = porkgrid(*again, folder=folder)
    assert run.returncode == 2
    assert "mine.toml: is there already; give --fresh" in run.stderr
    assert file.read_text() == "mine\n"
    run = porkgrid(*again, "--fresh", "--name", "Siskin to Venus", folder=folder)
    assert run.returncode == 0, run.stderr
    assert 'name = "Siskin to Venus"' in file.read_text()


@pytest.mark.slow
def test_a_name_that_needs_escapes_in_toml_survives(written):
    folder, _ = written
    name = 'Siskin "two" \\ to Vénus'
    out = ["--out", "quoted.toml", "--name", name]
    assert porkgrid("new", "earth", "venus", "--year", "2031", *out, folder=folder).returncode == 0
    run = porkgrid("check", "quoted.toml", "--json", folder=folder)
    assert run.returncode == 0, run.stderr
    assert json.loads(run.stdout)["name"] == name


@pytest.mark.slow
def test_a_route_by_venus_has_a_flyby(written):
    folder, _ = written
    run = porkgrid("new", "earth", "mars", "--by", "venus", "--year", "2034", folder=folder)
    assert run.returncode == 0, run.stderr
    text = (folder / "earth-venus-mars-2034.toml").read_text()
    assert "flyby = { min_altitude_km = 300, max_burn_km_s = 0.2 }" in text
    run = porkgrid("check", "earth-venus-mars-2034.toml", "--json", folder=folder)
    assert json.loads(run.stdout)["route"] == "Earth → Venus → Mars"


@pytest.mark.parametrize(
    ("bodies", "options", "message"),
    [
        (["erth", "mars"], {}, 'erth: no body of this name; did you mean "earth"?'),
        (["earth", "mrs"], {}, 'mrs: no body of this name; did you mean "mars"?'),
        (["earth", "vulcan-7"], {}, "valid here: mercury, venus"),
        (["sun", "mars"], {}, "sun: is what routes go round"),
        (["earth", "moon"], {}, "moon: goes round the Earth"),
        (["mars", "mars"], {}, "mars: a leg from a body to itself"),
        (["earth", "mars"], {"by": ["mars"]}, "mars: a leg from a body to itself"),
        (["earth", "mars"], {"by": ["venus", "vnus"]}, 'vnus: no body of this name; did you mean "venus"?'),
        (["earth", "mars"], {"name": "…"}, "--name: name: must have a letter or digit"),
        (["earth", "mars"], {"out": Path("nowhere/a.toml")}, "nowhere/a.toml: there is no folder nowhere"),
        (["earth", "mars"], {"out": Path()}, ".: is a folder"),
    ],
)
def test_what_it_cannot_do_is_refused_and_nothing_is_written(bodies, options, message, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    with pytest.raises(RequestError) as refused:
        new(*bodies, year=2031, **options)
    assert message in str(refused.value)
    assert list(tmp_path.iterdir()) == []


def test_all_wrong_bodies_are_told_at_once_with_exit_code_2(tmp_path):
    run = porkgrid("new", "erth", "moon", "--year", "2031", folder=tmp_path)
    assert run.returncode == 2
    told = [line.split(":")[:2] for line in run.stderr.splitlines()]
    assert told == [["porkgrid", " erth"], ["porkgrid", " moon"]]


def test_a_refusal_does_not_load_the_engine(tmp_path):
    code = "import sys; sys.argv[1:] = ['new', 'sun', 'mars', '--year', '2031']\n"
    code += "from porkgrid.cli import main\ntry: main()\n"
    code += "finally: print([each for each in ('numba', 'scipy', 'xarray') if each in sys.modules])"
    run = subprocess.run([sys.executable, "-c", code], cwd=tmp_path, capture_output=True, text=True)
    assert run.stdout == "[]\n"


def test_check_prints_the_schema_without_a_scenario(tmp_path):
    run = porkgrid("check", "--schema", folder=tmp_path)
    assert run.returncode == 0, run.stderr
    assert json.loads(run.stdout)["title"] == "porkgrid scenario"


def test_check_without_a_scenario_says_what_to_give(tmp_path):
    run = porkgrid("check", folder=tmp_path)
    assert run.returncode == 2
    assert "give a scenario file, or --schema" in run.stderr

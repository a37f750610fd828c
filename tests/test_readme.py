"""The README keeps its word: its commands, options, scenarios, names and output are those of the program."""

import re
import shlex
import tomllib
from pathlib import Path

import pytest
import typer
from pydantic import BaseModel

from porkgrid import cli, load_scenario
from porkgrid.scenario import (
    BodySpec,
    Encounter,
    Flyby,
    Leg,
    Limit,
    Orbit,
    Parking,
    Rank,
    Spacecraft,
    Stage,
    read_scenario,
)
from porkgrid.scenario.sections import SECTIONS
from porkgrid.scenario.vehicles import LauncherFiles
from porkgrid.survey.measures import all_entries
from porkgrid.survey.plan import make_plan

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text()
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text()
CI_RUN = (ROOT / ".ci" / "run").read_text()

BLOCKS = re.findall(r"^```(\w+)\n(.*?)^```$", README, re.MULTILINE | re.DOTALL)
MAIN_JOB, TESTS = (text for _, text in BLOCKS[:2])
TOML = [text for kind, text in BLOCKS if kind == "toml"]
WHOLE_SCENARIO, FLYBY_SCENARIO, OWN_BODIES, LAUNCHED, STACK = TOML
SAMPLE, FOLDER = (text for kind, text in BLOCKS if kind == "text")
(PYTHON,) = (text for kind, text in BLOCKS if kind == "python")

ENVIRONMENT = ["python3 -m venv .venv", ". .venv/bin/activate"]  # .ci/run makes its own, elsewhere


def porkgrid_lines() -> list[str]:
    """The command lines of porkgrid in the README's blocks, the main job among them."""
    shell = "\n".join(text for kind, text in BLOCKS if kind == "sh")
    return re.findall(r"porkgrid [a-z].*$", shell, re.MULTILINE)


def run_here(line: str) -> None:
    """Run a command line of porkgrid in this process, in the folder that is current."""
    cli.app(shlex.split(line)[1:], standalone_mode=False)


@pytest.fixture
def here(tmp_path, monkeypatch):
    """A folder as the README expects it, the repository's scenarios in it, made current."""
    (tmp_path / "scenarios").symlink_to(ROOT / "scenarios", target_is_directory=True)
    monkeypatch.chdir(tmp_path)
    return tmp_path


@pytest.mark.parametrize("text", [MAIN_JOB, TESTS], ids=["main job", "tests"])
def test_the_first_two_blocks_are_one_line_each_that_sets_up_first(text):
    assert text.count("\n") == 1
    steps = text.strip().split(" && ")
    assert steps[:2] == ENVIRONMENT
    assert steps[2].startswith("pip install -e ")
    assert len(steps) == 4


@pytest.mark.parametrize("text", [MAIN_JOB, TESTS], ids=["main job", "tests"])
def test_ci_takes_the_steps_of_the_first_two_blocks_in_their_order(text):
    wanted = text.strip().split(" && ")[2:]
    lines = [re.split(r" --out | \| ", line.strip())[0] for line in CI_RUN.splitlines()]
    assert [line for line in lines if line in wanted] == wanted


def test_the_readme_shows_every_command():
    commands = set(typer.main.get_command(cli.app).commands)
    assert {line.split()[1] for line in porkgrid_lines()} == commands


def test_every_option_that_the_readme_names_exists():
    commands = typer.main.get_command(cli.app).commands
    options = {
        name: {"--help"} | {option for parameter in command.params for option in parameter.opts}
        for name, command in commands.items()
    }
    for line in porkgrid_lines():
        name, *words = line.split()[1:]
        assert {word for word in words if word.startswith("--")} <= options[name], line
    named = set(re.findall(r"(?<![\w-])--[a-z][a-z-]*", README))
    assert named <= set().union(*options.values())


def test_commands_that_the_readme_says_print_json_can(here, capsys):
    (clause,) = re.findall(r"((?:`\w+`(?:, | and ))+`\w+`) take `--json`", README)
    commands = typer.main.get_command(cli.app).commands
    able = {name for name, command in commands.items() if any("--json" in p.opts for p in command.params)}
    assert set(re.findall(r"`(\w+)`", clause)) == able


@pytest.mark.parametrize("text", [WHOLE_SCENARIO, FLYBY_SCENARIO], ids=["direct", "flyby"])
def test_the_scenario_examples_are_admitted_and_can_be_swept(here, text):
    path = here / "scenario.toml"
    path.write_text(text)
    scenario = load_scenario(path)
    assert scenario.name == tomllib.loads(text)["name"]
    assert make_plan(scenario).shape[0] > 1


def test_the_bodies_example_validates_in_that_scenario(here):
    def parts(text: str) -> tuple[str, str]:
        head, bracket, tables = text.partition("\n[")
        return head, bracket + tables

    (head, tables), (more_head, more_tables) = parts(WHOLE_SCENARIO), parts(OWN_BODIES)
    path = here / "scenario.toml"
    path.write_text("\n".join([head, more_head, tables, more_tables]))
    draft = read_scenario(path)  # the kernel it names is invented
    assert draft.faults == ()
    assert set(draft.bodies) == set(tomllib.loads(OWN_BODIES)["bodies"])


@pytest.mark.parametrize("vehicle", [LAUNCHED, STACK], ids=["launcher", "stack"])
def test_the_vehicle_examples_fly_in_that_scenario(here, vehicle):
    (here / "launchers").symlink_to(ROOT / "scenarios" / "launchers", target_is_directory=True)
    path = here / "scenario.toml"
    path.write_text(WHOLE_SCENARIO + "\n" + vehicle)
    assert "propellant_kg" in make_plan(load_scenario(path)).measures


def test_the_examples_show_every_key():
    def keys(value: object) -> set[str]:
        if isinstance(value, dict):
            return set(value).union(*map(keys, value.values()))
        return set().union(*map(keys, value)) if isinstance(value, list) else set()

    examples = (WHOLE_SCENARIO, FLYBY_SCENARIO, OWN_BODIES, LAUNCHED, STACK)
    shown = set().union(*(keys(tomllib.loads(text)) for text in examples))
    models: list[type[BaseModel]]
    models = [Encounter, Orbit, Parking, Flyby, Leg, Limit, Rank, BodySpec, LauncherFiles, Spacecraft, Stage]
    known = set(SECTIONS).union(*(model.model_fields for model in models))
    assert known <= shown


def test_every_measure_is_in_the_readme_and_every_measure_in_it_exists():
    listed = README.partition("## Measures")[2].partition("## How to read")[0]
    named = set(re.findall(r"^- .*?(?=^- |\Z|^$)", listed, re.MULTILINE | re.DOTALL))
    names = set(re.findall(r"`(\w+)`", " ".join(named)))
    assert {re.sub(r"^(leg|flyby|stage)1", r"\1{n}", name) for name in names} == {
        e.name for e in all_entries()
    }


@pytest.mark.parametrize("text", [README, DEVELOPERS], ids=["README", "DEVELOPERS"])
def test_every_file_that_is_named_exists(text):
    linked = re.findall(r"\]\(([^)#]+)\)", text)
    named = re.findall(r"(?:tests|scenarios|survey|sky|figures|scenario|physics)/[\w/-]+\.(?:py|toml)", text)
    scripts = re.findall(r"\bbench_\w+\.py", text)
    places = [ROOT, ROOT / "porkgrid", ROOT / "tests" / "benchmarks"]
    assert linked + named
    for name in linked + named + scripts:
        assert any((place / name).exists() for place in places), name


def test_the_main_job_prints_the_sample_and_makes_the_folder_and_later_commands_run_on_it(here, capsys):
    run_here(MAIN_JOB.strip().split(" && ")[3])
    printed = [line.rstrip() for line in capsys.readouterr().out.splitlines()]
    assert [line.rstrip() for line in SAMPLE.splitlines() if line.strip()] == [
        line for line in printed if line
    ]

    top, *rows = (line.split()[0] for line in FOLDER.splitlines())
    for name in rows:
        assert (here / top / name).exists(), name
    made = {path.name for path in (here / top).iterdir()}
    assert made == {Path(name).parts[0] for name in rows}

    for line in porkgrid_lines():
        if line.split()[1] in ("chart", "rank", "period", "slip", "handoff", "bodies", "measures"):
            run_here(line)
            assert capsys.readouterr().out.strip(), line


def test_the_python_example_runs(here, capsys):
    exec(compile(PYTHON, "README.md", "exec"), {})
    printed = capsys.readouterr().out
    assert "(2, 3)" in printed
    assert "dv_total_km_s" in printed


def test_the_way_to_look_at_assembly_runs(capsys):
    (text,) = re.findall(r"^```python\n(.*?)^```$", DEVELOPERS, re.MULTILINE | re.DOTALL)
    exec(compile(text, "DEVELOPERS.md", "exec"), {})
    counts, registers = capsys.readouterr().out.splitlines()
    assert counts.startswith("[")
    assert "ymm" in registers

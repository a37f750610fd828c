"""Shipped scenarios and launcher tables, mutated: each is admitted or refused in words, never a traceback.

The mutations follow from seeds, which a failure names. What is admitted is planned too, and of some the
command line has its say.
"""

from __future__ import annotations

import copy
import math
import random
import shutil
import tomllib
from collections import Counter
from collections.abc import Callable, Iterable
from datetime import date, datetime, time
from pathlib import Path
from typing import Any

import pytest
from toml_text import document, places

from porkgrid.cli import main
from porkgrid.errors import RequestError
from porkgrid.survey.admit import load_routes
from porkgrid.survey.plan import make_plan

SHIPPED = Path(__file__).parents[1] / "scenarios"
TEXTS = {path.name: path.read_text(encoding="utf-8") for path in sorted(SHIPPED.glob("*.toml"))}
LAUNCHERS = sorted(path.name for path in (SHIPPED / "launchers").glob("*.csv"))

ODD: list[Any] = [
    0, 1, -1, 2, 10**6, -(10**9), 10**30, 0.0, -0.0, 1e-300, 1e300, -1e-9, 0.5, math.nan, math.inf, -math.inf,
    True, False, "", " ", "earth", "mars", "venus", "sun", "Mars ", "moon", "heron", "tof_days", "c3_km2_s2",
    "departure", "capture", "least", "../../etc/passwd", "launchers/kittiwake-heavy.csv", "é\n\t",
    "x" * 3000, "launchers", date(2033, 2, 28), date(1, 1, 1), date(9999, 12, 31), datetime(2033, 5, 1, 12),
    time(12), [], {}, [[]], [1, "a"], {"min": 1}, {"max": 0}, {"min": 5, "max": 1},
    {"periapsis_altitude_km": 300},
]  # fmt: skip
KEYS = [
    "name", "body", "first", "last", "step_days", "parking", "capture", "flyby", "leg", "max_revs", "limits",
    "rank", "launcher", "table", "dla_table", "adapter_kg", "spacecraft", "dry_mass_kg", "isp_s", "stack",
    "by", "stage", "payload_kg", "structural_fraction", "flies", "ascent_dv_km_s", "measures", "kernels",
    "bodies", "route", "keep", "apart_days", "c3_km2_s2", "min", "max", "hoatzin", "",
]  # fmt: skip
TOKENS = [
    '"',
    "\n[[encounter]]\n",
    "\n[stack]\n",
    "\n[launcher]\n",
    "=",
    "{",
    "}",
    "[",
    "]",
    ",",
    "-",
    "9",
    "\0",
    "\r",
]
CELLS = [
    "",
    "nan",
    "inf",
    "-5",
    "1e400",
    "0",
    "3",
    "11320",
    "abc",
    '"',
    "1;2",
    "é",
    "10,20",
    " 7 ",
    "# x",
    "\0",
]
PLANNED_DATES = 8000  # a scenario with more is admitted but not planned: that takes seconds


def nudged(chance: random.Random, value: Any) -> Any:
    """A value near the right one: where checks of ranges are."""
    match value:
        case bool():
            return not value
        case int() | float():
            return chance.choice(
                [
                    value * 1.1,
                    value * 0.9,
                    value + 1,
                    value - 1,
                    -value,
                    value * 10,
                    value / 10,
                    value * 1e6,
                    str(value),
                ]
            )
        case str():
            cut = chance.randrange(len(value) + 1)
            return chance.choice(
                [value[:cut], value[:cut] + "x" + value[cut:], value.upper(), [value], value[::-1]]
            )
        case date() if not isinstance(value, datetime):
            shifted = value.toordinal() + chance.choice([-400, -30, -1, 1, 30, 400, 40000])
            return date.fromordinal(max(1, min(shifted, date.max.toordinal())))
        case list():
            return chance.choice([value[:-1], value * 2, value[::-1], value * 40])
        case dict():
            return chance.choice([{}, dict(list(value.items())[:-1]), list(value), [value]])
    return value


def inside(table: dict, path: tuple) -> tuple[Any, Any]:
    """The table or list that holds what a path leads to, and the key or index of it there."""
    *way, last = path
    parent: Any = table
    for key in way:
        parent = parent[key]
    return parent, last


def keys_of(parent: Any) -> Iterable:
    return parent if isinstance(parent, dict) else range(len(parent))


def mutated_table(chance: random.Random, text: str) -> str:
    """The scenario with one to four of its values or keys changed."""
    table = tomllib.loads(text)
    for _ in range(chance.choice([1, 1, 1, 1, 2, 4])):
        spots = places(table)
        if not spots:
            break
        parent, last = inside(table, chance.choice(spots))
        deed = chance.choice([*["nudge"] * 6, "replace", "remove", "add", "repeat", "swap", "rename"])
        if deed == "replace":
            parent[last] = copy.deepcopy(chance.choice(ODD))
        elif deed == "nudge":
            while isinstance(parent[last], dict | list) and parent[last] and chance.random() < 0.95:
                parent, last = parent[last], chance.choice(list(keys_of(parent[last])))
            parent[last] = nudged(chance, parent[last])
        elif deed == "remove":
            del parent[last]
        elif deed == "swap":
            other = chance.choice(list(keys_of(parent)))
            parent[last], parent[other] = parent[other], parent[last]
        elif isinstance(parent, list):
            parent.append(copy.deepcopy(parent[last]))
        elif deed == "rename":
            parent[chance.choice([*KEYS, f"{last}s"])] = parent.pop(last)
        else:
            parent[chance.choice(KEYS)] = copy.deepcopy(chance.choice([*ODD, parent[last]]))
    return document(table)


def mutated_text(chance: random.Random, text: str, tokens: list[str]) -> str:
    """The text with one to three lines or stretches removed, doubled, moved or replaced."""
    for _ in range(chance.choice([1, 1, 1, 3])):
        lines = text.splitlines(keepends=True)
        if not lines:
            break
        at, other = chance.randrange(len(lines)), chance.randrange(len(lines))
        start = chance.randrange(len(text) + 1)
        match chance.choice(["drop", "double", "swap", "token", "token", "cut", "end"]):
            case "drop":
                del lines[at]
                text = "".join(lines)
            case "double":
                text = "".join([*lines[:at], lines[at], *lines[at:]])
            case "swap":
                lines[at], lines[other] = lines[other], lines[at]
                text = "".join(lines)
            case "token":
                text = text[:start] + chance.choice(tokens) + text[start + chance.randint(0, 3) :]
            case "cut":
                text = text[:start] + text[start + chance.randint(1, 40) :]
            case "end":
                text = text[:start]
    return text


def mutated_csv(chance: random.Random, text: str) -> str:
    """A launcher's table with a cell or two replaced, or changed as a text is."""
    if chance.random() < 0.4:
        return mutated_text(chance, text, [",", "\n", "-", "e", "#", '"', "nan"])
    rows = [line.split(",") for line in text.splitlines()]
    for _ in range(chance.randint(1, 2)):
        row = chance.choice([each for each in rows if len(each) > 1] or rows)
        row[chance.randrange(len(row))] = chance.choice(CELLS)
    return "\n".join(map(",".join, rows)) + "\n"


@pytest.fixture(scope="module")
def folder(tmp_path_factory) -> Path:
    """A folder with the shipped launchers' tables, for the mutants beside them."""
    folder = tmp_path_factory.mktemp("mutants")
    shutil.copytree(SHIPPED / "launchers", folder / "launchers")
    return folder


def mutant(folder: Path, seed: int) -> Path:
    """The scenario of a seed, written beside the launchers' tables, of which one may be mutated as well."""
    chance = random.Random(seed)
    for name in LAUNCHERS:
        shutil.copyfile(SHIPPED / "launchers" / name, folder / "launchers" / name)
    kind = chance.choice(["table", "table", "text", "csv", "csv and table"])
    text = TEXTS[chance.choice([name for name in TEXTS if "csv" not in kind or "launchers/" in TEXTS[name]])]
    if "csv" in kind:
        named = [name for name in LAUNCHERS if f'"launchers/{name}"' in text]
        path = folder / "launchers" / chance.choice(named)
        path.write_text(mutated_csv(chance, path.read_text(encoding="utf-8")), encoding="utf-8", newline="")
    if "table" in kind:
        text = mutated_table(chance, text)
    elif kind == "text":
        text = mutated_text(chance, text, TOKENS)
    path = folder / "mutant.toml"
    path.write_text(text, encoding="utf-8", newline="")
    return path


def fate(path: Path) -> str:
    """Whether a scenario is planned, admitted only, or refused; what is said must be fit to be read."""
    try:
        routes = load_routes(path)
        if sum(len(each.epochs_jd()) for route in routes for each in route.encounters) > PLANNED_DATES:
            return "admitted"
        for route in routes:
            assert make_plan(route).tiles
    except RequestError as error:
        faults = error.faults
    else:
        return "planned"
    assert faults
    for fault in faults:
        assert fault.startswith(f"{path}: "), fault
        assert len(fault.splitlines()) == 1, fault
        assert len(fault) < 1200, fault
    return "refused"


def fates(folder: Path, seeds: range) -> Counter[str]:
    count: Counter[str] = Counter()
    for seed in seeds:
        try:
            count[fate(mutant(folder, seed))] += 1
        except Exception as error:
            raise AssertionError(f"seed {seed} is neither admitted nor refused") from error
    print(dict(count))
    return count


def test_hundreds_of_mutants_are_admitted_or_refused(folder):
    count = fates(folder, range(200))
    assert min(count["planned"], count["refused"]) > 30  # neither all broken nor all unharmed


@pytest.mark.slow
@pytest.mark.parametrize("thousand", range(10))
def test_ten_thousand_mutants_are_admitted_or_refused(folder, thousand):
    fates(folder, range(10_000 + 1000 * thousand, 11_000 + 1000 * thousand))


def test_the_shipped_scenarios_themselves_are_planned(folder):
    mutant(folder, 0)  # puts the tables in order for what is not of their kind
    for name in LAUNCHERS:
        shutil.copyfile(SHIPPED / "launchers" / name, folder / "launchers" / name)
    for name, text in TEXTS.items():
        (folder / name).write_text(text, encoding="utf-8")
        assert fate(folder / name) in ("planned", "admitted"), name


@pytest.fixture
def exit_code(monkeypatch, capsys) -> Callable[..., int]:
    """Run a command in this process; its exit code, once what it said has been looked at."""

    def run(*arguments: str | Path) -> int:
        monkeypatch.setattr("sys.argv", ["porkgrid", *map(str, arguments)])
        with pytest.raises(SystemExit) as ended:
            main()
        outputs = capsys.readouterr()
        code = ended.value.code or 0
        if code:
            assert outputs.out == ""
            assert all(line.startswith("porkgrid: ") for line in outputs.err.splitlines())
        return code

    return run


def agree(path: Path, exit_code: Callable[..., int]) -> None:
    """The command line ends with 0 for what is admitted and with 2 for what is refused."""
    try:
        load_routes(path)
    except RequestError:
        assert exit_code("sweep", path, "--out", path.parent / "survey") == 2
        assert exit_code("check", path) == 2
        assert not (path.parent / "survey").exists()
    else:
        assert exit_code("measures", path) in (0, 2)  # 2: a campaign of several routes


@pytest.mark.parametrize("seed", range(500, 512))
def test_the_command_line_ends_with_0_or_2(folder, exit_code, seed):
    agree(mutant(folder, seed), exit_code)


@pytest.mark.slow
@pytest.mark.parametrize("seed", range(20_000, 20_300))
def test_the_command_line_ends_with_0_or_2_for_many_more(folder, exit_code, seed):
    agree(mutant(folder, seed), exit_code)


@pytest.mark.slow
@pytest.mark.parametrize("seed", range(30_000, 30_060))
def test_what_is_admitted_can_be_checked(folder, exit_code, seed):
    """A tile of it is swept, where the grid is not too large for a test."""
    path = mutant(folder, seed)
    if fate(path) == "planned":
        assert exit_code("check", path) in (0, 2)

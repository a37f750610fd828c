"""The rule of rooms: imports point one way, and what is cheap to ask does not pay for what is dear."""

from __future__ import annotations

import ast
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

import porkgrid

PACKAGE = Path(porkgrid.__file__).parent

# From the ground up. Rooms of one level do not see each other; errors and showing are for all but physics.
LEVELS = [
    {"errors", "showing"},
    {"physics"},
    {"sky"},
    {"scenario"},
    {"survey"},
    {"figures", "handoff", "page", "terminal"},
    {"reports"},
    {"commands"},
    {"cli"},
]
LEVEL_OF = {room: level for level, rooms in enumerate(LEVELS) for room in rooms}


def modules() -> list[Path]:
    return sorted(PACKAGE.rglob("*.py"))


def room_of(module: str) -> str:
    """Room of a dotted name: "porkgrid.survey.rank" is in "survey"."""
    return module.split(".")[1] if "." in module else "porkgrid"


def name_of(path: Path) -> str:
    parts = path.relative_to(PACKAGE.parent).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


def imports(path: Path) -> Iterator[tuple[str, str | None]]:
    """(module, imported name) of every import of ours in a file, also those in functions and for types."""
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            yield from ((alias.name, None) for alias in node.names if alias.name.startswith("porkgrid"))
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}: a relative import hides where it points"
            if node.module and node.module.split(".")[0] == "porkgrid":
                yield from ((node.module, alias.name) for alias in node.names)


def target_room(module: str, name: str | None) -> str:
    return name or "porkgrid" if module == "porkgrid" else room_of(module)


def edges() -> Iterator[tuple[Path, str, str]]:
    for path in modules():
        for module, name in imports(path):
            yield path, room_of(name_of(path)), target_room(module, name)


def test_every_room_has_a_level():
    rooms = {room_of(name_of(path)) for path in modules()} - {"porkgrid", "__main__"}
    assert rooms <= LEVEL_OF.keys()


def test_no_import_points_upward_or_across():
    assert len(list(edges())) > 50
    wrong = [
        f"{path.relative_to(PACKAGE)}: {room} imports {target}"
        for path, room, target in edges()
        if room in LEVEL_OF and target != room and LEVEL_OF[target] >= LEVEL_OF[room]
    ]
    assert wrong == []


def test_physics_imports_nothing_of_ours_but_physics():
    assert {target for _, room, target in edges() if room == "physics"} == {"physics"}


def test_names_with_a_leading_underscore_stay_in_their_file():
    borrowed = [
        f"{path.relative_to(PACKAGE)}: {module}.{name}"
        for path in modules()
        for module, name in imports(path)
        if any(part.startswith("_") and not part.startswith("__") for part in f"{module}.{name}".split("."))
    ]
    assert borrowed == []


def test_physics_reads_no_files_prints_nothing_and_knows_no_dates():
    """Pure functions of arrays and numbers: no modules for files, output or calendars, no print or open."""
    banned = {"pathlib", "os", "io", "json", "datetime", "rich", "typer", "pandas", "xarray", "jplephem"}
    for path in (PACKAGE / "physics").glob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if isinstance(node, ast.Import):
                assert not {alias.name.split(".")[0] for alias in node.names} & banned, path
            elif isinstance(node, ast.ImportFrom):
                assert (node.module or "").split(".")[0] not in banned, path
            elif isinstance(node, ast.Call) and isinstance(node.func, ast.Name):
                assert node.func.id not in {"print", "open"}, path


def modules_after(*arguments: str) -> set[str]:
    """Top-level modules that a Python with these arguments has loaded when it ends."""
    command = [sys.executable, "-X", "importtime", *arguments]
    done = subprocess.run(command, capture_output=True, text=True, check=False, timeout=60)
    assert done.returncode == 0, done.stderr[-500:]
    lines = [line for line in done.stderr.splitlines() if line.startswith("import time:")]
    return {line.rsplit("|", 1)[1].strip().split(".")[0] for line in lines}


HELP = "import sys; sys.argv = ['porkgrid', '--help']; from porkgrid.cli import main; main()"


@pytest.mark.parametrize("code", ["import porkgrid", HELP], ids=["import porkgrid", "porkgrid --help"])
def test_what_is_cheap_imports_nothing_dear(code):
    loaded = modules_after("-c", code)
    assert "porkgrid" in loaded
    assert not loaded & {"numba", "matplotlib", "xarray", "pandas", "zarr", "scipy", "astropy", "jplephem"}


def test_public_names_come_when_they_are_asked_for():
    for name in porkgrid.__all__:
        assert getattr(porkgrid, name) is not None
    with pytest.raises(AttributeError, match="no attribute 'sweeep'"):
        porkgrid.sweeep  # noqa: B018

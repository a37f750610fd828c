"""Commands in processes of their own: exit codes, what goes to which output, and what is left on disk."""

from __future__ import annotations

import json
import os
import pty
import re
import sys
from pathlib import Path

import pandas as pd
import pytest
from command import messages, porkgrid
from survey_scenarios import LEAN, ROOK, limited, written

from porkgrid.cli import main

COMMANDS = ["sweep", "chart", "rank", "check", "bodies", "measures"]
ESCAPE = "\x1b"


@pytest.fixture(scope="module")
def scenario(tmp_path_factory) -> Path:
    return written(tmp_path_factory.mktemp("rook"), ROOK)


@pytest.fixture(scope="module")
def swept(scenario):
    """(result, folder) of the first sweep."""
    folder = scenario.parent / "survey"
    return porkgrid("sweep", scenario, "--out", folder), folder


def table_of(printed: str) -> list[tuple[str, ...]]:
    """Rows that start with a rank and two dates."""
    return re.findall(r"^ *(\d+) +(\d{4}-\d\d-\d\d) +(\d{4}-\d\d-\d\d) ", printed, re.M)


@pytest.fixture
def here(monkeypatch, capsys):
    """Run a command in this process, where everything is loaded already; its outputs, .out and .err."""

    def run(*arguments: str | Path):
        monkeypatch.setattr("sys.argv", ["porkgrid", *map(str, arguments)])
        with pytest.raises(SystemExit) as ended:
            main()
        assert not ended.value.code
        return capsys.readouterr()

    return run


def test_help_is_there_for_every_command(here):
    result = porkgrid("--help")
    assert result.returncode == 0
    assert result.stderr == ""
    for command in COMMANDS:
        assert re.search(rf"^  {command} ", result.stdout, re.M)
        assert "--help" in here(command, "--help").out


def test_a_sweep_prints_the_table_and_draws_the_charts(swept):
    result, folder = swept
    assert result.returncode == 0, result.stderr
    csv = pd.read_csv(folder / "candidates.csv")
    shown = [(str(row["rank"]), row["departure"], row["arrival"]) for _, row in csv.iterrows()]
    assert table_of(result.stdout) == shown
    assert "dv_total_km_s" in result.stdout
    figures = [folder / "figures" / name for name in ("chart.png", "limits.png")]
    assert messages(result) == [*map(str, figures), f"survey in {folder}"]
    assert all(path.read_bytes().startswith(b"\x89PNG") for path in figures)


def test_what_does_not_go_to_a_terminal_has_no_colour_and_no_bar(swept):
    result, _ = swept
    for text in (result.stdout, result.stderr):
        assert ESCAPE not in text
        assert "\r" not in text
    assert "sweeping" not in result.stderr


def test_sweeping_again_tells_the_same_as_json(swept, scenario, here):
    _, folder = swept
    before = (folder / "survey.json").read_bytes()
    told = json.loads(here("sweep", scenario, "--out", folder, "--json").out)
    assert (told["name"], told["route"], told["cells"]) == ("Rook to Mars", "Earth → Mars", 43 * 59)
    assert told["survey"] == str(folder)
    assert told["closed"] == []
    assert all(Path(path).is_file() for path in told["figures"])
    expected = pd.read_csv(folder / "candidates.csv", dtype={"refined_note": "str"})
    assert told["candidates"] == expected.fillna({"refined_note": ""}).to_dict("records")
    assert (folder / "survey.json").read_bytes() == before


def test_ranking_by_another_measure(swept, here):
    _, folder = swept
    request = ("rank", folder, "--by", "tof_days", "--order", "most", "--keep", "2")
    ranked = json.loads(here(*request, "--json").out)
    assert [row["rank"] for row in ranked] == [1, 2]
    assert ranked[0]["tof_days"] >= ranked[1]["tof_days"]
    printed = here(*request).out
    assert table_of(printed) == [(str(row["rank"]), row["departure"], row["arrival"]) for row in ranked]
    assert "tof_days *" in printed


def test_a_chart_of_any_measure_in_any_format(swept, here):
    _, folder = swept
    measures = ("--of", "c3_km2_s2", "--lines", "v_inf_arrival_km_s")
    paths = [Path(line) for line in here("chart", folder, *measures, "--format", "svg").out.splitlines()]
    assert len(paths) >= 1
    assert all(path.suffix == ".svg" and b"<svg" in path.read_bytes()[:500] for path in paths)


def test_checking_says_what_a_sweep_would_cost(scenario, here):
    told = json.loads(here("check", scenario, "--json").out)
    assert told["cells"] == told["lambert_solves"] == 43 * 59
    assert min(told[key] for key in ("seconds", "memory_bytes", "disk_bytes", "workers", "tiles")) > 0
    assert "2,537 cells in 1 tile" in here("check", scenario).out


def test_bodies_are_listed_with_what_is_known_of_them(here):
    told = json.loads(here("bodies", "--json").out)
    assert told["mars"]["naif_id"] == 4
    assert told["earth"]["gm_km3_s2"] == pytest.approx(398_600.4355, rel=1e-9)
    assert {"mercury", "venus", "moon", "pluto"} <= told.keys()
    assert re.search(r"^ *venus +299 +324858\.592 ", here("bodies").out, re.M)


def test_measures_are_listed_for_all_routes_or_for_one(scenario, here):
    everything = json.loads(here("measures", "--json").out)
    assert {"name": "c3_km2_s2", "unit": "km²/s²"}.items() <= everything[2].items()
    mine = json.loads(here("measures", scenario, "--json").out)
    assert {"leg1_revs", "dv_capture_km_s"} <= {each["name"] for each in mine}
    assert "leg{n}_revs" in {each["name"] for each in everything}


def test_where_the_limits_forbid_every_cell_it_is_said_and_drawn_all_the_same(tmp_path, here):
    path = written(tmp_path, limited(LEAN, "c3_km2_s2 = { max = 5 }\ntof_days = { max = 400 }"))
    printed = here("sweep", path, "--out", tmp_path / "survey")
    said = printed.err.splitlines()
    assert said[0] == "The limits forbid every cell."
    assert said[1].startswith("Most costly: C3 at most 5 km²/s², which forbids ")
    assert re.fullmatch(r"The first cell opens with c3_km2_s2 max = \d+\.\d+ km²/s²\.", said[2])
    assert table_of(printed.out) == []
    for name in ("chart.png", "limits.png"):
        assert (tmp_path / "survey" / "figures" / name).stat().st_size > 10_000


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (["sweap"], "No such command 'sweap'"),
        (["sweep"], "Missing argument 'SCENARIO'"),
        (["sweep", "x.toml", "--workers", "0"], "Invalid value for '--workers'"),
        (["sweep", "x.toml", "--wrokers", "2"], "No such option"),
        (["rank", "x", "--order", "best"], "Invalid value for '--order'"),
        (["chart", "x", "--format", "jpg"], "Invalid value for '--format'"),
    ],
)
def test_a_wrong_command_line_exits_2_and_says_what_is_wrong(arguments, says):
    result = porkgrid(*arguments)
    assert result.returncode == 2
    assert says in result.stderr
    assert "Traceback" not in result.stderr
    assert result.stdout == ""


def on_a_terminal(code: str, no_color: str) -> str:
    """All that a terminal is sent by a Python of its own that runs some code."""
    pid, terminal = pty.fork()
    if pid == 0:
        os.environ.update({"TERM": "xterm", "NO_COLOR": no_color})
        os.execv(sys.executable, [sys.executable, "-c", code])
    sent = b""
    try:
        while data := os.read(terminal, 4096):
            sent += data
    except OSError:  # how Linux says that the other end is closed
        pass
    _, status = os.waitpid(pid, 0)
    assert os.waitstatus_to_exitcode(status) == 0, sent.decode()
    return sent.decode()


PROGRESS = """
from porkgrid.survey.progress import Progress
from porkgrid import terminal
with terminal.sweep_progress(as_json=False) as report:
    for done in (10, 20) if report else ():
        report(Progress(1, 4, done, 40, 4.7, 2.5e6, 75.0))
terminal.print_table(("body", "id"), [("mars", "4")], "Bodies")
"""


def test_a_terminal_sees_a_bar_with_the_best_so_far():
    sent = on_a_terminal(PROGRESS, no_color="")
    assert "50%" in sent
    assert "2.5 million cells/s  1:15 left  best 4.7" in sent
    assert ESCAPE in sent


def test_no_color_leaves_neither_bar_nor_colour_nor_motion_of_the_cursor():
    sent = on_a_terminal(PROGRESS, no_color="1")
    assert "%" not in sent
    assert "mars" in sent
    styles = re.findall(ESCAPE + r"\[([^a-zA-Z]*)([a-zA-Z])", sent)
    assert all(kind == "m" and set(code.split(";")) <= {"0", "1", "2", "3"} for code, kind in styles)

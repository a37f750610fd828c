"""One process at a time, with real processes: refused, freed by a kill, and told of by name."""

from __future__ import annotations

import json
import os
import platform
import signal
import subprocess
import sys
from pathlib import Path

import pytest

from porkgrid.errors import RequestError
from porkgrid.survey.lock import LOCK, held

HOLDER = """
import sys
from pathlib import Path
from porkgrid.survey.lock import held
with held(Path(sys.argv[1])) as dead:
    print(dead, flush=True)
    sys.stdin.read()
"""


@pytest.fixture
def holder(tmp_path):
    """Start a process that holds the folder until told to end; the process and who it says has died."""
    started = []

    def start(folder: Path) -> tuple[subprocess.Popen[str], str]:
        process = subprocess.Popen(
            [sys.executable, "-c", HOLDER, str(folder)],
            stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True,
        )  # fmt: skip
        started.append(process)
        return process, process.stdout.readline().strip()

    yield start
    for process in started:
        process.kill()
        process.communicate()


def test_a_second_process_is_refused_and_told_who_holds_the_folder_where_and_since_when(tmp_path, holder):
    first, dead = holder(tmp_path / "survey")
    assert dead == "None"
    told = json.loads((tmp_path / "survey" / LOCK).read_text())
    assert (told["process"], told["machine"]) == (first.pid, platform.node())
    words = f"process {first.pid} on {platform.node()} since {told['since']}"
    with pytest.raises(RequestError, match="is being swept by") as caught, held(tmp_path / "survey"):
        pass
    assert words in str(caught.value)
    assert str(caught.value).startswith(f"{tmp_path / 'survey'}: ")
    second, _ = holder(tmp_path / "survey")
    _, error = second.communicate()
    assert second.returncode != 0
    assert words in error


def test_who_holds_it_is_not_forgotten_when_somebody_is_refused(tmp_path, holder):
    first, _ = holder(tmp_path)
    for _ in range(3):
        with pytest.raises(RequestError, match=f"process {first.pid} on"), held(tmp_path):
            pass


def test_one_that_ends_in_good_order_leaves_the_folder_free_and_names_nobody(tmp_path, holder):
    first, _ = holder(tmp_path)
    first.communicate("")
    assert first.returncode == 0
    assert (tmp_path / LOCK).read_bytes() == b""
    with held(tmp_path) as dead:
        assert dead is None


def test_a_kill_frees_the_folder_and_the_next_is_told_who_died(tmp_path, holder):
    first, _ = holder(tmp_path)
    first.send_signal(signal.SIGKILL)
    first.wait()
    second, dead = holder(tmp_path)
    assert dead.startswith(f"process {first.pid} on {platform.node()} since 2")
    second.communicate("")
    with held(tmp_path) as nobody:
        assert nobody is None


def test_an_error_within_frees_the_folder_too(tmp_path):
    with pytest.raises(KeyError), held(tmp_path):
        raise KeyError
    with held(tmp_path) as dead:
        assert dead is None


def test_within_one_process_a_second_sweep_is_refused_as_well(tmp_path):
    with held(tmp_path), pytest.raises(RequestError, match=f"process {os.getpid()} on"), held(tmp_path):
        pass


@pytest.mark.parametrize("content", [b"", b"{", b"[]", b"7", b'{"process": 1}', b"\0" * 60, b"\xff\xfe\xfd"])
def test_a_lock_file_that_a_crash_has_blotted_hinders_nobody(tmp_path, content):
    (tmp_path / LOCK).write_bytes(content)
    with held(tmp_path) as dead:
        assert dead is None
        assert json.loads((tmp_path / LOCK).read_text())["process"] == os.getpid()


def test_a_folder_that_is_not_there_is_made(tmp_path):
    with held(tmp_path / "surveys" / "deep"):
        assert (tmp_path / "surveys" / "deep" / LOCK).exists()

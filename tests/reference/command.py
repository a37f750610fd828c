"""The command line as a user runs it: in a process of its own, with its exit code and both its outputs."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Mapping
from pathlib import Path

PORKGRID = [sys.executable, "-c", "from porkgrid.cli import main; main()"]


def porkgrid(
    *arguments: str | Path, cwd: Path | None = None, env: Mapping[str, str] | None = None
) -> subprocess.CompletedProcess[str]:
    """Run a command; outputs are captured, so that neither is a terminal."""
    return subprocess.run(
        [*PORKGRID, *map(str, arguments)],
        capture_output=True, text=True, check=False, timeout=180, cwd=cwd, env={**os.environ, **(env or {})},
    )  # fmt: skip


def messages(result: subprocess.CompletedProcess[str]) -> list[str]:
    """What was said on standard error, without what a first run says of compiling."""
    return [line for line in result.stderr.splitlines() if not line.startswith("compiling the kernels")]


def assert_refused(result: subprocess.CompletedProcess[str], code: int, *fragments: str) -> None:
    """One clear message per fragment and no more, the exit code, no traceback, nothing on standard output."""
    said = messages(result)
    assert result.returncode == code, result.stderr
    assert len(said) == len(fragments), result.stderr
    for line, fragment in zip(said, fragments, strict=True):
        assert line.startswith("porkgrid: ")
        assert fragment in line
    assert result.stdout == ""

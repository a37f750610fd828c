"""Run a command as a process of its own and learn what it cost: seconds, processor time, peak memory."""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
import time
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

PORKGRID = [sys.executable, "-c", "from porkgrid.cli import main; main()"]


@dataclass(frozen=True)
class Spent:
    """What one run cost, and what it said on standard error."""

    seconds: float
    cpu_seconds: float  # user and system, all threads: steadier than the clock on a shared machine
    peak_bytes: int
    said: str


def run(command: Sequence[str], environment: Mapping[str, str] | None = None) -> Spent:
    """Run a command to its end, its output thrown away; CalledProcessError where it fails.

    `environment` adds to this process's own. Peak memory is the largest resident size (getrusage, wait4).
    """
    with tempfile.TemporaryFile() as errors:
        started = time.perf_counter()
        child = subprocess.Popen(
            command, stdout=subprocess.DEVNULL, stderr=errors, env=os.environ | dict(environment or {})
        )
        _, status, usage = os.wait4(child.pid, 0)
        seconds = time.perf_counter() - started
        child.returncode = os.waitstatus_to_exitcode(status)
        errors.seek(0)
        said = errors.read().decode()
    if child.returncode:
        raise subprocess.CalledProcessError(child.returncode, command, stderr=said)
    unit = 1 if sys.platform == "darwin" else 1024  # ru_maxrss: kilobytes, on macOS bytes
    return Spent(seconds, usage.ru_utime + usage.ru_stime, usage.ru_maxrss * unit, said)


def verdict(met: bool) -> str:
    """Say whether a target is met."""
    return "met" if met else "MISSED"

"""Processes that have everything loaded before they start: for tests that start many and kill most.

A process of its own loads the engine and compiles its kernels, then forks once per request. What it brings up
are real processes, to be killed as such. Run as a script it is that process; `Nursery` talks to it.
"""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
import traceback
from pathlib import Path

READY = "ready"


class Child:
    """A process that a nursery has brought up."""

    def __init__(self, nursery: Nursery, pid: int, said: Path) -> None:
        self._nursery, self.pid, self._said = nursery, pid, said
        self.returncode: int | None = None

    def poll(self) -> int | None:
        """The exit code, minus the signal for one that was killed; None while it runs."""
        if self.returncode is None:
            self.returncode = self._nursery.ask({"poll": self.pid})
        return self.returncode

    def send(self, number: signal.Signals) -> None:
        """Send a signal, unless it has ended."""
        if self.poll() is None:
            os.kill(self.pid, number)

    def wait(self, seconds: float = 120.0) -> str:
        """Wait for its end; what it said on standard error."""
        deadline = time.monotonic() + seconds
        while self.poll() is None:
            if time.monotonic() > deadline:
                self.send(signal.SIGKILL)
                raise AssertionError(f"still running after {seconds} s: {self._said.read_text()}")
            time.sleep(0.002)
        return self._said.read_text(encoding="utf-8")


class Nursery:
    """Brings up processes that sweep. Use it as a context."""

    def __init__(self, scenario: Path, folder: Path) -> None:
        """`scenario` tells which kernels to compile, `folder` is for what the processes say."""
        self._folder, self._count = folder, 0
        self._process = subprocess.Popen(
            [sys.executable, __file__, str(scenario)],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            text=True,
        )
        assert self._process.stdout is not None
        assert self._process.stdout.readline().strip() == READY

    def __enter__(self) -> Nursery:
        return self

    def __exit__(self, *_: object) -> None:
        self._process.communicate()

    def ask(self, request: dict) -> int | None:
        """One request and its answer."""
        assert self._process.stdin is not None
        assert self._process.stdout is not None
        self._process.stdin.write(json.dumps(request) + "\n")
        self._process.stdin.flush()
        return json.loads(self._process.stdout.readline())

    def sweep(self, scenario: Path, folder: Path, workers: int) -> Child:
        """Start porkgrid.sweep."""
        return self._child({"sweep": [str(scenario), str(folder), workers]})

    def command(self, *arguments: str | Path) -> Child:
        """Start the command line."""
        return self._child({"command": [*map(str, arguments)]})

    def _child(self, request: dict) -> Child:
        self._count += 1
        said = self._folder / f"said-{self._count}"
        pid = self.ask(request | {"said": str(said)})
        assert pid is not None
        return Child(self, pid, said)


def bring_up(request: dict) -> int:
    """Fork a process that does what is requested; its number."""
    pid = os.fork()
    if pid:
        return pid
    said = os.open(request["said"], os.O_WRONLY | os.O_CREAT | os.O_TRUNC)
    os.dup2(os.open(os.devnull, os.O_RDWR), 0)
    os.dup2(os.open(os.devnull, os.O_RDWR), 1)
    os.dup2(said, 2)
    try:
        if "sweep" in request:
            run_sweep(*request["sweep"])
        else:
            sys.argv = ["porkgrid", *request["command"]]
            main()
        code = 0
    except SystemExit as end:
        code = end.code if isinstance(end.code, int) else 0
    except (RequestError, RunError) as error:
        print(f"{type(error).__name__}: {error}", file=sys.stderr)
        code = 2 if isinstance(error, RequestError) else 1
    except KeyboardInterrupt:
        code = 130
    except BaseException:
        traceback.print_exc()
        code = 99
    sys.stderr.flush()
    os._exit(code)


def run_sweep(scenario: str, folder: str, workers: int) -> None:
    """A sweep as the command does it, without what it prints and draws."""
    signal.signal(signal.SIGTERM, signal.default_int_handler)
    sweep(load_scenario(scenario), folder, workers)


def serve() -> None:
    """Answer requests until there are no more."""
    print(READY, flush=True)
    for line in sys.stdin:
        request = json.loads(line)
        if "poll" in request:
            pid, status = os.waitpid(request["poll"], os.WNOHANG)
            answer = os.waitstatus_to_exitcode(status) if pid else None
        else:
            answer = bring_up(request)
        print(json.dumps(answer), flush=True)


if __name__ == "__main__":
    from porkgrid.cli import main
    from porkgrid.errors import RequestError, RunError
    from porkgrid.survey import plan as plans
    from porkgrid.survey.admit import load_scenario
    from porkgrid.survey.sweep import sweep, warm_up

    plans.TILE_CELLS, plans.TILE_COLUMNS = 1024, 64  # small, so that a small grid has many
    warm_up(plans.make_plan(load_scenario(sys.argv[1])))
    serve()

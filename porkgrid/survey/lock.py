"""One process at a time sweeps into a folder."""

from __future__ import annotations

import fcntl
import json
import os
import platform
from collections.abc import Iterator
from contextlib import contextmanager
from datetime import UTC, datetime
from pathlib import Path
from typing import IO

from porkgrid.errors import RequestError

LOCK = "sweep.lock"


@contextmanager
def held(folder: Path) -> Iterator[str | None]:
    """Hold the folder for this process; yields who held it and died, if that is so, in words.

    RequestError where another process holds it. The lock is the system's, which lets go of it when a process
    ends in whatever way; the file tells who holds it, and is left empty.
    """
    folder.mkdir(parents=True, exist_ok=True)
    with (folder / LOCK).open("a+", encoding="utf-8") as file:
        try:
            fcntl.flock(file, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except BlockingIOError:
            raise RequestError(
                f"{folder}: is being swept by {_holder(file) or 'another process'}; wait for it, stop it, or "
                "give another folder with --out"
            ) from None
        dead = _holder(file)
        file.truncate(0)
        json.dump(_ourselves(), file)
        file.flush()
        try:
            yield dead
        finally:
            file.truncate(0)


def _ourselves() -> dict[str, object]:
    return {
        "process": os.getpid(),
        "machine": platform.node(),
        "since": datetime.now(UTC).isoformat(timespec="seconds"),
    }


def _holder(file: IO[str]) -> str | None:
    file.seek(0)
    try:
        holder = json.loads(file.read())
        return f"process {holder['process']} on {holder['machine']} since {holder['since']}"
    except (ValueError, KeyError, TypeError):
        return None

"""The two ways a request can end badly, worded for the person who can mend it."""

from __future__ import annotations

from collections.abc import Sequence


class RequestError(Exception):
    """The request itself is wrong: a scenario, an option, a kernel (exit code 2)."""

    def __init__(self, *faults: str) -> None:
        super().__init__("\n".join(faults))
        self.faults: Sequence[str] = faults


class RunError(Exception):
    """The request was right but the run failed: no permission, disk full (exit code 1)."""

"""The two ways a request can end badly, worded for the person who can mend it."""

from __future__ import annotations

from collections.abc import Sequence


class RequestError(Exception):
    """The request itself is wrong: a scenario, an option, a kernel (exit code 2).

    `faults` has all that is wrong, a line each, with what would be right.

    >>> try:
    ...     porkgrid.open_survey("surveys")
    ... except porkgrid.RequestError as error:
    ...     print(error)
    surveys: not a survey folder: it has no survey.json; `porkgrid sweep` makes one
    """

    def __init__(self, *faults: str) -> None:
        super().__init__("\n".join(faults))
        self.faults: Sequence[str] = faults


class RunError(Exception):
    """The request was right but the run failed: no permission, disk full (exit code 1).

    What was written until then is kept, and the same call goes on from there.

    >>> scenario = porkgrid.load_scenario("scenarios/tern-to-mars.toml")
    >>> try:
    ...     porkgrid.sweep(scenario, out="scenarios/tern-to-mars.toml/survey")
    ... except porkgrid.RunError as error:
    ...     print(error)
    scenarios/tern-to-mars.toml/survey: Not a directory
    """

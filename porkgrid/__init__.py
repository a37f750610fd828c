"""porkgrid: launch-window porkchop surveys with contour charts and ranked dates.

The public names, imported when first used, so that `porkgrid --help` does not pay for them.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from porkgrid.errors import RequestError as RequestError
    from porkgrid.errors import RunError as RunError
    from porkgrid.physics.lambert import lambert as lambert
    from porkgrid.reports.survey import Survey as Survey
    from porkgrid.reports.survey import open_survey as open_survey
    from porkgrid.reports.survey import sweep as sweep
    from porkgrid.scenario import Scenario as Scenario
    from porkgrid.survey.admit import load_scenario as load_scenario

_HOMES = {
    "RequestError": "porkgrid.errors",
    "RunError": "porkgrid.errors",
    "Scenario": "porkgrid.scenario",
    "Survey": "porkgrid.reports.survey",
    "lambert": "porkgrid.physics.lambert",
    "load_scenario": "porkgrid.survey.admit",
    "open_survey": "porkgrid.reports.survey",
    "sweep": "porkgrid.reports.survey",
}
__all__ = [*_HOMES]


def __getattr__(name: str) -> Any:
    if name in _HOMES:
        return getattr(import_module(_HOMES[name]), name)
    raise AttributeError(f"module 'porkgrid' has no attribute {name!r}")


def __dir__() -> list[str]:
    return __all__

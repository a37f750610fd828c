"""What a launch period asks of launcher and spacecraft: the worst day of every measure that sizes one."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from porkgrid.survey.plan import Plan
from porkgrid.survey.surveys import Survey
from porkgrid.survey.view import better_sign

MASS_MARGIN = "mass_margin_kg"
C3 = "c3_km2_s2"
_ENERGY = (C3, "dla_deg", "v_inf_arrival_km_s", "entry_speed_km_s")


@dataclass(frozen=True)
class Need:
    """The worst value of a measure over a period, and the departure, an ISO date, that has it.

    name is that of the measure; of the launch asymptote's declination the magnitude counts: `abs_dla_deg`.
    """

    name: str
    unit: str
    worst: float
    on: str


def needs_of(survey: Survey, days: pd.DataFrame) -> tuple[Need, ...]:
    """The required capability of a table of days: energy, declination, speeds, burns and masses."""
    found = []
    for name in sizing_measures(survey.plan):
        values = days[name].to_numpy()
        if name == "dla_deg":
            values, label, sign = np.abs(values), "abs_dla_deg", 1.0
        else:
            label, sign = name, better_sign(survey, name)
        if np.isnan(values).all():
            continue
        worst = int(np.nanargmax(sign * values))
        unit = survey.plan.measures[name].unit
        found.append(Need(label, unit, float(values[worst]), str(days["departure"].iloc[worst])))
    return tuple(found)


def sizing_measures(plan: Plan) -> list[str]:
    """Measures that size a launcher, a tank or a heat shield, those that the route has, in flying order."""
    burns = [name for name in plan.measures if name.endswith("_burn_km_s")]
    masses = [name for name, measure in plan.measures.items() if measure.unit == "kg"]
    names = [*_ENERGY, "dv_departure_km_s", *burns, "dv_capture_km_s", "dv_total_km_s", *masses]
    return [name for name in dict.fromkeys(names) if name in plan.measures]


def margin_of(plan: Plan, days: pd.DataFrame) -> tuple[pd.DataFrame, str]:
    """The table with its margin, and the margin's column.

    That is the mass margin where the route has one; else how far C3 is below the scenario's limit; else,
    without a limit, how far it is below the worst day's.
    """
    if MASS_MARGIN in plan.measures:
        return days, MASS_MARGIN
    limit = next((bound.most for bound in plan.bounds if bound.measure.name == C3), None)
    name, top = (
        ("c3_below_worst_km2_s2", days[C3].max()) if limit is None else ("c3_below_limit_km2_s2", limit)
    )
    return days.assign(**{name: top - days[C3]}), name

"""A survey as it lies on disk, opened for reading."""

from __future__ import annotations

from dataclasses import replace
from functools import cached_property
from pathlib import Path
from typing import Any

import pandas as pd
import xarray as xr

from porkgrid.errors import RequestError
from porkgrid.scenario import Scenario
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.folder import (
    CANDIDATES,
    COMPLETE,
    REFINED,
    SCENARIO,
    differences,
    fingerprint,
    read_provenance,
)
from porkgrid.survey.plan import Plan, make_plan
from porkgrid.survey.reading import open_grid
from porkgrid.survey.showing import survey_html, survey_line

_RANK_AGAIN = "`porkgrid sweep` with the same scenario writes it again"


class Survey:
    """A survey folder. Nothing is read before it is asked for.

    path: the folder. provenance: what survey.json says of versions, kernels, cells and times.

    >>> survey.provenance["route"], survey.provenance["cells"]
    ('Earth → Mars', 2130)
    """

    def __init__(self, path: Path, provenance: dict[str, Any]) -> None:
        self.path = path
        self.provenance = provenance

    @cached_property
    def grid(self) -> xr.Dataset:
        """The measures of every cell: dimensions `departure` and `arrival`, and `blocked_by`.

        Measures are float32, epochs float64 (TDB Julian dates), `blocked_by` uint32 with a bit for each limit
        that forbids the cell, 0 where it is allowed. Units are in each variable's attributes.
        RequestError, here or when values are read, where the grid on disk is not as it was written.

        >>> c3 = survey.grid["c3_km2_s2"]
        >>> c3.dims, c3.shape, c3.attrs["units"]
        (('departure', 'arrival'), (71, 30), 'km²/s²')
        """
        dates = self.provenance["grid"]
        shape = dates["departure_dates"], dates["arrival_dates"]
        return open_grid(self.path, shape, self.provenance.get("stored", ()))

    @cached_property
    def candidates(self) -> pd.DataFrame:
        """The ranked table: rank, ISO dates, then measures in the units of their names, at full precision.

        RequestError where the file is not that.

        >>> survey.candidates.loc[0, "dv_total_km_s"] == survey.candidates["dv_total_km_s"].min()
        np.True_
        """
        path = self.path / CANDIDATES
        try:
            table = pd.read_csv(path, dtype={"refined_note": "str"}).fillna({"refined_note": ""})
        except (OSError, ValueError) as error:  # of a parser, of a decoder
            raise RequestError(f"{path}: cannot be read: {error}; {_RANK_AGAIN}") from None
        if "rank" not in table:
            raise RequestError(f"{path}: has no column rank; {_RANK_AGAIN}")
        return table

    @cached_property
    def refined(self) -> pd.DataFrame:
        """The candidates with their dates let off the grid: rank, ISO dates and times, then measures.

        >>> len(survey.refined) == len(survey.candidates)
        True
        """
        return pd.read_csv(self.path / REFINED)

    @cached_property
    def scenario(self) -> Scenario:
        """The scenario as it was given. RequestError where a table beside it has changed since the sweep.

        >>> survey.scenario.name
        'Tern to Mars'
        """
        scenario = load_scenario(self.path / SCENARIO, Path(self.provenance["scenario_folder"]))
        if fingerprint(scenario) != self.provenance["fingerprint"]:
            raise RequestError(
                f"{self.path}: the scenario or a table that it names is not what was swept: "
                f"{', '.join(differences(self.provenance['asked'], scenario))}; sweep it anew with --fresh"
            )
        return scenario

    @cached_property
    def plan(self) -> Plan:
        """The scenario with its tables, limits and measures looked up anew.

        Tables are of states at each encounter's dates, km and km/s from the Sun in the axes of the ICRF.

        >>> survey.plan.measures["c3_km2_s2"].unit, survey.plan.tables[0].position.shape
        ('km²/s²', (3, 71))
        """
        return replace(make_plan(self.scenario), **self.provenance.get("tiles", {}))

    def __repr__(self) -> str:
        return survey_line(self)

    def _repr_html_(self) -> str:
        return survey_html(self)


def open_survey(path: str | Path) -> Survey:
    """Open a survey folder. RequestError where it is none, or is not finished.

    Python users get the survey with methods, porkgrid.reports.survey.
    """
    folder = Path(path)
    provenance = read_provenance(folder)
    if provenance["state"] != COMPLETE:
        raise RequestError(
            f"{folder}: the sweep is not finished; `porkgrid sweep` with the same scenario goes on"
        )
    return Survey(folder, provenance)

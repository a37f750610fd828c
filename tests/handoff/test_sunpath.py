"""The flight at even steps is the flight."""

from __future__ import annotations

import numpy as np
import pytest
from handoff_flights import FLIGHTS, candidate_of, measures_of_flight, trajectory_of

from porkgrid.handoff.sunpath import sun_path
from porkgrid.physics.constants import AU_KM
from porkgrid.survey.sightlines import sightlines


@pytest.mark.parametrize("name", FLIGHTS)
def test_it_goes_from_the_first_encounter_to_the_last_and_through_all_between(name: str) -> None:
    plan, picked = candidate_of(name)
    jd, position = sun_path(trajectory_of(name))
    assert (jd[0], jd[-1]) == (picked.epochs[0], picked.epochs[-1])
    assert (np.diff(jd) > 0.0).all()
    for table, epoch in zip(plan.tables, picked.epochs, strict=True):
        (k,) = np.flatnonzero(jd == epoch)
        place, _ = plan.ephemeris.states(table.body, np.array([epoch]))
        assert np.linalg.norm(position[k] - place[:, 0]) < 1.0


@pytest.mark.parametrize("name", FLIGHTS)
def test_its_extremes_and_its_last_sight_are_those_of_the_measures(name: str) -> None:
    plan, _ = candidate_of(name)
    seen, measures = sightlines(plan.ephemeris, *sun_path(trajectory_of(name))), measures_of_flight(name)
    assert seen.sun_km.min() / AU_KM == pytest.approx(measures["sun_min_au"], rel=1e-5)
    assert seen.sun_km.max() / AU_KM == pytest.approx(measures["sun_max_au"], rel=1e-5)
    assert np.degrees(seen.angle_rad[-1]) == pytest.approx(measures["arrival_sep_deg"], abs=1e-6)
    assert seen.earth_km[-1] / AU_KM == pytest.approx(measures["arrival_earth_distance_au"], rel=1e-9)

"""Our messages as another reader of CCSDS 502.0-B finds them: the PyPI package `ccsds-ndm`, here 3.1.1.

It reads what `oem` does not, parameter messages with their manoeuvres, and is a second reader of the other.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from ccsds_ndm.ndm_io import NdmIo
from handoff_flights import CREATED, FLIGHTS, trajectory_of

from porkgrid.handoff.ccsds import epoch_text, spacecraft_id
from porkgrid.handoff.oem import write_oem
from porkgrid.handoff.opm import write_opms


def numbers(part: Any, names: tuple[str, ...]) -> list[float]:
    return [float(getattr(part, name).value) for name in names]


@pytest.mark.parametrize("name", FLIGHTS)
def test_states_and_burns_read_are_ours_to_the_digits_written(name: str, tmp_path: Path) -> None:
    trajectory = trajectory_of(name)
    paths = write_opms(tmp_path, trajectory, CREATED)
    for path, waypoint in zip(paths, trajectory.waypoints, strict=True):
        segment = NdmIo().from_path(path).body.segment
        assert segment.metadata.center_name == waypoint.centre_name
        assert segment.metadata.object_id == str(spacecraft_id(trajectory))
        assert (segment.metadata.ref_frame, segment.metadata.time_system) == ("ICRF", "TDB")
        state = segment.data.state_vector
        assert state.epoch == epoch_text(waypoint.jd_tdb)
        assert np.abs(np.array(numbers(state, ("x", "y", "z"))) - waypoint.position).max() <= 0.51e-6
        velocity = np.array(numbers(state, ("x_dot", "y_dot", "z_dot")))
        assert np.abs(velocity - waypoint.velocity).max() <= 0.51e-12
        read = segment.data.maneuver_parameters
        assert len(read) == len(waypoint.burns)
        for burn, found in zip(waypoint.burns, read, strict=True):
            assert found.man_epoch_ignition == epoch_text(burn.jd_tdb)
            dv = np.array(numbers(found, ("man_dv_1", "man_dv_2", "man_dv_3")))
            assert np.abs(dv - burn.dv_km_s).max() <= 0.51e-12
            assert float(found.man_delta_mass.value) == pytest.approx(
                -(burn.propellant_kg or 0.0), abs=0.51e-6
            )


def test_the_mass_read_is_that_before_the_first_burn(tmp_path: Path) -> None:
    trajectory = trajectory_of("one flyby")
    first, *_ = write_opms(tmp_path, trajectory, CREATED)
    mass = NdmIo().from_path(first).body.segment.data.spacecraft_parameters.mass
    assert float(mass.value) == pytest.approx(trajectory.burns[0].mass_before_kg, abs=0.51e-6)


@pytest.mark.parametrize("name", ["direct", "two flybys"])
def test_the_ephemeris_message_is_read_by_this_reader_too(name: str, tmp_path: Path) -> None:
    trajectory = trajectory_of(name)
    write_oem(tmp_path / "t.oem", trajectory, CREATED)
    segments = NdmIo().from_path(tmp_path / "t.oem").body.segment
    for ours, read in zip(trajectory.segments, segments, strict=True):
        assert read.metadata.center_name == ours.centre_name
        assert read.metadata.interpolation_degree == 7
        assert [state.epoch for state in read.data.state_vector] == [epoch_text(jd) for jd in ours.jd_tdb]
        position = np.array([numbers(state, ("x", "y", "z")) for state in read.data.state_vector])
        assert np.abs(position - ours.position).max() <= 0.5e-6 + 1e-15 * np.abs(ours.position).max()

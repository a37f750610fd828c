"""Masses along a route follow the rocket equation, and stages leave their structure behind."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest

from porkgrid.handoff.burnmasses import CAPTURE, INJECTION, with_masses
from porkgrid.handoff.trajectory import Burn
from porkgrid.physics.constants import G0_KM_S2
from porkgrid.scenario import Spacecraft, Stack, Stage
from porkgrid.scenario.launchers import Capability
from porkgrid.survey.masses import Masses

BURNS = [
    Burn(INJECTION, 2.46e6, np.array([0.0, 3.6, 0.0])),
    Burn("Flyby 1, at periapsis", 2.4601e6, np.array([0.05, 0.0, 0.0])),
    Burn(CAPTURE, 2.4602e6, np.array([0.0, 0.0, -1.1])),
]


def ratio(burn: Burn, isp_s: float) -> float:
    """Mass before over mass after."""
    return float(np.exp(np.linalg.norm(burn.dv_km_s) / (isp_s * G0_KM_S2)))


def after(burn: Burn) -> float:
    return burn.mass_before_kg - burn.propellant_kg


def test_a_spacecraft_alone_makes_every_burn_down_to_its_dry_mass() -> None:
    burns = with_masses(BURNS, Masses(spacecraft=Spacecraft(isp_s=320.0, dry_mass_kg=800.0)), None)
    assert after(burns[-1]) == pytest.approx(800.0)
    for burn, following in pairwise(burns):
        assert after(burn) == pytest.approx(following.mass_before_kg)
    for burn in burns:
        assert burn.mass_before_kg / after(burn) == pytest.approx(ratio(burn, 320.0))


def test_a_launcher_injects_without_propellant_of_the_spacecraft() -> None:
    table = Capability("Kittiwake", None, (0.0, 50.0), (4000.0, 2000.0))
    masses = Masses(capability=table, spacecraft=Spacecraft(isp_s=320.0))
    burns = with_masses(BURNS, masses, 1500.0)
    assert after(burns[-1]) == pytest.approx(1500.0)
    assert burns[0].propellant_kg == 0.0
    injected = 1500.0 * ratio(BURNS[1], 320.0) * ratio(BURNS[2], 320.0)
    assert burns[0].mass_before_kg == burns[1].mass_before_kg == pytest.approx(injected)


def test_stages_are_sized_from_the_top_and_dropped_when_they_are_spent() -> None:
    lower = Stage(isp_s=450.0, structural_fraction=0.1, flies=["departure"], ascent_dv_km_s=1.5)
    upper = Stage(isp_s=320.0, structural_fraction=0.15, flies=["flyby1", "capture"])
    burns = with_masses(BURNS, Masses(stack=Stack(payload_kg=1000.0, stages=(lower, upper))), None)
    injection, flyby, capture = burns
    assert after(flyby) == pytest.approx(capture.mass_before_kg)
    assert flyby.mass_before_kg / after(capture) == pytest.approx(
        ratio(BURNS[1], 320.0) * ratio(BURNS[2], 320.0)
    )

    structure, propellant = after(capture) - 1000.0, flyby.propellant_kg + capture.propellant_kg
    assert structure / (structure + propellant) == pytest.approx(0.15)

    assert injection.mass_before_kg / after(injection) == pytest.approx(ratio(BURNS[0], 450.0))
    lower_structure = after(injection) - flyby.mass_before_kg  # what is dropped between the two
    ascent = injection.mass_before_kg * (np.exp(1.5 / (450.0 * G0_KM_S2)) - 1.0)
    assert lower_structure / (lower_structure + injection.propellant_kg + ascent) == pytest.approx(0.1)


def test_what_is_not_given_stays_unknown() -> None:
    assert all(burn.mass_before_kg is None for burn in with_masses(BURNS, Masses(), None))

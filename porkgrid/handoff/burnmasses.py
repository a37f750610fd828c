"""What a spacecraft weighs before each burn and what the burn takes: the rocket equation along a route."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from porkgrid.handoff.trajectory import Burn
from porkgrid.physics.staging import mass_ratio, stage_propellant, stage_structure
from porkgrid.scenario import Stack
from porkgrid.survey.masses import Masses

INJECTION, CAPTURE = "Injection", "Capture"  # labels of burns; those of flybys begin with "Flyby 1"


def with_masses(burns: Sequence[Burn], masses: Masses, delivered_kg: float | None) -> tuple[Burn, ...]:
    """The burns with masses as far as a scenario tells them.

    A launcher makes the injection, for which the mass is then that of the spacecraft and the propellant zero:
    its own stages are not part of it, and `delivered_kg` is what is left after the last burn. A spacecraft
    without a launcher comes down to its dry mass. It, or a stack, makes every burn.
    """
    if masses.stack is not None:
        return _stacked(burns, masses.stack)
    if masses.spacecraft is None:
        return tuple(burns)
    launched = masses.capability is not None
    last_kg = delivered_kg if launched else masses.spacecraft.dry_mass_kg
    assert last_kg is not None  # admit.load_scenario asks for a dry mass where there is no launcher
    return _backward(burns, last_kg, masses.spacecraft.isp_s, launched)


def _backward(burns: Sequence[Burn], last_kg: float, isp_s: float, launched: bool) -> tuple[Burn, ...]:
    """Masses of one engine's burns, counted back from the mass after the last."""
    after, found = last_kg, []
    for burn in reversed(burns):
        own = not (launched and burn.label == INJECTION)
        before = after * float(mass_ratio(burn.size_km_s, isp_s)) if own else after
        found.append(replace(burn, mass_before_kg=before, propellant_kg=before - after))
        after = before
    return tuple(reversed(found))


def _stacked(burns: Sequence[Burn], stack: Stack) -> tuple[Burn, ...]:
    """Masses of the burns of stages, sized from the top down, that are left behind when they are spent."""
    named = dict(zip(_names(burns), burns, strict=True))
    above, found = stack.payload_kg, {}
    for stage in reversed(stack.stages):
        dv = stage.ascent_dv_km_s + sum(named[name].size_km_s for name in stage.flies)
        propellant = float(stage_propellant(above, dv, stage.isp_s, stage.structural_fraction))
        full = above + float(stage_structure(propellant, stage.structural_fraction)) + propellant
        before = full / float(mass_ratio(stage.ascent_dv_km_s, stage.isp_s))
        for name in stage.flies:
            after = before / float(mass_ratio(named[name].size_km_s, stage.isp_s))
            found[name] = replace(named[name], mass_before_kg=before, propellant_kg=before - after)
            before = after
        above = full
    return tuple(found[name] for name in named)


def _names(burns: Sequence[Burn]) -> list[str]:
    """What a scenario's stages call the burns: departure, flyby1, …, capture."""
    usual = {INJECTION: "departure", CAPTURE: "capture"}
    return [usual.get(burn.label, burn.label.split(",")[0].lower().replace(" ", "")) for burn in burns]

"""Flybys against integrated motion about the body (scipy's DOP853), which knows nothing of hyperbolas."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from porkgrid.physics.flyby import (
    aim_distance,
    aim_plane,
    burn,
    gain,
    heliocentric_turn,
    periapsis_radius,
    periapsis_speeds,
    turn,
    turn_angle,
)
from porkgrid.physics.lambert import ECLIPTIC_POLE_ICRF
from porkgrid.sky.bodies import BODIES

# So far out, in units of periapsis radius and gm/v∞² together, under 1e-12 of a radian is left of the turn.
FAR = 1e6

FLYBYS = [
    # body, v∞ before, v∞ after (km/s): a like turn, a sharp one, a slow one with much burn, a fast one
    ("venus", [6.1, 0.4, -1.0], [5.0, 3.4, -0.6]),
    ("earth", [-3.0, 2.0, 0.5], [3.0, 1.5, 1.0]),
    ("mars", [1.0, -0.6, 0.8], [0.2, 1.4, 2.4]),
    ("jupiter", [9.8, -4.0, 2.0], [-1.5, 10.5, 0.3]),
]


def integrate(gm, position, velocity, seconds, event=None):
    """Carry a planet-centred state by its own pull for `seconds` of either sign; stop at an event."""

    def pull(_, state):
        return np.concatenate([state[3:], -gm * state[:3] / np.linalg.norm(state[:3]) ** 3])

    start = np.concatenate([position, velocity])
    scale = 1e-13 * np.repeat([np.linalg.norm(position), np.linalg.norm(velocity)], 3)
    path = solve_ivp(pull, (0.0, seconds), start, method="DOP853", rtol=1e-13, atol=scale, events=event)
    return path.y[:3, -1], path.y[3:, -1]


def at_infinity(gm, position, velocity):
    """Return v∞ of a state far out, where the direction has settled but the speed has not."""
    distance, speed = np.linalg.norm(position), np.linalg.norm(velocity)
    return velocity / speed * np.sqrt(speed**2 - 2.0 * gm / distance)


def far(gm, radius, v_inf):
    return FAR * (radius + gm / v_inf**2)


def asymptote(gm, radius, speed, forward):
    """Integrate from a periapsis on the x axis, moving along y, out to where v∞ shows."""
    v_inf = np.sqrt(speed**2 - 2.0 * gm / radius)
    seconds = (1.0 if forward else -1.0) * far(gm, radius, v_inf) / v_inf
    return at_infinity(gm, *integrate(gm, [radius, 0.0, 0.0], [0.0, speed, 0.0], seconds))


@pytest.mark.parametrize(("body", "v_inf", "altitude"), [
    ("venus", 6.0, 300.0), ("earth", 0.8, 1000.0), ("mars", 12.0, 200.0), ("jupiter", 5.6, 650_000.0),
])  # fmt: skip
def test_an_integrated_hyperbola_turns_by_the_formula_and_keeps_its_speed(body, v_inf, altitude):
    gm, radius = BODIES[body].gm_km3_s2, BODIES[body].radius_km + altitude
    at_periapsis = np.sqrt(v_inf**2 + 2.0 * gm / radius)
    before, after = (asymptote(gm, radius, at_periapsis, forward) for forward in (False, True))
    assert np.linalg.norm([before, after], axis=1) == pytest.approx([v_inf, v_inf], rel=1e-10)
    assert turn_angle(before, after) == pytest.approx(turn(v_inf, radius, gm), abs=1e-10)
    assert periapsis_radius(before, after, gm) == pytest.approx(radius, rel=1e-9)
    assert burn(before, after, gm) == pytest.approx(0.0, abs=1e-9)


@pytest.mark.parametrize(("body", "v_in", "v_out"), FLYBYS)
def test_the_half_turns_of_an_integrated_powered_flyby_add_up_to_the_turn(body, v_in, v_out):
    gm = BODIES[body].gm_km3_s2
    radius = periapsis_radius(v_in, v_out, gm)
    slow_or_fast = periapsis_speeds(v_in, v_out, gm)
    before, after = (
        asymptote(gm, radius, speed, forward)
        for speed, forward in zip(slow_or_fast, (False, True), strict=True)
    )
    halves = [turn_angle(before, [0.0, 1.0, 0.0]), turn_angle([0.0, 1.0, 0.0], after)]
    assert sum(halves) == pytest.approx(turn_angle(v_in, v_out), abs=1e-10)
    assert halves == pytest.approx(
        [0.5 * turn(np.linalg.norm(v), radius, gm) for v in (v_in, v_out)], abs=1e-10
    )
    assert np.linalg.norm(before) == pytest.approx(np.linalg.norm(v_in), rel=1e-10)
    assert np.linalg.norm(after) == pytest.approx(np.linalg.norm(v_out), rel=1e-10)


def turning_point(_, state):
    return state[:3] @ state[3:]


turning_point.terminal = True
turning_point.direction = 1.0


@pytest.mark.parametrize(("body", "v_in", "v_out"), FLYBYS)
def test_aimed_at_b_t_and_b_r_and_burning_at_the_lowest_point_it_leaves_along_v_out(body, v_in, v_out):
    """It starts on the asymptote, 1/FAR beside the hyperbola that nears it: hence the tolerances."""
    gm, v_in, v_out = BODIES[body].gm_km3_s2, np.array(v_in), np.array(v_out)
    radius = periapsis_radius(v_in, v_out, gm)
    b_t, b_r = aim_plane(v_in, v_out, gm, ECLIPTIC_POLE_ICRF)
    s = v_in / np.linalg.norm(v_in)
    t = np.cross(s, ECLIPTIC_POLE_ICRF) / np.linalg.norm(np.cross(s, ECLIPTIC_POLE_ICRF))
    start = b_t * t + b_r * np.cross(s, t) - far(gm, radius, np.linalg.norm(v_in)) * s
    speed = np.sqrt(v_in @ v_in + 2.0 * gm / np.linalg.norm(start))
    long_enough = 2.0 * far(gm, radius, np.linalg.norm(v_in)) / np.linalg.norm(v_in)
    lowest, velocity = integrate(gm, start, speed * s, long_enough, turning_point)
    assert np.linalg.norm(lowest) == pytest.approx(radius, rel=1e-5)

    fast_or_slow = np.linalg.norm(velocity)
    kick = np.copysign(burn(v_in, v_out, gm), np.linalg.norm(v_out) - np.linalg.norm(v_in))
    velocity *= 1.0 + kick / fast_or_slow
    seconds = far(gm, radius, np.linalg.norm(v_out)) / np.linalg.norm(v_out)
    leaving = at_infinity(gm, *integrate(gm, lowest, velocity, seconds))
    assert leaving == pytest.approx(v_out, abs=3e-5)


def flyby_with_burn(gm, v_in, radius, kick):
    """Integrate a flyby in the plane of x and y that comes in along v_in and burns `kick` at periapsis."""
    speed = np.sqrt(v_in @ v_in + 2.0 * gm / radius)
    before = asymptote(gm, radius, speed, forward=False)
    after = asymptote(gm, radius, speed + kick, forward=True)
    return turned_by(v_in, turn_angle(before, after)) * np.linalg.norm(after) / np.linalg.norm(v_in)


def turned_by(v, angle):
    return (
        np.array([[np.cos(angle), -np.sin(angle), 0.0], [np.sin(angle), np.cos(angle), 0.0], [0.0, 0.0, 1.0]])
        @ v
    )


OBERTH = [
    # body, v∞ before (km/s), periapsis altitude (km), burn (km/s)
    ("venus", 4.0, 300.0, 0.5),
    ("earth", 9.0, 500.0, 0.2),
    ("mars", 2.5, 250.0, 1.0),
    ("jupiter", 6.0, 250_000.0, 0.3),
]


@pytest.mark.parametrize(("body", "v_inf", "altitude", "kick"), OBERTH)
@pytest.mark.parametrize("lead_deg", [-90.0, -30.0, 0.0, 60.0, 90.0])
def test_leaving_forward_a_burn_at_periapsis_gains_more_than_the_same_burn_far_away(
    body, v_inf, altitude, kick, lead_deg
):
    """Oberth: at periapsis the burn works at a higher speed, so v∞ after it is larger for the same Δv.

    Compared with the flyby that turns as far and burns along its v∞ once the body is behind. The heliocentric
    energy ½|V + b u|² grows with b where b + V·u > 0, so leaving within 90° of the body's motion V it must.
    """
    gm, radius = BODIES[body].gm_km3_s2, BODIES[body].radius_km + altitude
    v_in = np.array([v_inf, 0.0, 0.0])
    v_out = flyby_with_burn(gm, v_in, radius, kick)
    assert burn(v_in, v_out, gm) == pytest.approx(kick, rel=1e-8)
    direction = v_out / np.linalg.norm(v_out)
    far = (v_inf + kick) * direction
    motion = 30.0 * turned_by(direction, np.radians(lead_deg))
    assert np.linalg.norm(v_out) > 1.01 * np.linalg.norm(far)
    assert energy_gain(v_in, v_out, motion) > energy_gain(v_in, far, motion)
    assert gain(v_in, v_out, motion) > gain(v_in, far, motion)


@pytest.mark.parametrize(("body", "v_inf", "altitude", "kick"), OBERTH)
def test_leaving_backward_the_burn_at_periapsis_loses_more_than_the_same_burn_far_away(
    body, v_inf, altitude, kick
):
    """The other side of it: against the body's motion a larger v∞ is less energy about the Sun."""
    gm, radius = BODIES[body].gm_km3_s2, BODIES[body].radius_km + altitude
    v_in = np.array([v_inf, 0.0, 0.0])
    v_out = flyby_with_burn(gm, v_in, radius, kick)
    direction = v_out / np.linalg.norm(v_out)
    far, motion = (v_inf + kick) * direction, -30.0 * direction
    assert energy_gain(v_in, v_out, motion) < energy_gain(v_in, far, motion)


def energy_gain(v_in, v_out, motion):
    """Change of heliocentric energy, km²/s²: the momentum that the body hands over, times its velocity."""
    return 0.5 * (v_out @ v_out - v_in @ v_in) + motion @ (v_out - v_in)


def test_the_gain_squares_to_the_energy_of_the_pull_and_the_direction_to_its_vector_sum():
    """|V + v_out|² − |V + v_in|² is twice the work done; the law of cosines joins turn and both speeds."""
    v_in, v_out = np.array([6.1, 0.4, -1.0]), np.array([5.0, 3.4, -0.6])
    motion = np.array([-12.0, 30.0, 13.0])
    before, after = np.linalg.norm(motion + v_in), np.linalg.norm(motion + v_out)
    assert gain(v_in, v_out, motion) * (before + after) == pytest.approx(
        2.0 * energy_gain(v_in, v_out, motion), rel=1e-13
    )
    angle = heliocentric_turn(v_in, v_out, motion)
    across = before**2 + after**2 - 2.0 * before * after * np.cos(angle)
    assert across == pytest.approx(np.sum((v_out - v_in) ** 2), rel=1e-11)


def test_the_aim_distance_is_where_the_integrated_asymptote_passes_the_centre():
    """Angular momentum over speed: r × v is kept, and at infinity it is B v∞."""
    gm, radius, v_inf = BODIES["venus"].gm_km3_s2, 6351.8, 6.0
    speed = np.sqrt(v_inf**2 + 2.0 * gm / radius)
    seconds = far(gm, radius, v_inf) / v_inf
    position, velocity = integrate(gm, [radius, 0.0, 0.0], [0.0, speed, 0.0], seconds)
    offset = np.linalg.norm(np.cross(position, at_infinity(gm, position, velocity))) / v_inf
    assert aim_distance(v_inf, radius, gm) == pytest.approx(offset, rel=1e-5)

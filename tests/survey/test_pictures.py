"""What the pictures of a candidate are drawn from agrees with two-body motion and with the measures."""

from __future__ import annotations

import numpy as np
import pytest
from picture_routes import ROUTES, WITH_FLYBYS, Flight, flight_of

from porkgrid.errors import RequestError
from porkgrid.physics.conics import icrf_to_ecliptic, propagate
from porkgrid.physics.constants import AU_KM, DAY_S, GM_SUN_KM3_S2
from porkgrid.survey.candidates import Picked, measures_at
from porkgrid.survey.legs import LegOption
from porkgrid.survey.pictures import FlybyPicture, RoutePicture, flyby_picture, route_picture


def route_of(name: str) -> RoutePicture:
    return route_picture(*flight_of(name).candidate)


def flyby_of(name: str, n: int) -> FlybyPicture:
    return flyby_picture(*flight_of(name).candidate, n)


def ecliptic_states(flight: Flight, k: int, jd: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Positions and velocities (n, 3) of the body of encounter k in the ecliptic's axes."""
    position, velocity = flight.plan.ephemeris.states(flight.plan.tables[k].body, jd)
    return icrf_to_ecliptic(position.T), icrf_to_ecliptic(velocity.T)


def measures_of(flight: Flight) -> dict[str, float]:
    options = tuple(LegOption(r, b > 0, False) for r, b in zip(flight.revs, flight.branches, strict=True))
    return measures_at(flight.plan, Picked(flight.epochs, options))


def angles_between(path: np.ndarray) -> np.ndarray:
    """Angles (k − 1,) at the Sun between neighbouring points of a path (3, k)."""
    a, b = path[:, :-1], path[:, 1:]
    return np.arctan2(np.linalg.norm(np.cross(a, b, axis=0), axis=0), np.sum(a * b, axis=0))


def distance_to(path: np.ndarray, points: np.ndarray) -> np.ndarray:
    """Distances (n,) of points (n, 3) from a polyline (3, k)."""
    tails, steps = path[:, :-1].T, np.diff(path, axis=1).T
    least = np.full(len(points), np.inf)
    for tail, step in zip(tails, steps, strict=True):
        along = np.clip((points - tail) @ step / (step @ step), 0.0, 1.0)
        least = np.minimum(least, np.linalg.norm(points - tail - along[:, None] * step, axis=1))
    return least


@pytest.mark.parametrize("name", ROUTES)
def test_each_arc_leads_from_one_encounter_to_the_next(name: str) -> None:
    picture = route_of(name)
    assert len(picture.arcs) == len(picture.encounters) - 1
    for k, arc in enumerate(picture.arcs):
        for end, encounter in ((0, picture.encounters[k]), (-1, picture.encounters[k + 1])):
            assert np.linalg.norm(arc.path[:, end] - encounter.position) < 1.0, (k, end)


@pytest.mark.parametrize("name", ROUTES)
def test_an_encounter_is_where_the_ephemeris_has_its_body(name: str) -> None:
    flight, picture = flight_of(name), route_of(name)
    for k, encounter in enumerate(picture.encounters):
        position, _ = ecliptic_states(flight, k, np.array([flight.epochs[k]]))
        assert np.allclose(encounter.position, position[0], rtol=1e-14)
        assert encounter.title == flight.plan.tables[k].body.title
    kinds = [encounter.kind for encounter in picture.encounters]
    assert kinds == ["departure", *["flyby"] * (len(kinds) - 2), "arrival"]


@pytest.mark.parametrize("name", ["direct", "one revolution", "right branch", "hyperbolic leg", "saturn"])
def test_two_body_motion_from_the_first_point_stays_on_the_arc(name: str) -> None:
    flight, picture = flight_of(name), route_of(name)
    for k, arc in enumerate(picture.arcs):
        span_s = (flight.epochs[k + 1] - flight.epochs[k]) * DAY_S
        speed = departure_velocity(arc.path)
        times = np.linspace(0.0, span_s, 60)
        places, _ = propagate(arc.path[:, 0], speed, times, GM_SUN_KM3_S2)
        assert distance_to(arc.path, places).max() < 3e-5 * np.linalg.norm(places, axis=1).max()
        assert np.linalg.norm(places[-1] - arc.path[:, -1]) < 1e-6 * np.linalg.norm(places[-1])


def departure_velocity(path: np.ndarray) -> np.ndarray:
    """The velocity (3,) at the start of an arc, from its shape alone: p and e fitted to its points."""
    r, normal = path[:, 0], np.cross(path[:, 0], path[:, 5])
    outward, normal = r / np.linalg.norm(r), normal / np.linalg.norm(normal)
    onward = np.cross(normal, outward)
    distance = np.linalg.norm(path, axis=0)
    # p = r + e·r, linear in p and the two components of e
    rows = np.column_stack([np.ones(path.shape[1]), -outward @ path, -onward @ path])
    (p, _, e_onward), *_ = np.linalg.lstsq(rows, distance, rcond=None)
    momentum = np.sqrt(GM_SUN_KM3_S2 * p)
    return (momentum / np.linalg.norm(r)) * onward - e_onward * (GM_SUN_KM3_S2 / momentum) * outward


@pytest.mark.parametrize("name", ROUTES)
def test_the_points_of_an_arc_are_even_in_angle_and_sweep_its_revolutions(name: str) -> None:
    flight, measures = flight_of(name), measures_of(flight_of(name))
    for k, arc in enumerate(route_of(name).arcs):
        angles = angles_between(arc.path)
        assert np.ptp(angles) < 1e-9
        swept = measures[f"leg{k + 1}_transfer_angle_deg"] + 360.0 * flight.revs[k]
        assert np.degrees(angles.sum()) == pytest.approx(swept, abs=1e-6)
        assert np.degrees(angles.max()) <= 0.5


@pytest.mark.parametrize(("name", "k"), [("direct", 0), ("direct", 1), ("mars", 1), ("elements", 1)])
def test_an_orbit_is_closed_and_the_body_keeps_to_it(name: str, k: int) -> None:
    flight, picture = flight_of(name), route_of(name)
    orbit = next(o for o in picture.orbits if o.title == picture.encounters[k].title)
    assert np.allclose(orbit.path[:, 0], orbit.path[:, -1], rtol=1e-12)
    year = flight.epochs[k] + np.linspace(-180.0, 180.0, 40)
    places, _ = ecliptic_states(flight, k, year)
    # The Moon swings the Earth by 12.5 m/s of 29.8 km/s (memory), which moves the far side of the orbit that
    # osculates by up to 4 times that share: 1.7e-3 au.
    assert distance_to(orbit.path, places).max() < 1.8e-3 * AU_KM


def test_a_body_met_twice_has_one_orbit() -> None:
    assert sorted(orbit.title for orbit in route_of("jupiter").orbits) == ["Earth", "Jupiter", "Venus"]


def test_an_open_orbit_is_drawn_on_both_sides_of_its_body_as_far_as_the_picture_can_need() -> None:
    flight, picture = flight_of("comet"), route_of("comet")
    path = next(orbit for orbit in picture.orbits if orbit.title == "Dunlin").path
    farthest = max(float(np.linalg.norm(arc.path, axis=0).max()) for arc in picture.arcs)
    assert np.linalg.norm(path[:, [0, -1]], axis=0) == pytest.approx([4.0 * farthest] * 2, rel=1e-9)
    assert np.linalg.norm(path, axis=0).min() == pytest.approx(1.3 * AU_KM, rel=1e-4)
    places, _ = ecliptic_states(flight, 1, flight.epochs[1] + np.linspace(-150.0, 150.0, 20))
    assert distance_to(path, places).max() < 1e-4 * AU_KM


@pytest.mark.parametrize("name", ROUTES)
def test_the_numbers_are_those_of_the_candidates_table(name: str) -> None:
    flight, picture = flight_of(name), route_of(name)
    table = {flight.plan.measures[key].symbol: value for key, value in measures_of(flight).items()}
    groups = [picture.numbers, *(e.numbers for e in picture.encounters), *(a.numbers for a in picture.arcs)]
    shown = [number for numbers in groups for number in numbers]
    assert len(shown) > 8
    for number in shown:
        assert number.value == pytest.approx(table[number.label], rel=1e-12, nan_ok=True), number.label


def test_a_flight_that_does_not_exist_is_refused_with_its_leg_and_dates() -> None:
    plan, epochs, _, _ = flight_of("one revolution").candidate
    with pytest.raises(RequestError, match=r"leg 1, 2028-11-30 to 2029-03-01: no flight with 1 revolutions"):
        route_picture(plan, (epochs[0], epochs[0] + 91.0), (1,), (-1,))


def test_a_flyby_that_the_route_does_not_have_is_refused() -> None:
    with pytest.raises(RequestError, match=r"flyby 2: .*Earth → Venus → Mars has flybys 1 to 1"):
        flyby_of("mars", 2)
    with pytest.raises(RequestError, match=r"flyby 1: .*Earth → Mars has none: it flies direct"):
        flyby_of("direct", 1)


@pytest.mark.parametrize(("name", "n"), [("mars", 1), ("mercury", 1), ("jupiter", 2), ("neptune", 3)])
def test_the_velocities_of_a_flyby_are_those_of_its_legs(name: str, n: int) -> None:
    flight, picture = flight_of(name), flyby_of(name, n)
    arcs = route_of(name).arcs
    spans = np.diff(flight.epochs) * DAY_S
    starts = [departure_velocity(arcs[k].path) for k in (n - 1, n)]
    _, arriving = propagate(arcs[n - 1].path[:, 0], starts[0], spans[n - 1], GM_SUN_KM3_S2)
    assert np.allclose(picture.v_in, arriving, atol=1e-5)
    assert np.allclose(picture.v_out, starts[1], atol=1e-5)
    _, carried = ecliptic_states(flight, n, np.array([flight.epochs[n]]))
    assert np.allclose(picture.body_velocity, carried[0], rtol=1e-13)


@pytest.mark.parametrize(("name", "n"), WITH_FLYBYS)
def test_the_numbers_of_a_flyby_are_those_of_the_measures(name: str, n: int) -> None:
    measures, picture = measures_of(flight_of(name)), flyby_of(name, n)
    found = {
        "altitude_km": picture.altitude_km,
        "burn_km_s": picture.burn_km_s,
        "gain_km_s": picture.gain_km_s,
        "turn_deg": np.degrees(picture.turn_rad),
        "v_inf_km_s": np.linalg.norm(picture.v_inf_in),
    }
    for key, value in found.items():
        assert value == pytest.approx(measures[f"flyby{n}_{key}"], rel=1e-9, abs=1e-9), key
    assert picture.speed_out_km_s - picture.speed_in_km_s == pytest.approx(picture.gain_km_s, abs=1e-9)


@pytest.mark.parametrize(("name", "n"), [("mars", 1), ("mercury", 1), ("neptune", 1), ("neptune", 3)])
def test_the_two_hyperbolas_of_a_flyby_make_its_turn(name: str, n: int) -> None:
    picture = flyby_of(name, n)
    half_turns = np.arcsin(1.0 / picture.eccentricity_in) + np.arcsin(1.0 / picture.eccentricity_out)
    assert half_turns == pytest.approx(picture.turn_rad, rel=1e-9)
    cosine = picture.v_inf_in @ picture.v_inf_out
    cosine /= np.linalg.norm(picture.v_inf_in) * np.linalg.norm(picture.v_inf_out)
    assert np.cos(picture.turn_rad) == pytest.approx(cosine, abs=1e-12)


def test_the_aim_point_is_the_hyperbolas_distance_from_the_centre() -> None:
    picture = flyby_of("mercury", 1)
    e = picture.eccentricity_in
    semi_axis = picture.periapsis_km / (e - 1.0)
    assert np.hypot(picture.b_t_km, picture.b_r_km) == pytest.approx(
        semi_axis * np.sqrt(e * e - 1.0), rel=1e-9
    )


def test_sunward_points_from_the_body_to_the_sun() -> None:
    encounter = route_of("mars").encounters[1]
    assert np.allclose(flyby_of("mars", 1).sunward, -encounter.position / np.linalg.norm(encounter.position))

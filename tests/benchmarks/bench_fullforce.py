"""What does a full-force check cost, direct and with one flyby?

    python tests/benchmarks/bench_fullforce.py

Warm checks of a direct candidate and of one by Venus, in turns with one plain flight of their legs: scipy's
DOP853 at a relative tolerance of 1e-9, with equations of motion in numpy on positions asked of the kernel.
(At the check's own tolerance the kernel's rounding of times to 2 microseconds would hold its steps up.)
Prints seconds, and each check as a ratio to that flight. Two minutes, nearly all of it in plain flights.
"""

from __future__ import annotations

import tempfile
from pathlib import Path

import numpy as np
from interleaved import best_seconds
from scipy.integrate import solve_ivp

from porkgrid.handoff.forces import PULLING
from porkgrid.handoff.fullforce import full_force_check
from porkgrid.handoff.report import FlownLeg
from porkgrid.physics.constants import DAY_S, GM_SUN_KM3_S2
from porkgrid.sky.bodies import BODIES, gm_of
from porkgrid.sky.kernel import Ephemeris, open_ephemeris
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.candidates import Picked
from porkgrid.survey.legs import LegOption
from porkgrid.survey.plan import Plan, make_plan

ROUNDS, PLAIN_RTOL = 2, 1e-9
ORBIT = "{ periapsis_altitude_km = 200, apoapsis_altitude_km = 200 }"
# bodies with the epochs (TDB Julian dates) of a candidate of scenarios/
ROUTES = {
    "direct to Mars": (("earth", 2462098.5), ("mars", 2462398.5)),
    "by Venus to Mars": (("earth", 2464171.5), ("venus", 2464306.5), ("mars", 2464521.5)),
}
LIMIT_S = {"direct to Mars": 20.0, "by Venus to Mars": 60.0}


def plan_of(bodies: list[str]) -> Plan:
    """A plan of these bodies; its windows do not matter to a check."""
    parts = ['name = "benchmark"']
    for n, body in enumerate(bodies):
        day = f"{2028 + n}-11-23"
        part = f'[[encounter]]\nbody = "{body}"\nfirst = {day}\nlast = {day}'
        if n == 0:
            part += f"\nparking = {ORBIT}"
        if n == len(bodies) - 1:
            part += f"\ncapture = {ORBIT}"
        parts.append(part)
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "scenario.toml"
        path.write_text("\n".join(parts), encoding="utf-8")
        return make_plan(load_scenario(path))


def plain_flight(ephemeris: Ephemeris, leg: FlownLeg) -> np.ndarray:
    """Fly a leg from its first state, in numpy: the end state (6,)."""

    def motion(seconds: float, state: np.ndarray) -> np.ndarray:
        jd = np.array([leg.reference_jd + seconds / DAY_S])
        r = state[:3]
        pull = -GM_SUN_KM3_S2 * r / np.linalg.norm(r) ** 3
        for name in PULLING:
            body = ephemeris.states(BODIES[name], jd)[0][:, 0]
            away, gm = body - r, gm_of(BODIES[name])
            pull += gm * (away / np.linalg.norm(away) ** 3 - body / np.linalg.norm(body) ** 3)
        return np.concatenate([state[3:], pull])

    start = np.concatenate([leg.position[:, 0], leg.velocity[:, 0]])
    atol = np.repeat([1e-3, 1e-9], 3)
    span = (leg.seconds[0], leg.seconds[-1])
    return solve_ivp(motion, span, start, "DOP853", rtol=PLAIN_RTOL, atol=atol).y[:, -1]


def main() -> None:
    """Print one line per route."""
    ephemeris = open_ephemeris()
    for name, stops in ROUTES.items():
        plan = plan_of([body for body, _ in stops])
        picked = Picked(tuple(jd for _, jd in stops), (LegOption(),) * (len(stops) - 1))
        report = full_force_check(plan, picked)
        best = best_seconds(
            {
                "check": lambda plan=plan, picked=picked: full_force_check(plan, picked),
                "plain": lambda legs=report.legs: [plain_flight(ephemeris, leg) for leg in legs],
            },
            ROUNDS,
        )
        print(
            f"{name:17} {report.verdict}, {sum(len(one.history) for one in report.attempts)} iterations, "
            f"worst miss {max(report.miss_km):.1e} km: {best['check']:.2f} s of {LIMIT_S[name]:g} s allowed; "
            f"{best['check'] / best['plain']:.3f} of one plain flight of its legs ({best['plain']:.2f} s)"
        )


if __name__ == "__main__":
    main()

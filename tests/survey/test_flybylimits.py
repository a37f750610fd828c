"""Limits that flybys bring with them, and scenarios with flybys that a search could not honour exactly."""

import re

import pytest
from survey_scenarios import changed, limited

from porkgrid.errors import RequestError
from porkgrid.survey import flybylimits
from porkgrid.survey.limits import BITS, REASONS
from porkgrid.survey.measures import ARRIVAL, DEPARTURE, LEG

ONE = """
name = "Snipe by Venus to Mars"

[[encounter]]
body = "earth"
first = 2034-05-01
last = 2034-12-31
step_days = 10.0
parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200 }

[[encounter]]
body = "venus"
first = 2034-09-01
last = 2035-03-31
step_days = 10.0
flyby = { min_altitude_km = 400, max_burn_km_s = 0.3 }

[[encounter]]
body = "mars"
first = 2035-01-01
last = 2036-03-31
step_days = 10.0

[limits]
c3_km2_s2 = { max = 40 }

[rank]
by = "dv_total_km_s"
"""

TWO = changed(
    ONE,
    (
        '[[encounter]]\nbody = "mars"',
        '[[encounter]]\nbody = "earth"\nfirst = 2035-06-01\nlast = 2037-12-31\nstep_days = 10.0\n\n'
        '[[encounter]]\nbody = "jupiter"',
    ),
    ("first = 2035-01-01\nlast = 2036-03-31", "first = 2038-01-01\nlast = 2040-12-31"),
)


@pytest.fixture
def faults(plan_of):
    """What is wrong with a scenario, without the file's name."""

    def of(text: str) -> list[str]:
        with pytest.raises(RequestError) as refusal:
            plan_of(text)
        assert all(re.match(r"\S*scenario\.toml: ", fault) for fault in refusal.value.faults)
        return [fault.partition(": ")[2] for fault in refusal.value.faults]

    return of


@pytest.fixture
def bounds(plan_of):
    """Least and most of the limits of a scenario's plan, by measure."""
    return lambda text: {b.measure.name: (b.least, b.most) for b in plan_of(text).bounds}


# What flybys bring


def test_each_flyby_limits_its_altitude_and_its_burn(bounds):
    assert bounds(ONE) == {
        "c3_km2_s2": (None, 40.0),
        "flyby1_altitude_km": (400.0, None),
        "flyby1_burn_km_s": (None, 0.3),
    }
    assert {"flyby2_altitude_km", "flyby2_burn_km_s"} <= bounds(TWO).keys()


def test_a_flyby_without_numbers_has_the_bodys_least_altitude_and_the_default_burn(bounds):
    found = bounds(changed(ONE, ("flyby = { min_altitude_km = 400, max_burn_km_s = 0.3 }", "")))
    assert found["flyby1_altitude_km"] == (300.0, None)  # Venus, sky.bodies
    assert found["flyby1_burn_km_s"] == (None, 0.2)


@pytest.mark.parametrize(
    ("limit", "expected"),
    [
        ("flyby1_altitude_km = { min = 900 }", (900.0, None)),
        ("flyby1_altitude_km = { min = 100 }", (400.0, None)),
        ("flyby1_altitude_km = { min = 100, max = 5000 }", (400.0, 5000.0)),
    ],
)
def test_of_a_limit_and_a_flybys_own_the_tighter_counts(bounds, limit, expected):
    found = bounds(limited(ONE, limit))
    assert found["flyby1_altitude_km"] == expected
    assert len(found) == 2  # one flag for both


def test_a_limit_on_a_burn_may_be_tighter_than_the_flybys_own(bounds):
    assert bounds(limited(ONE, "flyby1_burn_km_s = { max = 0.1 }"))["flyby1_burn_km_s"] == (None, 0.1)
    assert bounds(limited(ONE, "flyby1_burn_km_s = { max = 2 }"))["flyby1_burn_km_s"] == (None, 0.3)


# What a search cannot do


@pytest.mark.parametrize("measure", ["flyby1_altitude_km", "flyby1_burn_km_s", "sun_min_au", "sun_max_au"])
def test_ranking_by_what_does_not_add_up_is_refused(faults, measure):
    (fault,) = faults(changed(ONE, ('by = "dv_total_km_s"', f'by = "{measure}"')))
    assert fault.startswith(f"rank, by: '{measure}' does not add up over legs and burns")
    assert fault.endswith("rank by dv_total_km_s or a measure of one leg, and limit it instead")


def test_ranking_by_any_measure_of_one_leg_or_of_the_dates_is_accepted(plan_of):
    known = plan_of(ONE).measures
    names = [n for n, m in known.items() if m.scope in (DEPARTURE, ARRIVAL, LEG)] + ["tof_days"]
    assert {"c3_km2_s2", "v_inf_arrival_km_s", "leg2_tof_days", "flyby1_v_inf_km_s"} <= set(names)
    for name in names:
        assert plan_of(changed(ONE, ('by = "dv_total_km_s"', f'by = "{name}"'))).rank_by == name


@pytest.mark.parametrize(
    ("limit", "says", "right"),
    [
        ("sun_min_au = { max = 0.7 }", "limits, sun_min_au: max asks that some leg comes", "give min"),
        ("sun_max_au = { min = 1.4 }", "limits, sun_max_au: min asks that some leg comes", "give max"),
    ],
)
def test_a_limit_that_only_some_leg_has_to_meet_is_refused(faults, limit, says, right):
    (fault,) = faults(limited(ONE, limit))
    assert fault.startswith(says)
    assert f"{right}, or limit one leg, such as leg1_sun_m" in fault


@pytest.mark.parametrize("limit", ["sun_min_au = { min = 0.7 }", "leg1_sun_min_au = { max = 0.7 }"])
def test_what_that_message_offers_instead_is_accepted(bounds, limit):
    assert limit.split()[0] in bounds(limited(ONE, limit))


def test_total_dv_is_limited_over_several_flybys_only_where_it_is_ranked(faults, bounds):
    by_total = limited(TWO, "dv_total_km_s = { max = 9 }")
    by_c3 = changed(by_total, ('by = "dv_total_km_s"', 'by = "c3_km2_s2"'))
    (fault,) = faults(by_c3)
    assert fault.startswith("limits, dv_total_km_s: with several flybys it can be honoured only where")
    assert "rank by dv_total_km_s" in fault
    assert bounds(by_total)["dv_total_km_s"] == (None, 9.0)


def test_total_dv_is_limited_over_one_flyby_whatever_is_ranked(bounds):
    text = changed(limited(ONE, "dv_total_km_s = { max = 9 }"), ('by = "dv_total_km_s"', 'by = "c3_km2_s2"'))
    assert bounds(text)["dv_total_km_s"] == (None, 9.0)


@pytest.mark.parametrize(
    "text",
    [
        changed(ONE, ("max_burn_km_s = 0.3", "max_burn_km_s = 0")),
        limited(ONE, "flyby1_burn_km_s = { max = 0 }"),
    ],
)
def test_a_burn_of_zero_is_refused_with_what_to_set(faults, text):
    (fault,) = faults(text)
    assert fault.startswith(
        "encounter 2, flyby, max_burn_km_s: on a grid of dates no unpowered flyby matches"
    )
    assert fault.endswith("so 0 allows none; give what it may miss by, such as 0.2")


def test_more_limits_than_a_cell_has_flags_for_are_refused_with_how_many_to_leave_out(plan_of, faults):
    names = [name for name in plan_of(TWO).measures if not name.startswith("flyby")]
    names = [name for name in names if not name.startswith(("sun_", "dv_total"))][:27]
    text = limited(TWO, "\n".join(f"{name} = {{ min = -1e9, max = 1e9 }}" for name in names))
    (fault,) = faults(text)
    most = BITS - len(REASONS)
    assert fault.startswith("limits: 27 limits with 4 of the flybys' own are more than")
    assert f"the {most} that a cell can tell apart; leave out {31 - most}" in fault
    keep = limited(TWO, "\n".join(f"{name} = {{ min = -1e9, max = 1e9 }}" for name in names[: most - 4]))
    assert len(plan_of(keep).bounds) == most


def memory_of(monkeypatch, there: float) -> None:
    """A machine with so many bytes."""
    sizes = {"SC_PAGE_SIZE": 1, "SC_PHYS_PAGES": int(there)}
    monkeypatch.setattr(flybylimits.os, "sysconf", sizes.__getitem__)


def test_more_dates_than_the_memory_holds_are_refused_with_steps_that_fit(plan_of, faults, monkeypatch):
    fine = changed(TWO, ("step_days = 10.0", "step_days = 1.0"))
    assert plan_of(fine).flybys == 2
    memory_of(monkeypatch, 2e8)
    (fault,) = faults(fine)
    said = re.fullmatch(
        r"encounter, step_days: legs between flybys take ([\d.]+) GB, and 0\.1 GB may be used; "
        r"steps of ([\d.]+), ([\d.]+), ([\d.]+), ([\d.]+) days would fit",
        fault,
    )
    assert said is not None, fault
    assert float(said[1]) > 0.1
    head, *windows = fine.split("step_days = 1.0")
    steps = said.groups()[1:]
    fitting = head + "".join(f"step_days = {s}{rest}" for s, rest in zip(steps, windows, strict=True))
    assert plan_of(fitting).flybys == 2
    finer = re.sub(r"step_days = ([\d.]+)", lambda m: f"step_days = {0.8 * float(m[1])}", fitting)
    assert faults(finer)  # the steps said are not needlessly coarse


def test_all_that_is_wrong_is_said_at_once(faults):
    text = changed(
        limited(ONE, "sun_min_au = { max = 0.7 }"),
        ("max_burn_km_s = 0.3", "max_burn_km_s = 0"),
        ('by = "dv_total_km_s"', 'by = "sun_max_au"'),
    )
    assert [fault.split(":")[0] for fault in faults(text)] == [
        "rank, by",
        "limits, sun_min_au",
        "encounter 2, flyby, max_burn_km_s",
    ]

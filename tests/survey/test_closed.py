"""What is said where nothing is allowed, and whether it is true."""

import re

import numpy as np
import pytest
from survey_scenarios import LEAN, LOOPS, changed, limited

from porkgrid.survey.closed import explain_closed
from porkgrid.survey.routes import route_cells

OPENS = r"The first cell opens with (\w+) (min|max) = (\S+) .*\."


def test_nothing_is_said_of_a_survey_with_open_cells(survey):
    assert explain_closed(survey) == []


def costs_most(survey):
    """The limit that forbids most cells, counted."""
    flags = survey.grid["blocked_by"]
    counts = [int(np.count_nonzero(flags.values & np.uint32(mask))) for mask in flags.attrs["flag_masks"][3:]]
    best = int(np.argmax(counts))
    return flags.attrs["flag_titles"][3 + best], 100.0 * counts[best] / flags.size


@pytest.mark.parametrize(
    "limits",
    [
        ["c3_km2_s2 = { max = 5 }"],
        ["c3_km2_s2 = { max = 25 }", "dv_total_km_s = { max = 4 }"],
        ["dla_deg = { min = 89, max = 90 }"],
        ["arrival_sep_deg = { min = 179.9 }", "c3_km2_s2 = { max = 1000 }"],
        ["rla_deg = { min = -20, max = -10 }"],
    ],
)
def test_the_value_that_is_said_to_open_the_first_cell_opens_one(sweep_text, plan_of, limits):
    survey = sweep_text(limited(LEAN, "\n".join(limits)))
    lines = explain_closed(survey)
    assert lines[0] == "The limits forbid every cell."
    title, share = costs_most(survey)
    assert lines[1] == f"Most costly: {title}, which forbids {share:.1f} % of the grid."
    assert len(lines) > 2
    for line in lines[2:]:
        name, end, value = re.fullmatch(OPENS, line).groups()
        which = next(k for k, limit in enumerate(limits) if limit.startswith(name))
        for loosened, opens in ((float(value), True), (nearer(float(value), end), False)):
            ends = re.sub(rf"\b{end} = [-\d.]+", f"{end} = {loosened!r}", limits[which])
            again = [*limits[:which], ends, *limits[which + 1 :]]
            plan = plan_of(limited(LEAN, "\n".join(again)))
            _, blocked = route_cells(plan, slice(None), slice(None))
            assert np.any(blocked == 0) == opens


def nearer(value, end):
    """A limit closer to the one that closed the survey, by two parts in ten thousand."""
    step = 2e-4 * abs(value)
    return value + step if end == "min" else value - step


def test_the_most_costly_limit_is_a_limit_even_where_more_cells_are_not_flown(sweep_text):
    windows = ("2028-09-01", "2029-02-20"), ("2030-03-31", "2029-03-15")
    survey = sweep_text(changed(limited(LEAN, "c3_km2_s2 = { max = 1 }"), *windows))
    reasons = survey.provenance["cells_forbidden_by"]
    assert reasons["arrival_before_departure"] > reasons["c3_km2_s2"]
    assert explain_closed(survey)[1].startswith("Most costly: C3 at most 1 km²/s²")


def test_where_two_limits_must_give_way_the_nearest_cell_is_shown(sweep_text):
    survey = sweep_text(limited(LEAN, "c3_km2_s2 = { max = 1 }\narrival_sep_deg = { min = 179.9 }"))
    said = explain_closed(survey)[-1]
    found = re.fullmatch(
        r"No single limit opens a cell; the nearest, (\S+) to (\S+), needs c3_km2_s2 (\S+), "
        r"arrival_sep_deg (\S+)\.",
        said,
    )
    departure, arrival, c3, angle = found.groups()
    cell = survey.grid.sel(departure=departure, arrival=arrival)
    assert float(cell["c3_km2_s2"]) == pytest.approx(float(c3), rel=1e-3)
    assert float(cell["arrival_sep_deg"]) == pytest.approx(float(angle), rel=1e-3)
    assert int(cell["blocked_by"]) == 0b11000


def test_where_nothing_can_be_flown_it_is_not_the_limits(sweep_text):
    early = changed(LOOPS, ("first = 2029-08-01", "first = 2027-08-01"), ("23.0", "2000.0"))
    survey = sweep_text(early)
    assert survey.provenance["cells_forbidden_by"]["arrival_before_departure"] == survey.provenance["cells"]
    (line,) = explain_closed(survey)
    assert line == "No cell can be flown at all: look at the date windows."

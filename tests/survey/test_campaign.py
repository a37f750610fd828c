"""Campaigns: one file of several routes, taken apart into scenarios that each stand alone."""

import tomllib

import pytest
from survey_scenarios import changed

from porkgrid.errors import RequestError
from porkgrid.survey.admit import load_routes, load_scenario

CAMPAIGN = """
name = "Bittern both ways"

[[encounter]]
body = "earth"
first = 2034-06-01
last = 2034-09-30
step_days = 15.0
parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200 }

[[encounter]]
body = "venus"
first = 2034-10-15
last = 2035-02-15
step_days = 10.0
flyby = { min_altitude_km = 300, max_burn_km_s = 1.5 }

[[encounter]]
body = "mars"
first = 2035-05-01
last = 2035-10-31
step_days = 30.0
capture = { periapsis_altitude_km = 400, apoapsis_altitude_km = 33000 }

[[route]]
name = "direct"
stops = ["earth", "mars"]

[[route]]
name = "by Venus"
stops = ["earth", "venus", "mars"]
leg = [{ max_revs = 0 }, { max_revs = 1 }]

[limits]
tof_days = { max = 500 }
flyby1_altitude_km = { min = 500 }

[rank]
by = "dv_total_km_s"
"""


@pytest.fixture
def written_to(tmp_path):
    def write(text: str):
        path = tmp_path / "campaign.toml"
        path.write_text(text)
        return path

    return write


def test_every_route_is_a_scenario_of_its_own_with_its_stops_and_legs(written_to):
    direct, venus = load_routes(written_to(CAMPAIGN))
    assert [direct.name, venus.name] == ["Bittern both ways: direct", "Bittern both ways: by Venus"]
    assert [each.body for each in direct.encounters] == ["earth", "mars"]
    assert [each.body for each in venus.encounters] == ["earth", "venus", "mars"]
    assert [leg.max_revs for leg in venus.legs] == [0, 1]
    assert direct.encounters[-1].capture == venus.encounters[-1].capture


def test_a_limit_that_only_some_routes_can_have_holds_for_those(written_to):
    direct, venus = load_routes(written_to(CAMPAIGN))
    assert set(direct.limits) == {"tof_days"}
    assert set(venus.limits) == {"tof_days", "flyby1_altitude_km"}


def test_the_text_of_a_route_is_a_scenario_file_of_the_same_request(written_to, tmp_path):
    from porkgrid.survey.folder import fingerprint

    for route in load_routes(written_to(CAMPAIGN)):
        alone = tmp_path / "alone.toml"
        alone.write_text(route.text)
        assert fingerprint(load_scenario(alone)) == fingerprint(route)
        assert "route" not in tomllib.loads(route.text)


def test_a_file_without_routes_is_one_scenario(written_to):
    text = CAMPAIGN[: CAMPAIGN.index("[[route]]")] + "[limits]\ntof_days = { max = 500 }\n"
    (only,) = load_routes(written_to(text))
    assert only.name == "Bittern both ways"


def test_a_body_with_two_windows_is_named_by_labels(written_to):
    text = changed(
        CAMPAIGN,
        ('body = "mars"\nfirst', 'body = "mars"\nlabel = "early"\nfirst'),
        ('stops = ["earth", "mars"]', 'stops = ["earth", "early"]'),
        ('stops = ["earth", "venus", "mars"]', 'stops = ["earth", "venus", "Early"]'),
    )
    assert [each.encounters[-1].body for each in load_routes(written_to(text))] == ["mars", "mars"]


@pytest.mark.parametrize(
    ("old", "new", "told"),
    [
        ('stops = ["earth", "mars"]', 'stops = ["earth", "marz"]',
         'route 1, stops: "marz" is no encounter of the file; did you mean "mars"?'),
        ('stops = ["earth", "mars"]', 'stops = ["earth"]', "route 1, stops"),
        ('name = "by Venus"', 'name = "Direct"', 'route 2, name: "Direct" is there twice; rename one'),
        ('name = "direct"\n', "", "route 1, name: missing"),
        ('body = "venus"', 'body = "mars"', 'encounter 3, label: "mars" is there twice; give each a label'),
        ("tof_days = { max", "tof_day = { max", "limits.tof_day: no route of the campaign has this measure"),
        ("max_burn_km_s = 1.5", "max_burn_km_s = -1", "route by Venus, encounter 2, flyby.max_burn_km_s"),
        ('name = "direct"\nstops', 'name = "direct"\nstop = 3\nstops', "route 1, stop: no such key"),
    ],
)  # fmt: skip
def test_a_fault_of_a_campaign_is_told_with_its_route(written_to, old, new, told):
    with pytest.raises(RequestError) as caught:
        load_routes(written_to(changed(CAMPAIGN, (old, new))))
    assert any(told in line for line in caught.value.faults), caught.value.faults


@pytest.mark.parametrize("routes", ["route = 3\n", "route = []\n", "route = [1]\n"])
def test_routes_of_another_shape_are_refused(written_to, routes):
    text = routes + CAMPAIGN[: CAMPAIGN.index("[[route]]")]
    with pytest.raises(RequestError, match="route: must be tables, each under"):
        load_routes(written_to(text))


def test_a_campaign_is_no_single_scenario(written_to):
    with pytest.raises(RequestError, match="route: makes a campaign of several routes"):
        load_scenario(written_to(CAMPAIGN))

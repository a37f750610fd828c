"""Numbers and tables as a notebook shows them."""

from __future__ import annotations

from html.parser import HTMLParser

import pytest

from porkgrid.showing import html_line, html_page, html_table, number, unit_of

HOSTILE = '<script>alert("x")</script>&<img src=x onerror=alert(1)>'


class Elements(HTMLParser):
    """The elements and the text of a piece of HTML."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.names: list[str] = []
        self.words = ""
        self.feed(text)
        self.close()

    def handle_starttag(self, tag, attrs):
        self.names.append(tag)

    def handle_data(self, data):
        self.words += data


@pytest.mark.parametrize(
    "shown",
    [
        html_page(HOSTILE),
        html_line(HOSTILE),
        html_table([HOSTILE], [["1"]]),
        html_table(["a"], [[HOSTILE]]),
        html_table(["a"], [], HOSTILE),
    ],
)
def test_hostile_text_stays_text(shown):
    read = Elements(shown)
    assert HOSTILE in read.words
    assert not {"script", "img"} & set(read.names)


def test_a_table_has_its_cells_in_order_with_numbers_to_the_right():
    shown = html_table(["name", "c3_km2_s2"], [["one", "8.9"], ["two", "9.1"]])
    assert Elements(shown).words == "namec3_km2_s2one8.9two9.1"
    assert shown.count("text-align:right") == 3  # the heading and two numbers
    assert "color" not in shown  # the notebook's theme is kept, light or dark


@pytest.mark.parametrize(
    ("name", "unit"),
    [
        ("c3_km2_s2", "km²/s²"), ("dv_total_km_s", "km/s"), ("flyby1_altitude_km", "km"), ("dla_deg", "deg"),
        ("tof_days", "days"), ("sun_min_au", "au"), ("delivered_mass_kg", "kg"), ("leg1_revs", ""),
    ],
)  # fmt: skip
def test_a_name_ends_in_its_unit(name, unit):
    assert unit_of(name) == unit


def test_digits_go_by_the_unit():
    assert number(4.71234, "km/s") == "4.712"
    assert number(4.71234, "days") == "4.7"
    assert number(float("nan"), "km/s") == "–"

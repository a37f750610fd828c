"""The file of a page: whole, within its size, and nothing in it that a name could turn into markup."""

from __future__ import annotations

import builtins
import json
import re
from html.parser import HTMLParser

import pandas as pd
import pytest
from command import assert_refused, porkgrid
from review_scenarios import CUCKOO, HOSTILE

from porkgrid.errors import RequestError
from porkgrid.page import review
from porkgrid.page.beside import Room
from porkgrid.page.opened import open_for_page
from porkgrid.page.review import MOST_BYTES, write_review
from porkgrid.page.words import plain_symbol
from porkgrid.survey.measures import all_entries

NAME = HOSTILE.replace('\\"', '"')


class Elements(HTMLParser):
    """The elements of a document as a browser splits it: names, and the text of those with an id."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.names: list[str] = []
        self.texts: dict[str, str] = {}
        self._inside: str | None = None
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.names.append(tag)
        self._inside = dict(attrs).get("id") if tag == "script" else None

    def handle_data(self, data: str) -> None:
        if self._inside:
            self.texts[self._inside] = self.texts.get(self._inside, "") + data


def data_of(path) -> dict:
    return json.loads(Elements(path.read_text()).texts["data"])


def test_the_page_holds_what_the_survey_holds(rook, rook_page):
    (survey,) = data_of(rook_page)["surveys"]
    assert survey["name"] == "Rook to Mars"
    assert survey["missing"] is None
    assert [measure["name"] for measure in survey["grid"]["measures"]] == list(rook.plan.stored)
    for candidate, (_, row) in zip(survey["candidates"], rook.candidates.iterrows(), strict=True):
        assert candidate["values"] == {name: row[name] for name in rook.plan.measures}


def test_equal_grids_are_held_once(rook_page):
    (survey,) = data_of(rook_page)["surveys"]
    block = {measure["name"]: measure.get("block") for measure in survey["grid"]["measures"]}
    assert block["tof_days"] == block["leg1_tof_days"]
    assert block["tof_days"] != block["c3_km2_s2"]


def test_a_hostile_name_adds_no_element_and_comes_back_as_it_is(swept, rook_page, page_of):
    page = page_of(swept(CUCKOO, "hostile").path)
    usual, hostile = Elements(rook_page.read_text()), Elements(page.read_text())
    assert hostile.names.count("script") == usual.names.count("script")
    assert hostile.names == usual.names
    assert data_of(page)["surveys"][0]["name"] == NAME


def test_the_page_names_no_place_on_the_network_to_load_from(rook_page):
    text = rook_page.read_text()
    own = text[: text.index('id="block-0"')] + text[text.rindex('"use strict"') :]
    assert not re.search(r"""(src|href)\s*=\s*["']?(https?:)?//""", own)


def test_the_caution_is_on_the_page(rook_page):
    assert "not for flight operations" in data_of(rook_page)["surveys"][0]["caution"]


def test_a_page_stays_within_its_size_by_thinning_further(rook, tmp_path, monkeypatch):
    whole = write_review(open_for_page([rook.path]), [], tmp_path / "whole.html")
    blocks = sum(map(len, re.findall(r'id="block-\d+">([^<]*)<', whole.path.read_text())))
    monkeypatch.setattr(review, "MOST_BYTES", whole.size - blocks // 4)
    thinned = write_review(open_for_page([rook.path]), [], tmp_path / "thinned.html")
    assert thinned.size == thinned.path.stat().st_size < review.MOST_BYTES < whole.size < MOST_BYTES
    assert thinned.thinnings[0].cells < whole.thinnings[0].cells
    assert "every 2nd" in data_of(thinned.path)["surveys"][0]["grid"]["thinning"]


def test_a_page_that_cannot_be_made_small_enough_is_refused(rook, tmp_path, monkeypatch):
    monkeypatch.setattr(review, "MOST_BYTES", 1_000_000)
    with pytest.raises(RequestError, match="too many for a page"):
        write_review(open_for_page([rook.path]), [], tmp_path / "page.html")
    assert list(tmp_path.iterdir()) == []


def test_without_plotly_the_install_line_is_said(rook, tmp_path, monkeypatch):
    real = builtins.__import__

    def without(name, *rest, **more):
        if name.startswith("plotly"):
            raise ImportError(name)
        return real(name, *rest, **more)

    monkeypatch.setattr(builtins, "__import__", without)
    with pytest.raises(RequestError, match=re.escape("pip install 'porkgrid[page]'")):
        write_review(open_for_page([rook.path]), [], tmp_path / "page.html")


def test_a_figure_without_room_is_left_out_and_named(tmp_path):
    figure = tmp_path / "path-1.svg"
    figure.write_bytes(bytes(range(256)))
    room = Room(100)
    assert room.admit(figure, review.Blocks()) is None
    assert room.left_out == ["path-1.svg"]


@pytest.fixture
def full_folder(swept):
    """A survey with what the other commands leave beside it."""
    from survey_scenarios import ROOK

    survey = swept(ROOK, "full")
    figures = survey.path / "figures"
    (figures / "path-2.svg").write_text("<svg xmlns='http://www.w3.org/2000/svg'/>")
    (figures / "flyby1-2.png").write_bytes(b"png")
    (figures / "period-21.png").write_bytes(b"of the period")
    pd.DataFrame({"period": [1], "departure": ["2028-11-20"], "c3_km2_s2": [9.5]}).to_csv(
        survey.path / "period-21.csv", index=False
    )
    pd.DataFrame({"rank": [1], "late_1_state": ["open"], "late_1_change": [None]}).to_csv(
        survey.path / "slip.csv", index=False
    )
    return survey


def test_what_other_commands_made_comes_along(full_folder, tmp_path):
    comparison = tmp_path / "comparisons" / "a_b"
    other = tmp_path / "comparisons" / "c_d"
    for folder, name in ((comparison, "Rook to Mars"), (other, "Some other route")):
        folder.mkdir(parents=True)
        pd.DataFrame({"name": [name], "c3_km2_s2": [9.0]}).to_csv(folder / "comparison.csv", index=False)
    opened = open_for_page([full_folder.path])
    data = data_of(write_review(opened, [comparison, other], tmp_path / "page.html").path)
    (survey,) = data["surveys"]
    assert [(figure["title"], figure["type"]) for figure in survey["figures"]["2"]] == [
        ("Path", "image/svg+xml"),
        ("Flyby 1", "image/png"),
    ]
    (period,) = survey["periods"]
    assert period["file"] == "period-21.csv"
    assert period["figure"]["type"] == "image/png"
    assert period["table"]["rows"] == [[1, "2028-11-20", 9.5]]
    assert survey["slip"]["rows"] == [[1, "open", None]]
    assert [made["table"]["rows"] for made in data["comparisons"]] == [[["Rook to Mars", 9.0]]]


def test_a_table_that_cannot_be_read_is_refused_by_name(full_folder, tmp_path):
    (full_folder.path / "slip.csv").write_bytes(b"")
    with pytest.raises(RequestError, match=r"slip\.csv: cannot be read"):
        write_review(open_for_page([full_folder.path]), [], tmp_path / "page.html")


def test_every_symbol_is_spelt_without_mathtext():
    spelt = {plain_symbol(entry.symbol) for entry in all_entries()}
    assert not [each for each in spelt if re.search(r"[$\\^]|_[^_]", each)]
    assert {"C₃", "departure v∞", "capture Δv", "Mars Ls at arrival"} <= spelt


def test_the_command_writes_beside_the_survey_and_draws_the_first_candidates(rook):
    done = porkgrid("page", rook.path, "--figures", "1")
    assert done.returncode == 0, done.stderr
    assert done.stdout.strip() == str(rook.path / "page.html")
    (survey,) = data_of(rook.path / "page.html")["surveys"]
    assert list(survey["figures"]) == ["1"]


def test_the_command_refuses_a_folder_as_its_file(rook, tmp_path):
    assert_refused(porkgrid("page", rook.path, "--out", tmp_path), 2, "is a folder; give a file")

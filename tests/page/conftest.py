"""Surveys with pages of them, and a browser to open these in."""

from __future__ import annotations

import os
import shutil
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest
from review_scenarios import STARLING
from survey_scenarios import ROOK, shrink_tiles, written

from porkgrid.page.opened import Opened, open_for_page
from porkgrid.page.review import write_review
from porkgrid.survey.admit import load_scenario
from porkgrid.survey.ledger import read_ledger
from porkgrid.survey.surveys import Survey
from porkgrid.survey.sweep import Progress, sweep

# Quiet, without what needs a graphics card or asks the network
CHROMIUM_ARGUMENTS = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
]


@pytest.fixture(scope="session")
def swept(tmp_path_factory) -> Callable[[str, str], Survey]:
    """Sweep a scenario's text into a folder of this name."""
    place = tmp_path_factory.mktemp("surveys")

    def sweep_it(text: str, name: str) -> Survey:
        with pytest.MonkeyPatch.context() as patch:
            shrink_tiles(patch)
            return sweep(load_scenario(written(place / f"{name}-scenario", text)), place / name, workers=1)

    return sweep_it


@pytest.fixture(scope="session")
def rook(swept) -> Survey:
    return swept(ROOK, "rook")


@pytest.fixture(scope="session")
def starling(swept) -> Survey:
    return swept(STARLING, "starling")


@pytest.fixture(scope="session")
def half_rook(tmp_path_factory) -> tuple[Path, int]:
    """ROOK with its sweep broken off, and how many of its tiles are done."""
    place = tmp_path_factory.mktemp("half")

    def break_off(progress: Progress) -> None:
        if progress.tiles_done >= 5:
            raise KeyboardInterrupt

    with pytest.MonkeyPatch.context() as patch:
        shrink_tiles(patch)
        with pytest.raises(KeyboardInterrupt):
            sweep(load_scenario(written(place, ROOK)), place / "rook", workers=1, report=break_off)
    return place / "rook", len(read_ledger(place / "rook"))


@pytest.fixture(scope="session")
def page_of(tmp_path_factory) -> Callable[..., Path]:
    """Write the page of some survey folders and return its file."""

    def write(*folders: Path) -> Path:
        opened: list[Opened] = open_for_page(folders)
        return write_review(opened, [], tmp_path_factory.mktemp("pages") / "page.html").path

    return write


@pytest.fixture(scope="session")
def rook_page(rook, page_of) -> Path:
    return page_of(rook.path)


@pytest.fixture(scope="session")
def chromium() -> Iterator[Any]:
    """A headless Chromium. Without one the tests are skipped, but not where CI is to run them."""
    program = shutil.which("chromium") or shutil.which("chromium-browser")
    try:
        from playwright.sync_api import sync_playwright
    except ImportError:
        program = None
    if program is None:
        why = "no Chromium and playwright here: apt-get install chromium, pip install -e '.[test]'"
        if os.environ.get("CI"):
            pytest.fail(why)
        pytest.skip(why)
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=program, args=CHROMIUM_ARGUMENTS)
        yield browser
        browser.close()


@pytest.fixture
def visit(chromium) -> Iterator[Callable[..., Any]]:
    """Open a page and wait until all of it is there. After the test nothing may have been complained of.

    Requests for anything but the file itself count as complaints: the page needs no network.
    """
    complaints: list[str] = []
    context = chromium.new_context(viewport={"width": 1400, "height": 900})
    context.set_default_timeout(60_000)

    def open_page(path: Path) -> Any:
        tab = context.new_page()
        own = path.resolve().as_uri()
        tab.on("console", lambda message: complaints.append(f"console {message.type}: {message.text}"))
        tab.on("pageerror", lambda error: complaints.append(f"error: {error}"))
        tab.on(
            "request",
            lambda asked: asked.url.startswith((own, "blob:", "data:")) or complaints.append(asked.url),
        )
        tab.goto(own)
        tab.wait_for_function("document.documentElement.dataset.ready !== undefined", timeout=60_000)
        return tab

    yield open_page
    context.close()
    assert complaints == []


@pytest.fixture
def tab(visit, rook_page):
    return visit(rook_page)

"""Figures become real files, whole or not at all, the same every time."""

from __future__ import annotations

import xml.etree.ElementTree as ET
from pathlib import Path

import pytest
import synthetic_porkchop as grids
from matplotlib.figure import Figure
from PIL import Image
from synthetic_porkchop import C3

from porkgrid.errors import RequestError, RunError
from porkgrid.figures.chart import draw_chart
from porkgrid.figures.style import new_slide, save_figure


def chart() -> Figure:
    view = grids.usual(title=grids.HOSTILE)
    return draw_chart(view, grids.bests_of(view, C3), grids.candidates_of(view, C3, 5), C3, "dla_deg")


@pytest.fixture(scope="module")
def saved(tmp_path_factory: pytest.TempPathFactory) -> list[Path]:
    return save_figure(chart(), tmp_path_factory.mktemp("figures") / "chart v1.2", ["png", "svg", "pdf"])


def test_files_are_named_after_the_format_and_nothing_else_is_left(saved: list[Path]) -> None:
    assert [path.name for path in saved] == ["chart v1.2.png", "chart v1.2.svg", "chart v1.2.pdf"]
    assert sorted(saved[0].parent.iterdir()) == sorted(saved)


def test_the_png_is_a_slide_at_200_pixels_an_inch(saved: list[Path]) -> None:
    with Image.open(saved[0]) as picture:
        picture.load()
        assert picture.width / picture.height == pytest.approx(16 / 9, rel=1e-3)
        assert picture.width >= 13.33 * 200
        assert picture.info["dpi"][0] == pytest.approx(200, abs=0.1)
        assert len(picture.convert("RGB").getcolors(1 << 24)) > 200


def test_the_svg_is_well_formed_and_as_large_as_a_slide(saved: list[Path]) -> None:
    root = ET.parse(saved[1]).getroot()
    assert float(root.attrib["width"].removesuffix("pt")) == pytest.approx(960, abs=0.1)
    assert sum(1 for _ in root.iter("{http://www.w3.org/2000/svg}image")) >= 1


def test_the_pdf_is_whole(saved: list[Path]) -> None:
    content = saved[2].read_bytes()
    assert content.startswith(b"%PDF-")
    assert content.rstrip().endswith(b"%%EOF")


def test_the_same_figure_gives_the_same_bytes(saved: list[Path], tmp_path: Path) -> None:
    again = save_figure(chart(), tmp_path / "again", ["png", "svg", "pdf"])
    assert [path.read_bytes() for path in again] == [path.read_bytes() for path in saved]


def test_an_unknown_format_is_refused_before_anything_is_written(tmp_path: Path) -> None:
    with pytest.raises(RequestError, match=r"'gif'.*png, svg, pdf"):
        save_figure(new_slide()[0], tmp_path / "chart", ["png", "gif"])
    assert list(tmp_path.iterdir()) == []


def test_a_place_that_cannot_be_written_is_named(tmp_path: Path) -> None:
    (tmp_path / "figures").write_text("a file where a folder should be")
    with pytest.raises(RunError, match=r"cannot write the figure .*chart\.png"):
        save_figure(new_slide()[0], tmp_path / "figures" / "chart", ["png"])


def test_a_failed_save_leaves_the_earlier_figure_and_no_scraps(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    figure = new_slide()[0]
    (path,) = save_figure(figure, tmp_path / "chart", ["png"])
    before = path.read_bytes()

    def full_disk(target: Path, **options: object) -> None:
        Path(target).write_bytes(b"half a fig")
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(figure, "savefig", full_disk)
    with pytest.raises(RunError, match="No space left on device"):
        save_figure(figure, tmp_path / "chart", ["png"])
    assert path.read_bytes() == before
    assert list(tmp_path.iterdir()) == [path]

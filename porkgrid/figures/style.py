"""The look that all figures share, and how a figure becomes files."""

from __future__ import annotations

import os
from collections.abc import Sequence
from contextlib import suppress
from pathlib import Path
from typing import Any

import matplotlib
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from porkgrid.errors import RequestError, RunError

# A 16:9 slide. Places are given in inches from the lower left corner of the slide.
SLIDE_WIDTH_IN = 13.333
SLIDE_HEIGHT_IN = 7.5
PIXELS_PER_INCH = 200  # of the PNG, and of the fills inside SVG and PDF

SMALL_PT = 8.0  # nothing is smaller
BODY_PT = 9.0
HEAD_PT = 10.0

INK = "#1b1f24"
SOFT_INK = "#57606a"
FAINT_INK = "#a0a7ae"
PAPER = "#ffffff"
ACCENT = "#b5179e"

SETTINGS: Any = {
    "font.family": ["DejaVu Sans"],  # comes with matplotlib: same widths on every machine
    "text.hinting": "none",  # at 200 pixels an inch not needed for sharpness, and a tenth of the drawing time
    "svg.hashsalt": "porkgrid",  # the same ids in the same figure every time
    "svg.fonttype": "path",
    "pdf.fonttype": 42,  # whole letters: text can be selected and edited
}
_METADATA: dict[str, dict[str, Any]] = {
    "png": {"Software": None},
    "svg": {"Date": None, "Creator": "porkgrid"},
    "pdf": {"CreationDate": None, "ModDate": None, "Creator": "porkgrid", "Producer": "porkgrid"},
}
# Level 6 halves the speed of the whole save and makes the file only about a tenth smaller.
_SAVE_OPTIONS: dict[str, dict[str, Any]] = {"png": {"pil_kwargs": {"compress_level": 3}}}


def new_slide() -> tuple[Figure, Axes]:
    """Open an empty slide; return it with its sheet: invisible axes over all of it that count in inches."""
    figure = Figure(figsize=(SLIDE_WIDTH_IN, SLIDE_HEIGHT_IN), dpi=PIXELS_PER_INCH, facecolor=PAPER)
    FigureCanvasAgg(figure)
    sheet = figure.add_axes((0.0, 0.0, 1.0, 1.0), frameon=False, zorder=5)
    sheet.set(xlim=(0.0, SLIDE_WIDTH_IN), ylim=(0.0, SLIDE_HEIGHT_IN), xticks=[], yticks=[])
    sheet.set_autoscale_on(False)
    return figure, sheet


def axes_at(figure: Figure, left_in: float, bottom_in: float, width_in: float, height_in: float) -> Axes:
    """Add axes at a place in inches, framed and ticked in the common style."""
    axes = figure.add_axes(
        (
            left_in / SLIDE_WIDTH_IN,
            bottom_in / SLIDE_HEIGHT_IN,
            width_in / SLIDE_WIDTH_IN,
            height_in / SLIDE_HEIGHT_IN,
        )
    )
    axes.set_autoscale_on(False)
    axes.tick_params(labelsize=SMALL_PT, color=SOFT_INK, labelcolor=INK, length=3, width=0.6, pad=2.5)
    for spine in axes.spines.values():
        spine.set(color=SOFT_INK, linewidth=0.6)
    return axes


def save_figure(figure: Figure, path_without_suffix: Path, formats: Sequence[str]) -> list[Path]:
    """Write a figure as PNG, SVG or PDF files and return their paths, in the order of `formats`.

    Each file is written beside its final name and then renamed, so that a reader never sees half a figure.
    The bytes depend on the figure alone: no dates and no random ids.
    Raises RequestError for a format not known here, RunError where the file cannot be written.
    """
    unknown = [name for name in formats if name not in _METADATA]
    if unknown:
        raise RequestError(
            *(f"figure format {name!r}: not known; it can be {', '.join(_METADATA)}" for name in unknown)
        )
    target = Path(path_without_suffix)
    return [_write(figure, target.with_name(f"{target.name}.{name}"), name) for name in formats]


def _write(figure: Figure, path: Path, name: str) -> Path:
    """Write one file under a temporary name, then rename it."""
    temporary = path.with_name(f".{path.name}.{os.getpid()}.part")
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        with matplotlib.rc_context(SETTINGS):
            figure.savefig(
                temporary,
                format=name,
                dpi=PIXELS_PER_INCH,
                metadata=_METADATA[name],
                **_SAVE_OPTIONS.get(name, {}),
            )
        temporary.replace(path)
    except OSError as fault:
        raise RunError(f"cannot write the figure {path}: {fault.strerror or fault}") from fault
    finally:
        with suppress(
            OSError
        ):  # it is gone, or its folder is what failed: the first fault is the one to tell
            temporary.unlink()
    return path

"""The pixels inside a panel: bands of value with forbidden ground muted and hatched, or ground by limit.

A picture is built as indices into a short colour table, with a hatch of eight strengths over it: one look-up
then colours every pixel.
"""

from __future__ import annotations

import numpy as np
import pandas as pd

from porkgrid.figures.ground import (
    ALLOWED,
    FIRST_LIMIT,
    MAX_HATCHES,
    OTHER_ALONE,
    SEVERAL,
    Ground,
)
from porkgrid.figures.hatches import hatch_coverage
from porkgrid.figures.levels import Scale
from porkgrid.figures.palette import (
    ALLOWED_PAPER,
    FORBIDDEN_GREY,
    LIMIT_COLOURS,
    NO_FLIGHT_PAPER,
    NO_TRANSFER_GREY,
    OTHER_LIMIT_COLOUR,
)
from porkgrid.figures.raster import Raster

_MUTED = 0.78  # how far values on forbidden ground fade into grey
_DARK_INK, _LIGHT_INK = np.array((0.36, 0.39, 0.42)), np.array((1.0, 1.0, 1.0))
_LUMA = np.array((0.299, 0.587, 0.114))  # ITU-R BT.601
_DARK_BELOW = 0.45  # luma of a ground that needs light hatches
_OUTLINE = np.array((0.11, 0.12, 0.14))
_STRENGTHS = 8
NO_HATCH = -1
COMMON_HATCH = MAX_HATCHES
_BAND_PX = 14  # width of the stripes that share a cell between several limits
_SEVERAL_TINT = 0.5

_HATCH_OF_KIND = np.full(FIRST_LIMIT + MAX_HATCHES, NO_HATCH)
_HATCH_OF_KIND[FIRST_LIMIT:] = np.arange(MAX_HATCHES)
_HATCH_OF_KIND[OTHER_ALONE] = COMMON_HATCH


def value_pixels(
    raster: Raster, ground: Ground, values: np.ndarray, unit: str, scale: Scale | None
) -> np.ndarray:
    """Return (rows, columns, 3) uint8: value bands, in full colour where allowed, muted where forbidden."""
    kind = raster.cells(ground.kind)
    bands = scale.colours if scale is not None else np.empty((0, 3))
    count = len(bands)
    papers = np.stack([ALLOWED_PAPER, NO_FLIGHT_PAPER, NO_TRANSFER_GREY, FORBIDDEN_GREY])
    colours = np.concatenate([papers, bands, (1.0 - _MUTED) * bands + _MUTED * FORBIDDEN_GREY])

    index = np.minimum(kind, len(papers) - 1)  # paper, by kind
    if scale is not None:
        value = raster.between(values, unit)
        known = np.isfinite(value) & ((kind == ALLOWED) | (kind >= SEVERAL))
        banded = len(papers) + scale.band_of(value) + np.where(kind == ALLOWED, 0, count)
        index = np.where(known, banded, index)
    return _coloured(index, colours, _HATCH_OF_KIND[kind], kind == ALLOWED)


def limit_pixels(raster: Raster, ground: Ground) -> np.ndarray:
    """Return (rows, columns, 3) uint8: what forbids each cell.

    The colour and hatch of a limit that forbids it alone; stripes in the pale colours of all that do so.
    """
    kind = raster.cells(ground.kind)
    full = np.concatenate([[OTHER_LIMIT_COLOUR], LIMIT_COLOURS])
    papers = np.stack([ALLOWED_PAPER, NO_FLIGHT_PAPER, NO_TRANSFER_GREY, FORBIDDEN_GREY])
    colours = np.concatenate([papers, full, (1.0 - _SEVERAL_TINT) * full + _SEVERAL_TINT])
    index = np.where(kind == SEVERAL, len(papers) + len(full) + _shared(raster, ground), kind)
    return _coloured(index, colours, _HATCH_OF_KIND[kind], kind == ALLOWED)


def limit_swatch(hatch: int | None, rows: int, columns: int) -> np.ndarray:
    """Return (rows, columns, 3) uint8 pixels of a limit alone; hatch None is the shared look."""
    colour = OTHER_LIMIT_COLOUR if hatch is None else LIMIT_COLOURS[hatch]
    return plain_swatch(colour, COMMON_HATCH if hatch is None else hatch, rows, columns)


def pale_swatch(hatch: int | None, rows: int, columns: int) -> np.ndarray:
    """Return (rows, columns, 3) uint8 pixels in the pale colour of a limit that acts with others."""
    colour = OTHER_LIMIT_COLOUR if hatch is None else LIMIT_COLOURS[hatch]
    return plain_swatch((1.0 - _SEVERAL_TINT) * colour + _SEVERAL_TINT, NO_HATCH, rows, columns)


def several_swatch(colours: list[int], rows: int, columns: int) -> np.ndarray:
    """Return (rows, columns, 3) uint8 pixels striped in the pale colours of limits, by their hatches."""
    pale = (1.0 - _SEVERAL_TINT) * LIMIT_COLOURS + _SEVERAL_TINT
    stripe = _stripes(rows, columns) % len(colours)
    return np.rint(pale[np.asarray(colours)][stripe] * 255.0).astype(np.uint8)


def plain_swatch(colour: np.ndarray, hatch: int, rows: int, columns: int) -> np.ndarray:
    """Return (rows, columns, 3) uint8 pixels of one colour under one hatch; hatch −1 is none."""
    index, allowed = np.zeros((rows, columns), dtype=np.intp), np.zeros((rows, columns), dtype=bool)
    return _coloured(index, np.asarray(colour)[None, :], np.full((rows, columns), hatch), allowed)


def _shared(raster: Raster, ground: Ground) -> np.ndarray:
    """Return (rows, columns): which limit colour (0 common, 1 + hatch) owns the stripe a pixel is in."""
    which, sets = pd.factorize(ground.blocked.ravel())  # by hashing: np.unique would sort a million cells
    colour_of_limit = np.zeros(len(ground.masks), dtype=np.intp)
    colour_of_limit[ground.hatched] = 1 + np.arange(len(ground.hatched))
    cycles = [np.unique(colour_of_limit[(ground.masks & bits) != 0]) for bits in sets]
    longest = max((len(cycle) for cycle in cycles), default=1) or 1
    table = np.zeros((len(sets), longest), dtype=np.intp)
    length = np.ones(len(sets), dtype=np.intp)
    for row, cycle in enumerate(cycles):
        if len(cycle):
            table[row, : len(cycle)], length[row] = cycle, len(cycle)

    member = raster.cells(which.reshape(ground.blocked.shape))
    return table[member, _stripes(*member.shape) % length[member]]


def _stripes(rows: int, columns: int) -> np.ndarray:
    """Return (rows, columns): the number of the slanted stripe that each pixel is in."""
    return (np.arange(rows)[:, None] + np.arange(columns)[None, :]) // _BAND_PX


def _coloured(index: np.ndarray, colours: np.ndarray, hatch: np.ndarray, allowed: np.ndarray) -> np.ndarray:
    """Look up colours, lay the hatch over them, and draw the border of allowed ground two pixels wide."""
    strength = np.linspace(0.0, 1.0, _STRENGTHS + 1)[None, :, None]
    ink = np.where((colours @ _LUMA < _DARK_BELOW)[:, None], _LIGHT_INK, _DARK_INK)
    inked = colours[:, None, :] * (1.0 - strength) + ink[:, None, :] * strength
    table = np.concatenate([inked.reshape(-1, 3), _OUTLINE[None, :]])
    coverage = np.rint(hatch_coverage(hatch) * _STRENGTHS).astype(np.intp)
    final = index.astype(np.intp) * (_STRENGTHS + 1) + coverage
    final[_border(allowed)] = len(table) - 1
    return np.rint(table * 255.0).astype(np.uint8)[final]


def _border(inside: np.ndarray) -> np.ndarray:
    """Return the pixels on either side of the border of a region."""
    border = np.zeros(inside.shape, dtype=bool)
    across = inside[:, 1:] != inside[:, :-1]
    border[:, 1:] |= across
    border[:, :-1] |= across
    along = inside[1:, :] != inside[:-1, :]
    border[1:, :] |= along
    border[:-1, :] |= along
    return border

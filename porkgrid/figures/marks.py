"""Lines and areas added to axes whose limits are already set.

`axes.plot` and `axes.add_patch` also choose a colour, convert units and work out new limits: several
milliseconds a call, which for the hundred small marks of a slide is longer than drawing the grid.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.collections import LineCollection
from matplotlib.image import AxesImage
from matplotlib.lines import Line2D
from matplotlib.patches import Polygon, Rectangle
from matplotlib.transforms import IdentityTransform


def add_line(
    axes: Axes, x: Sequence[float] | np.ndarray, y: Sequence[float] | np.ndarray, **style: Any
) -> None:
    """Draw a line, or markers, through points in the axes' coordinates."""
    axes.add_artist(Line2D(x, y, **style))


def add_segments(axes: Axes, segments: Sequence[Sequence[tuple[float, float]]], **style: Any) -> None:
    """Draw many lines of one style."""
    axes.add_artist(LineCollection(segments, **style))


def add_area(axes: Axes, corners: Sequence[tuple[float, float]], **style: Any) -> None:
    """Draw a polygon."""
    axes.add_artist(Polygon(corners, **style))


def add_rectangle(axes: Axes, left: float, bottom: float, width: float, height: float, **style: Any) -> None:
    """Draw an upright rectangle."""
    axes.add_artist(Rectangle((left, bottom), width, height, **style))


class _PixelImage(AxesImage):
    """An image whose pixels are those of the PNG: copied there, as resampling would take most of its time."""

    def make_image(self, renderer: Any, magnification: float = 1.0, unsampled: bool = False) -> tuple:
        """Return RGBA pixels bottom row first, with their left and lower edge, as AxesImage does."""
        left, right, bottom, top = self.get_extent()
        corners = self.axes.transData.transform([(left, bottom), (right, top)])
        pixels = np.asarray(self.get_array())
        rows, columns = pixels.shape[:2]
        width, height = corners[1] - corners[0]
        if unsampled or abs(width - columns) > 1.0 or abs(height - rows) > 1.0:
            return super().make_image(renderer, magnification, unsampled)
        x, y = np.rint(corners[0])
        return pixels[::-1], float(x), float(y), IdentityTransform()


def add_pixels(axes: Axes, pixels: np.ndarray, extent: tuple[float, float, float, float]) -> None:
    """Show (rows, columns, 3) uint8 pixels over left, right, bottom, top; one to one in the PNG."""
    opaque = np.full((*pixels.shape[:2], 1), 255, dtype=np.uint8)
    image = _PixelImage(axes, extent=extent, origin="upper", interpolation="none")
    image.set_data(np.concatenate([pixels, opaque], axis=-1))
    axes.add_artist(image)

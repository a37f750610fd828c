"""Colours: one ramp for values, one set for limits. Both hold for colour-blind readers and in grey print."""

from __future__ import annotations

import numpy as np

# Best to worst: deep indigo, teal, green, pale sand, in OKLab (Ottosson 2020, "A perceptual color space for
# image processing"). Lightness rises evenly, so the ramp stays ordered in grey and without red-green vision.
_RAMP_OKLAB = np.array(
    [
        (0.33, 0.020, -0.115),
        (0.48, -0.030, -0.105),
        (0.63, -0.070, -0.040),
        (0.78, -0.075, 0.030),
        (0.93, -0.020, 0.055),
    ]
)

# Okabe and Ito (2008), "Color Universal Design", without black, and without vermilion,
# which is too near orange once both are paled; ordered so that neighbours differ most.
LIMIT_COLOURS = np.array(
    [
        (230, 159, 0),
        (0, 114, 178),
        (204, 121, 167),
        (0, 158, 115),
        (240, 228, 66),
        (86, 180, 233),
    ]
) / 255.0  # fmt: skip
OTHER_LIMIT_COLOUR = np.array((0.45, 0.45, 0.45))
FORBIDDEN_GREY = np.array((0.91, 0.915, 0.92))
NO_TRANSFER_GREY = np.array((0.80, 0.81, 0.82))
ALLOWED_PAPER = np.array((1.0, 1.0, 1.0))
NO_FLIGHT_PAPER = np.array((0.965, 0.967, 0.97))


def depth_colours(count: int) -> np.ndarray:
    """Return (count, 3) float RGB from the best value's colour to the worst's, evenly spaced to the eye."""
    along = np.linspace(0.0, 1.0, count) if count > 1 else np.array([0.0])
    knots = np.linspace(0.0, 1.0, len(_RAMP_OKLAB))
    oklab = np.stack([np.interp(along, knots, channel) for channel in _RAMP_OKLAB.T], axis=-1)
    return srgb_from_oklab(oklab)


def srgb_from_oklab(oklab: np.ndarray) -> np.ndarray:
    """Return float sRGB (..., 3) of OKLab (..., 3) colours; matrices from Ottosson 2020."""
    to_lms = np.array(
        [
            [1.0, 0.3963377774, 0.2158037573],
            [1.0, -0.1055613458, -0.0638541728],
            [1.0, -0.0894841775, -1.2914855480],
        ]
    )
    to_linear = np.array(
        [
            [4.0767416621, -3.3077115913, 0.2309699292],
            [-1.2684380046, 2.6097574011, -0.3413193965],
            [-0.0041960863, -0.7034186147, 1.7076147010],
        ]
    )
    linear = np.clip((oklab @ to_lms.T) ** 3 @ to_linear.T, 0.0, 1.0)
    return np.where(linear <= 0.0031308, 12.92 * linear, 1.055 * linear ** (1.0 / 2.4) - 0.055)

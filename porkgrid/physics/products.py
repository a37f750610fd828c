"""Products without cancellation, by fused multiply-add."""

from __future__ import annotations

from typing import Any

from numba import njit, types
from numba.extending import intrinsic

from porkgrid.physics.timeflight import ROW


def _fused(typingctx, a, b, c):
    def generate(context, builder, signature, arguments):
        return builder.fma(*arguments)

    return types.float64(types.float64, types.float64, types.float64), generate


fma: Any = intrinsic(_fused)  # a·b + c, rounded once


@njit(**ROW, inline="always")
def difference_of_products(a, b, c, d):
    """a·b − c·d to within two units in the last place (Kahan; Jeannerod, Louvet and Muller 2013)."""
    cd = c * d
    lost = fma(-c, d, cd)
    return fma(a, b, -cd) + lost


@njit(**ROW, inline="always")
def cross(ax, ay, az, bx, by, bz):
    """a × b, every component to within two units in the last place."""
    return (
        difference_of_products(ay, bz, az, by),
        difference_of_products(az, bx, ax, bz),
        difference_of_products(ax, by, ay, bx),
    )

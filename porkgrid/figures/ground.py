"""What each cell of a grid is: allowed, forbidden by one limit or by several, or no flight at all."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import xarray as xr

ALLOWED, BEFORE_DEPARTURE, NO_TRANSFER, SEVERAL, OTHER_ALONE, FIRST_LIMIT = range(6)
MAX_HATCHES = 6  # more than these cannot be told apart; further limits share OTHER_ALONE

_NO_FLIGHT = {
    "arrival_before_departure": BEFORE_DEPARTURE,
    "plane_undefined": NO_TRANSFER,
    "no_transfer": NO_TRANSFER,
}


@dataclass(frozen=True, eq=False)
class Ground:
    """Kinds of cells.

    kind: (departure, arrival) uint8: one of the constants above; FIRST_LIMIT + i is hatched limit i alone.
    flags: titles of all limits, in the order of the scenario.
    masks: (limits,) uint32, the bit of each limit in `blocked`.
    hatched: positions in `flags` of the limits that have a hatch of their own, at most MAX_HATCHES.
    blocked: (departure, arrival) uint32, bits of limits only.
    """

    kind: np.ndarray
    flags: list[str]
    masks: np.ndarray
    hatched: list[int]
    blocked: np.ndarray

    @property
    def allowed_text(self) -> str:
        """Say how much of the grid is allowed, rounded: the cells may be a thinned grid's."""
        percent = 100.0 * float(np.mean(self.kind == ALLOWED))
        if percent in (0.0, 100.0):
            return "the whole grid is allowed" if percent else "no cell of the grid is allowed"
        about = "under 1" if percent < 1.0 else "over 99" if percent > 99.0 else f"about {percent:.0f}"
        return f"{about} % of the grid is allowed"

    def hatch_of(self, limit: int) -> int | None:
        """Return which hatch limit number `limit` has, or None if it shares the common one."""
        return self.hatched.index(limit) if limit in self.hatched else None


def read_ground(view: xr.Dataset) -> Ground:
    """Sort the cells of a survey grid by what `blocked_by` says of them."""
    variable = view["blocked_by"].transpose("departure", "arrival")
    bits = variable.values.astype(np.uint32)
    masks = np.atleast_1d(variable.attrs["flag_masks"]).astype(np.uint32)
    names = str(variable.attrs["flag_meanings"]).split()
    titles = list(np.atleast_1d(variable.attrs.get("flag_titles", names)))

    is_limit = [name not in _NO_FLIGHT for name in names]
    limit_masks = masks[is_limit]
    blocked = bits & np.bitwise_or.reduce(limit_masks, initial=np.uint32(0))
    # A limit is met alone where clearing the lowest set bit leaves nothing.
    alone = (blocked != 0) & ((blocked & (blocked - np.uint32(1))) == 0)

    kind = np.where(blocked == 0, ALLOWED, np.where(alone, OTHER_ALONE, SEVERAL)).astype(np.uint8)
    hatched = _most_seen(blocked, limit_masks)
    for hatch, limit in enumerate(hatched):
        kind[alone & (blocked == limit_masks[limit])] = FIRST_LIMIT + hatch
    for name, mask in zip(names, masks, strict=True):
        if name in _NO_FLIGHT:
            kind[(bits & mask) != 0] = _NO_FLIGHT[name]
    flags = [str(title) for title, keep in zip(titles, is_limit, strict=True) if keep]
    return Ground(kind, flags, limit_masks, hatched, blocked)


def _most_seen(blocked: np.ndarray, masks: np.ndarray) -> list[int]:
    """Return which limits get a hatch of their own, in scenario order.

    First those that forbid the most cells alone, then those that forbid the most with others.
    """
    seen = [
        (np.count_nonzero(blocked == mask), np.count_nonzero(blocked & mask), -i)
        for i, mask in enumerate(masks)
    ]
    return sorted(-i for _, _, i in sorted(seen, reverse=True)[:MAX_HATCHES])

"""How the page spells measures: symbols without mathtext, and how many digits a unit is shown with."""

from __future__ import annotations

import re

_SPELT = {
    r"\infty": "∞",
    r"\Delta": "Δ",
    "C_3": "C₃",
    "L_s": "Ls",
    "v_∞": "v∞",
}
# Decimals that an estimate of patched conics is worth
_DIGITS = {"km/s": 3, "km²/s²": 2, "deg": 1, "days": 1, "au": 3, "1": 0, "kg": 0, "km": 0}
_DEFAULT_DIGITS = 3


def plain_symbol(symbol: str) -> str:
    """A measure's symbol as plain text: `departure $v_\\infty$` is "departure v∞"."""
    for mathtext, plain in _SPELT.items():
        symbol = symbol.replace(mathtext, plain)
    return re.sub(r"\s+", " ", symbol.replace("Δ v", "Δv")).replace("$", "")


def digits_of(unit: str) -> int:
    """Decimals to show a number of this unit with."""
    return _DIGITS.get(unit, _DEFAULT_DIGITS)

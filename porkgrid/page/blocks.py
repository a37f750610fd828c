"""The packed parts of a page, each held once however often it is asked for."""

from __future__ import annotations


class Blocks:
    """Base64 texts by number. Equal texts share a number: of one leg, leg 1 is the whole route."""

    def __init__(self) -> None:
        self._number_of: dict[str, int] = {}

    def add(self, text: str) -> int:
        """Keep a text and return its number."""
        return self._number_of.setdefault(text, len(self._number_of))

    @property
    def texts(self) -> list[str]:
        """All texts, in order of number."""
        return list(self._number_of)

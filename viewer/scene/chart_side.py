"""One side of a chart that compares two mode sets: what it is called, its frequencies and names, its colour."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from viewer.scene.tokens import Tokens


@dataclass(frozen=True)
class Side:
    """``hz`` by mode, ``names`` by mode (may be short or empty), ``role`` the name of a field of ``Tokens``."""

    name: str
    hz: Sequence[float] = ()
    names: Sequence[str] = ()
    role: str = "ink"

    def colour(self, tokens: Tokens) -> str:
        return str(getattr(tokens, self.role))

    def mode_name(self, number: int) -> str:
        """The name of mode ``number`` (from 1), or empty."""
        return self.names[number - 1] if number <= len(self.names) else ""


def of_test(name: str, hz: Sequence[float]) -> Side:
    """The side of a test."""
    return Side(f"test: {name}", hz, (), "test")


def of_analysis(name: str, hz: Sequence[float], names: Sequence[str] = ()) -> Side:
    """The side of an analysis that a test is held against."""
    return Side(f"analysis: {name}", hz, names, "ink")

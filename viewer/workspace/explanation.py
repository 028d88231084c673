"""All that is found about one mode, in the order it is told: what it does, where it folds, where to change it.

A question that cannot be answered is left out, with the reason: it never stops the others.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Protocol, TypeVar

from viewer.errors import HingelightError, ModelError, RefusedError
from viewer.insight.character import Character
from viewer.insight.gain_finding import GainMap
from viewer.insight.hinges import HingeFinding


class Finding(Protocol):
    """What every question answers."""

    @property
    def sentence(self) -> str:
        """The answer in one sentence, made of the figures of ``to_dict``."""

    def to_dict(self) -> dict[str, Any]:
        """Every figure."""


Answer = TypeVar("Answer")


@dataclass(frozen=True, eq=False)
class Explanation:
    """The findings about mode ``number``; None where one cannot be had, ``refused`` then says why."""

    number: int
    character: Character | None
    hinges: HingeFinding | None
    gain: GainMap | None
    refused: tuple[str, ...] = ()

    @property
    def findings(self) -> dict[str, Finding]:
        """The answers by question, in the order in which they are told."""
        named = {"character": self.character, "hinges": self.hinges, "gain": self.gain}
        return {name: finding for name, finding in named.items() if finding is not None}

    @property
    def sentences(self) -> tuple[str, ...]:
        return tuple(finding.sentence for finding in self.findings.values())

    @property
    def cautions(self) -> tuple[str, ...]:
        """What a reader of any of the figures must know."""
        words = [word for finding in self.findings.values() for word in finding.to_dict().get("cautions", ())]
        return tuple(dict.fromkeys((*words, *self.refused)))

    def to_dict(self) -> dict[str, Any]:
        return {
            "mode": self.number,
            **{name: {**f.to_dict(), "sentence": f.sentence} for name, f in self.findings.items()},
            "refused": list(self.refused),
        }


def asked(question: Callable[[], Answer], refused: list[str]) -> Answer | None:
    """The answer, or None with the reason added to ``refused`` where the data for it are missing."""
    try:
        return question()
    except (RefusedError, ModelError) as error:
        refused.append(_reason(error))
        return None


def _reason(error: HingelightError) -> str:
    return f"{error.problem}; {error.do}" if error.do else error.problem

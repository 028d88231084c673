"""Whether every number of a sentence is one of the figures it was made from, rounded as written."""

from __future__ import annotations

import re
from collections.abc import Iterator
from typing import Any

_NUMBER = re.compile(
    r"(?<![\w.])(?P<sign>[-−+]?)(?P<digits>\d[\d\u202f,]*(?:\.\d+)?(?:e[-+]?\d+)?)"
    r"[\s\u00a0]?(?P<unit>%|°|kN/mm|N/mm|kN/m|N/m|N·m/rad|kHz|Hz/kg|Hz|µm|nm|mm|kg|km|m\b|g\b)?"
)
_FACTORS = {
    "%": (1.0, 100.0), "mm": (1e3,), "µm": (1e6,), "nm": (1e9,), "g": (1e3,), "kHz": (1e-3,), "kN/mm": (1e-6,),
    "N/mm": (1e-3,), "kN/m": (1e-3,), "km": (1e-3,),
}  # fmt: skip


def figures(facts: Any) -> Iterator[float]:
    """Every number in nested dictionaries and lists, and the numbers inside texts (names carry some)."""
    if isinstance(facts, dict):
        for key, value in facts.items():
            if key != "sentence":
                yield from figures(value)
    elif isinstance(facts, list | tuple):
        for value in facts:
            yield from figures(value)
    elif isinstance(facts, str):
        yield from (_value(match) for match in _NUMBER.finditer(facts))
    elif isinstance(facts, int | float) and not isinstance(facts, bool):
        yield float(facts)


def unfounded(sentence: str, facts: Any) -> list[str]:
    """The numbers of ``sentence`` that no figure of ``facts`` gives when rounded to the digits written."""
    known = list(figures(facts))
    return [match.group().strip() for match in _NUMBER.finditer(sentence) if not _founded(match, known)]


def _value(match: re.Match) -> float:
    return float(match["digits"].replace("\u202f", "").replace(",", "")) * (-1 if match["sign"] in ("-", "−") else 1)


def _founded(match: re.Match, known: list[float]) -> bool:
    written = abs(_value(match))
    digits = match["digits"].replace("\u202f", "").replace(",", "")
    mantissa, _, power = digits.partition("e")
    if "." in mantissa:
        last = 10.0 ** -len(mantissa.partition(".")[2])
    else:  # "8 300": zeros at the end may stand for digits rounded away, two digits never
        last = 10.0 ** min(len(mantissa) - len(mantissa.rstrip("0")), max(len(mantissa) - 2, 0))
    last *= 10.0 ** int(power or 0)
    return any(
        abs(abs(value) * factor - written) <= 0.5000001 * last
        for value in known
        for factor in _FACTORS.get(match["unit"] or "", (1.0,))
    )

"""Reference values by id from tests/data/checks.csv, and Richardson extrapolation over three meshes.

The CSV owns every number: a test asks for row "B01" and never types the value again.
"""

from __future__ import annotations

import csv
import re
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import numpy as np

CSV = Path(__file__).parent.parent / "data" / "checks.csv"
FLOOR = 1e-3  # no finite-element result is asked to be closer than this to a row whose own tolerance is tighter
_NUMBER = re.compile(r"[-+]?(?:\d+\.\d*|\.\d+|\d+)(?:[eE][-+]?\d+)?")


@dataclass(frozen=True)
class Row:
    """One line of the CSV. ``values`` are the numbers of its value column in order; ``parts`` the same split
    at "|" (and, inside a part, at ";"), for rows that hold several cases."""

    id: str
    topic: str
    quantity: str
    inputs: str
    text: str
    unit: str
    tolerances: tuple[float, ...]
    source: str
    status: str

    @property
    def parts(self) -> tuple[tuple[float, ...], ...]:
        return tuple(
            tuple(number for item in part.split(";") for number in _repeated(item)) for part in self.text.split("|")
        )

    @property
    def values(self) -> tuple[float, ...]:
        return tuple(value for part in self.parts for value in part)

    @property
    def tolerance(self) -> float:
        """The row's (first) relative tolerance, not below ``FLOOR``."""
        return max(self.tolerances[0], FLOOR)


def _repeated(item: str) -> tuple[float, ...]:
    """ "flex 42.650 x2" -> (42.65, 42.65); words are skipped, numbers separated by blanks or commas are kept."""
    found: list[float] = []
    for word in re.split(r"[\s,]+", item.strip()):
        times = re.fullmatch(r"x(\d+)", word)
        if times and found:
            found += [found[-1]] * (int(times[1]) - 1)
        elif re.fullmatch(_NUMBER, word):
            found.append(float(word))
    return tuple(found)


@cache
def rows() -> dict[str, Row]:
    """All rows by id."""
    with CSV.open(newline="", encoding="utf-8") as file:
        return {
            line["id"]: Row(
                line["id"],
                line["topic"],
                line["quantity"],
                line["inputs"],
                line["value"],
                line["unit"],
                tuple(float(number) for number in line["rel_tol"].split(";")),
                line["source"],
                line["status"],
            )
            for line in csv.DictReader(file)
        }


def row(name: str) -> Row:
    return rows()[name]


@dataclass(frozen=True)
class Extrapolated:
    """Limit and observed order p of values v(h) = limit + c h^p on three meshes."""

    limit: np.ndarray
    rate: np.ndarray

    def error(self, expected: object) -> np.ndarray:
        """Relative errors of the limits."""
        wanted = np.asarray(expected, float)
        return np.abs(self.limit - wanted) / np.abs(wanted)


def richardson(coarse: object, middle: object, fine: object, ratio: float = 2.0) -> Extrapolated:
    """Richardson extrapolation of values (any shape) on meshes whose sizes shrink by ``ratio`` each time.

    Rate log((v1 − v2)/(v2 − v3)) / log(ratio), limit v3 + (v3 − v2)/(ratio^rate − 1). Where the three values
    are equal to 1e-6 of each other already, the limit is the finest value and the rate NaN; where they do not
    converge monotonically the rate is NaN too and the limit is the finest value, so that nothing is gained by
    extrapolating noise. (Roache P.J., Verification and Validation in Computational Science and Engineering,
    1998, ch. 5; from memory.)
    """
    first, second, third = (np.asarray(values, float) for values in (coarse, middle, fine))
    before, after = first - second, second - third
    settled = np.abs(before) <= 1e-6 * np.abs(third)
    with np.errstate(divide="ignore", invalid="ignore"):
        quotient = before / after
        usable = ~settled & (quotient > 1.0)
        rate = np.where(usable, np.log(quotient) / np.log(ratio), np.nan)
        limit = np.where(usable, third - after / (quotient - 1.0), third)
    return Extrapolated(limit, rate)

"""How big it really is: the drawn magnification and the real size of a mode (DESIGN §6 "True scale")."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, eq=False)
class Scale:
    """How one mode of one design is drawn, and what is known about its real size.

    factor          drawn metres per unit of the shape
    magnification   drawn ÷ real; 1.0 at true scale; None when the real size is unknown
    largest_real    m, largest real displacement (same statistic as stated); None when unknown
    largest_row     node row of the largest displacement
    largest_place   words for that place ("camera lens", "node 1204")
    largest_word    direction words ("down")
    drawn_percent   drawn peak in % of the body's diagonal
    limited_by      "peak" (8 % of the diagonal), "turn" (12° as drawn), "true scale", "given"
    """

    mode: int
    factor: float
    magnification: float | None
    largest_real: float | None
    largest_row: int
    largest_place: str
    largest_word: str
    drawn_percent: float
    limited_by: str
    statistic: str = "peak"
    relative: bool = False
    condition: str = ""

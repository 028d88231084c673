"""The state of the window: everything that decides what is shown. Frozen; changed by the actions beside it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from types import MappingProxyType

from viewer.scene.picture import View

DESIGN_LAYOUTS = ("side", "overlay", "difference")
TEST_LAYOUTS = ("test over", "test beside", "test alone")
LAYOUTS = ("single", *DESIGN_LAYOUTS, *TEST_LAYOUTS)
TEST_PAGES = ("test pairing", "test ladder")
PAGES = ("stage", "pairing", "ladder", "lineage", *TEST_PAGES)
SUBJECTS = ("does", "folds", "size", "matters", "model", "redesign", "change")
Vector = tuple[float, float, float]


@dataclass(frozen=True)
class Band:
    """Which modes the gallery shows.

    low, high  Hz, None: open
    moving     name of a functional point: only modes that move it along its direction; empty: all modes
    """

    low: float | None = None
    high: float | None = None
    moving: str = ""

    @property
    def open(self) -> bool:
        """Whether every mode passes."""
        return self == Band()


@dataclass(frozen=True)
class Picked:
    """A picked place: a node row of the chosen design's mesh, or a point by name."""

    row: int = -1
    name: str = ""


@dataclass(frozen=True)
class State:
    """One frozen state. Modes are numbers from 1.

    design, mode   what is chosen
    other          design it is compared with; empty: the next one of the dossier
    other_mode     its mode; None: the one that ``mode`` became
    test           hammer test beside the design; empty: the first of it
    test_mode      its mode; None: the one that was paired with ``mode``
    layout         one of ``LAYOUTS``; page: one of ``PAGES``
    true_scale     drawn at ×1; else ``enlarge`` times the size that is drawn by itself
    subject        which sentence is lit, one of ``SUBJECTS`` or empty; ``hinge``: number of the hinge set off
    named          the user's names not yet saved, by (design, mode)
    view           where the eye stands; ``fits`` counts the wishes to see everything from there
    playing, phase whether it moves, and where it stands still otherwise (rad)
    """

    design: str = ""
    mode: int = 1
    other: str = ""
    other_mode: int | None = None
    test: str = ""
    test_mode: int | None = None
    layout: str = "single"
    page: str = "stage"
    true_scale: bool = False
    enlarge: float = 1.0
    energy: bool = True
    ghost: bool = True
    hinges: bool = True
    mesh_edges: bool = False
    node_lines: bool = False
    subject: str = ""
    hinge: int = 0
    picked: Picked | None = None
    band: Band = field(default_factory=Band)
    named: Mapping[tuple[str, int], str] = field(default_factory=dict)
    view: View = field(default_factory=View)
    fits: int = 0
    theme: str = "light"
    playing: bool = True
    phase: float = 0.0

    def __post_init__(self) -> None:
        object.__setattr__(self, "named", MappingProxyType(dict(self.named)))

    def with_(self, **changes) -> State:
        """A copy with some fields replaced."""
        return replace(self, **changes)

    @property
    def compared(self) -> bool:
        """Whether two designs are on the stage."""
        return self.layout in DESIGN_LAYOUTS

    @property
    def tested(self) -> bool:
        """Whether a hammer test is on the stage."""
        return self.layout in TEST_LAYOUTS

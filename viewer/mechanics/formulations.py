"""Which element formulations there are for each cell kind. Adding one is one entry in a module's tuple."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Protocol

from viewer.errors import ModelError
from viewer.mechanics.beam import BEAMS
from viewer.mechanics.shell import SHELLS
from viewer.mechanics.shell_pieces import PIECED_SHELLS
from viewer.mechanics.solid import SOLIDS
from viewer.model.arrays import Array
from viewer.model.design import Property


class Formulation(Protocol):
    """What assembly and energies need of an element formulation.

    rotations    True: six freedoms a node (ux uy uz rx ry rz), otherwise three (ux uy uz); nd in all
    scalar_mass  True: ``mass`` gives one (b, n, n) matrix that holds for each of the three displacements
    caution      a sentence when the formulation has a known weakness (poor in bending), else ""
    """

    @property
    def name(self) -> str: ...
    @property
    def kind(self) -> str: ...
    @property
    def rotations(self) -> bool: ...
    @property
    def scalar_mass(self) -> bool: ...
    @property
    def caution(self) -> str: ...

    def stiffness(self, xyz: Array, prop: Property) -> Array:
        """(b, nd, nd) stiffness of cells ``xyz`` (b, n, 3) m."""
        ...

    def mass(self, xyz: Array, prop: Property) -> Array:
        """(b, nd, nd), or (b, n, n) with ``scalar_mass``: consistent mass."""
        ...


def _by_kind(*formulations: Formulation) -> Mapping[str, tuple[Formulation, ...]]:
    kinds = dict.fromkeys(f.kind for f in formulations)
    return MappingProxyType({kind: tuple(f for f in formulations if f.kind == kind) for kind in kinds})


FORMULATIONS: Mapping[str, tuple[Formulation, ...]] = _by_kind(*SOLIDS, *SHELLS, *PIECED_SHELLS, *BEAMS)


def formulation_for(kind: str, name: str = "") -> Formulation:
    """The formulation ``name`` of a cell kind, the default one when empty; ``ModelError`` when there is none."""
    offered = FORMULATIONS.get(kind, ())
    if not offered:
        raise ModelError(
            f"cells of kind '{kind}' have no element formulation",
            expected=f"one of: {', '.join(FORMULATIONS)}",
            do="assign no material to them, or mesh the part with another kind",
        )
    for formulation in offered:
        if name in ("", formulation.name):
            return formulation
    raise ModelError(
        f"unknown formulation of '{kind}' cells",
        found=f"'{name}'",
        expected=f"one of: {', '.join(f.name for f in offered)}",
    )

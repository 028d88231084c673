"""Where the strain energy of given modes sits when nobody has said what the body is made of.

In a body of one isotropic material the share of strain energy in each cell depends on the shape and on Poisson's
ratio, not on Young's modulus, nor on density. So one uniform material is assumed, and what holds for it is kept:
shares. Poisson's ratio 0.3 stands for metals (common practice, no source). Closure, joules and trust would need the
real material and are not formed. Sheets must state a thickness all the same, beams a section: how bending weighs
against membrane or stretching depends on it. Springs and lumped masses are left out, since an assumed modulus and
density cannot be weighed against stated ones.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from viewer.cells import KINDS
from viewer.errors import RefusedError
from viewer.jobs import SILENT, Progress
from viewer.mechanics.energy import Energies, energies
from viewer.model.arrays import Array
from viewer.model.design import Assignment, Design, Material, Physics
from viewer.model.modes import ModeSet

# Light and stiff, so that inertia at any frequency given is small against stiffness where missing rotations of sheets
# are recovered: with a modulus and density out of tune with the frequencies it would only spoil them.
ASSUMED = Material("assumed", 1e12, 0.3, 1e-12)
_WANTED = {1: ("beams", "a section", "stretching"), 2: ("shells", "a thickness", "membrane")}


def states_no_material(design: Design) -> bool:
    """Whether neither materials are assigned nor matrices given; thicknesses and sections may be."""
    physics = design.physics
    return physics.matrices is None and not any(item.material or item.plies for item in physics.assignments)


def assume_material(design: Design) -> Design:
    """The design made of one uniform material, with the thicknesses, sections and formulations it states, and
    without springs, masses, supports, links and ties. Raises ``RefusedError`` for sheets without thickness, beams
    without section and points without cells."""
    stated = tuple(replace(item, material=ASSUMED.name) for item in design.physics.assignments)
    everywhere = Assignment("*", ASSUMED.name)
    assumed = design.with_(physics=Physics({ASSUMED.name: ASSUMED}, (everywhere, *stated)))
    _check_sizes(assumed)
    return assumed


def relative_energies(design: Design, modes: ModeSet, progress: Progress = SILENT) -> Energies:
    """Energies of every mode in a design without materials, as shares: each mode's strain and kinetic energies add up
    to 1, strain to 0 for rigid-body modes; closure and residual are NaN, nothing is trusted, ``relative`` is set.

    Raises ``RefusedError`` as :func:`assume_material`, ``ModelError`` as :func:`viewer.mechanics.energy.energies`.
    """
    found = energies(assume_material(design), modes, progress=progress, judged=False)
    elastic = np.isfinite(found.closure)[:, None]
    nothing = np.full(len(found.indices), np.nan)
    return replace(
        found,
        strain=np.where(elastic, _shares(found.strain), 0.0),
        kinetic=_shares(found.kinetic),
        closure=nothing,
        residual=nothing,
        trusted=np.zeros(len(elastic), bool),
        relative=True,
    )


def _shares(energy: Array) -> Array:
    whole = energy.sum(axis=1, keepdims=True)
    return np.divide(energy, whole, out=np.zeros_like(energy), where=whole > 0)


def _check_sizes(design: Design) -> None:
    """Edges and faces all of whose nodes belong to cells that carry stiffness are only names of places."""
    mesh, (properties, index) = design.mesh, design.properties
    if not any(KINDS[block.kind].dim and len(block) for block in mesh.blocks):
        raise RefusedError(
            f"design '{design.name}' has no cells that could hold energy",
            file=mesh.source or None,
            do="give the mesh of the body with its cells",
        )
    carried = np.zeros(mesh.n_nodes, bool)
    blocks = sorted(zip(mesh.blocks, mesh.block_starts[:-1], strict=True), key=lambda item: -KINDS[item[0].kind].dim)
    for block, start in blocks:
        dim = KINDS[block.kind].dim
        if dim == 0:
            continue
        sized = np.array([dim == 3 or (p.thickness if dim == 2 else p.section) is not None for p in properties])
        has = sized[index[start : start + len(block)]]
        if not (has | carried[block.nodes].all(axis=1)).all():
            kind, wanted, other = _WANTED[dim]
            raise RefusedError(
                f"design '{design.name}' states no materials, and relative energies of {kind} need {wanted}, since "
                f"the ratio of bending to {other} depends on it",
                file=mesh.source or None,
                do=f"assign {wanted}, and materials too for closure, trust and absolute energies",
            )
        carried[block.nodes[has]] = True

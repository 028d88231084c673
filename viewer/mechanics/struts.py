"""Struts: what a link between two footprints adds to stiffness and mass.

With n the unit vector from the first centre to the second and ū₁, ū₂ the mean translations of the footprints' nodes,
the strut's elongation is n · (ū₂ − ū₁) and its energy ½ k elongation²: a matrix of rank one. Forces at both ends lie
in the line between the centres, so that they balance, moments included, and no rigid motion strains the strut.
"""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp

from viewer.errors import ModelError
from viewer.mechanics.constraints import Attachment, footprint
from viewer.model.arrays import Array
from viewer.model.design import Design, Strut


def strut_attachments(strut: Strut, design: Design, dof: Array) -> tuple[Attachment, list[Attachment], str]:
    """Its stiffness, the masses at its ends (none for a strut without mass) and a caution ("" when there is none).

    ``dof`` (n_nodes, 6), −1 where absent. Raises ``ModelError``.
    """
    what = f"strut '{strut.name}'"
    for word, value, good in (
        ("stiffness", strut.stiffness, strut.stiffness > 0),
        ("mass", strut.mass, strut.mass >= 0),
    ):
        if not (np.isfinite(value) and good):
            raise ModelError(f"{what} has no usable {word}", found=f"{value:g}", expected="a positive number")
    first, second = (
        footprint(where, words, design.mesh, dof, "ends on nodes of no cell with a material")
        for where, words in ((strut.where, what), (strut.other, f"{what}, to"))
    )
    points = design.mesh.points
    line = points[second].mean(axis=0) - points[first].mean(axis=0)
    length = float(np.linalg.norm(line))
    if length <= 1e-6 * design.mesh.diagonal:
        raise ModelError(f"{what} has no length: its ends have one centre", do="select two different places")
    line /= length
    row = np.concatenate([np.tile(-line / len(first), len(first)), np.tile(line / len(second), len(second))])
    dofs = dof[np.concatenate([first, second]), :3].ravel()
    spring = Attachment(strut.name, dofs, sp.csr_array(row[None]), sp.diags_array([strut.stiffness]))
    masses = [_half_mass(strut, rows, dof) for rows in (first, second)] if strut.mass else []
    return spring, masses, _bare(strut, (first, second), design, dof)


def _half_mass(strut: Strut, rows: Array, dof: Array) -> Attachment:
    mean = sp.csr_array(np.tile(np.eye(3) / len(rows), len(rows)))
    return Attachment(strut.name, dof[rows, :3].ravel(), mean, sp.diags_array(np.full(3, strut.mass / 2)))


def _bare(strut: Strut, ends: tuple[Array, Array], design: Design, dof: Array) -> str:
    for rows in ends:
        if len(rows) == 1 and dof[rows[0], 3] < 0:
            return (
                f"strut '{strut.name}' ends on the single node {design.mesh.node_ids[rows[0]]} of a solid: how far "
                "the solid gives way there depends on its mesh; select a footprint of several nodes"
            )
    return ""

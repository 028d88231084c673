"""Designs changed in some of their cells, to be solved again: what derivatives are compared with."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from viewer.mechanics.assembly import assemble
from viewer.mechanics.factor import factorise
from viewer.model.design import Assignment, Design, Physics, Ply, Property
from viewer.model.mesh import CellBlock

FIELDS = {"stiffness": "stiffness", "mass": "mass_gain", "thickness": "thickness"}  # change → field of a place


def changed(design: Design, cells, what: str, factor: float) -> Design:
    """The design with the "stiffness" (modulus), "mass" (density) or "thickness" of ``cells`` times ``factor``."""
    mesh, materials = design.mesh, dict(design.physics.materials)
    groups, assignments = dict(mesh.cell_groups), list(design.physics.assignments)
    for name, prop, rows in _by_property(design, np.asarray(cells)):
        groups[name] = rows
        assignment, own = _assigned(name, prop, what, factor)
        assignments.append(assignment)
        materials |= own
    physics = replace(design.physics, materials=materials, assignments=tuple(assignments))
    return design.with_(mesh=mesh.with_(cell_groups=groups), physics=physics)


def alone(design: Design, cells, what: str = "mass", factor: float = 1.0) -> Design:
    """``cells`` alone, changed as above, on the nodes of the whole, without anything attached to them."""
    kept = np.zeros(design.mesh.n_cells, bool)
    kept[cells] = True
    row = np.cumsum(kept) - 1
    blocks = []
    for block, start in zip(design.mesh.blocks, design.mesh.block_starts[:-1], strict=True):
        here = kept[start : start + len(block)]
        blocks.append(CellBlock(block.kind, block.nodes[here], block.ids[here]))
    materials, assignments, groups = {}, [], {}
    for name, prop, rows in _by_property(design, np.asarray(cells)):
        assignment, own = _assigned(name, prop, what, factor)
        assignments.append(assignment)
        materials |= own
        groups[name] = row[rows]
    mesh = design.mesh.with_(blocks=tuple(blocks), cell_groups=groups)
    return design.with_(mesh=mesh, physics=Physics(materials=materials, assignments=tuple(assignments)))


def _by_property(design: Design, cells):
    properties, index = design.properties
    for which in np.unique(index[cells]):
        yield f"changed {which}", properties[which], cells[index[cells] == which]


def _assigned(name: str, prop: Property, what: str, factor: float):
    """An assignment of the changed property to the group ``name``, and the materials it names."""
    thicker = factor if what == "thickness" else 1.0
    materials = {}

    def material(own):
        changes = {"name": f"{name}, {own.name}"}
        if what == "stiffness":
            assert own.directional is None
            changes["youngs_modulus"] = factor * own.youngs_modulus
        if what == "mass":
            changes["density"] = factor * own.density
        made = replace(own, **changes)
        materials[made.name] = made
        return made.name

    common = {
        field: getattr(prop, field)
        for field in ("formulation", "section", "orientation", "offset", "offset_across", "direction")
    }
    if prop.layers:
        plies = tuple(Ply(material(ply.material), thicker * ply.thickness, ply.angle) for ply in prop.layers)
        return Assignment(name, plies=plies, **common), materials
    thickness = None if prop.thickness is None else thicker * prop.thickness
    return Assignment(name, material(prop.material), thickness, **common), materials


class Resolver:
    """The lowest modes of a design near one that is solved, by Rayleigh and Ritz over its modes and corrections of
    their residuals through its factorisation, until the residual share bounds the relative error of λ.

    Only the change of the cells that changed is assembled: K' = K + ΔK.
    """

    BOUND = 1e-7  # rᵀK⁻¹r/λ: bounds the relative error of λ (a Rayleigh quotient), 5e-6 of a derivative by ±1 %

    def __init__(self, design: Design, modes, count: int) -> None:
        self.design, self.count, self.system = design, count, assemble(design)
        assert self.system.follow is None
        self.K, self.M = self.system.restrict(self.system.K), self.system.restrict(self.system.M)
        self.factor = factorise(self.K, definite=True)
        self.vectors = self.system.gather(modes.shapes.moved, modes.shapes.turned)[:, self.system.free].T

    def delta(self, cells, what: str, factor: float):
        """ΔK and ΔM on the free degrees of freedom."""
        before, after = assemble(alone(self.design, cells)), assemble(alone(self.design, cells, what, factor))
        there = before.dof >= 0
        place = np.empty(before.n_dof, np.int64)
        place[before.dof[there]] = self.system.dof[there]
        out = []
        for one, two in ((before.K, after.K), (before.M, after.M)):
            coordinates = (two - one).tocoo()
            whole = type(coordinates)(
                (coordinates.data, (place[coordinates.row], place[coordinates.col])), shape=self.system.K.shape
            )
            out.append(self.system.restrict(whole.tocsr()))
        return out

    def lowest(self, stiffer, heavier):
        """λ (count,) and vectors of K + ``stiffer``, M + ``heavier``; ``AssertionError`` unless they converge."""
        stiffness, mass, vectors = self.K + stiffer, self.M + heavier, self.vectors
        for _ in range(8):
            basis = vectors / np.linalg.norm(vectors, axis=0)
            gram, axes = np.linalg.eigh(basis.T @ (mass @ basis))
            basis = basis @ (axes[:, gram > 1e-13 * gram[-1]] / np.sqrt(gram[gram > 1e-13 * gram[-1]]))
            values, turn = np.linalg.eigh(basis.T @ (stiffness @ basis))
            kept = basis @ turn[:, : self.vectors.shape[1]]
            values, found = values[: self.count], kept[:, : self.count]
            residual = stiffness @ found - (mass @ found) * values
            corrected = self.factor.solve(residual).reshape(residual.shape)
            if (np.abs(np.sum(residual * corrected, axis=0)) <= self.BOUND * values).all():
                return values, found
            vectors = np.hstack([kept, corrected])
        raise AssertionError("the changed design did not converge")

    def tracked(self, values, found):
        """``values`` in the order of the modes of the design as it was: each by its largest MAC in the mass."""
        cross = (self.vectors[:, : self.count].T @ (self.M @ found)) ** 2
        order = np.argmax(cross / np.einsum("nm,nm->m", found, self.M @ found), axis=1)
        assert len(set(order)) == self.count
        return values[order]

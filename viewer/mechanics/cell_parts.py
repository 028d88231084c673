"""The cells of a design that carry stiffness, with formulation and property, and what is to be said about them."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from viewer.cells import inverted
from viewer.cells.kinds import KINDS
from viewer.errors import ModelError
from viewer.mechanics.constraints import some_ids
from viewer.mechanics.formulations import FORMULATIONS, Formulation, formulation_for
from viewer.mechanics.materials import check
from viewer.model.arrays import Array
from viewer.model.design import Design, Property
from viewer.model.mesh import Mesh

_WARP = 0.1  # height of a corner over the plane of the other three, in roots of twice the cell's area

Part = tuple[Formulation, Property, Array, Array]


def element_parts(design: Design, instead: Mapping[str, str]) -> tuple[list[Part], list[str]]:
    """(formulation, property, cell rows, node rows) of every group that carries stiffness, and cautions.

    Cells without material, thickness, section or formulation are left out, with a caution, when every one of their
    nodes belongs to a cell that has them: meshes bring such edges and faces along as names. Otherwise they are an
    error.
    """
    mesh = design.mesh
    properties, index = design.properties
    parts: list[Part] = []
    idle: list[tuple[str, Property | None, Array, Array]] = []
    for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
        chosen = index[start : start + len(block)]
        for which in np.unique(chosen):
            rows = np.nonzero(chosen == which)[0]
            cells, nodes = start + rows, block.nodes[rows]
            prop = properties[which] if which >= 0 else None
            if prop is None or block.kind not in FORMULATIONS or _lacks(prop, block.kind):
                idle.append((block.kind, prop, cells, nodes))
                continue
            _check_property(prop, block.kind, mesh, cells)
            formulation = formulation_for(block.kind, instead.get(block.kind, prop.formulation))
            parts.append((formulation, prop, cells, nodes))
    carried = np.zeros(mesh.n_nodes, bool)
    for _, _, _, nodes in parts:
        carried[nodes] = True
    cautions = [f"{f.kind}: {f.caution}" for f, _, _, _ in parts if f.caution]
    for kind, prop, cells, nodes in idle:
        if KINDS[kind].dim == 0:
            continue
        loose = ~carried[nodes].all(axis=1)
        if loose.any() or KINDS[kind].dim == 3:
            raise _idle_error(design, kind, prop, cells if not loose.any() else cells[loose])
        cautions.append(f"{name_cells(mesh, kind, cells)} carry no stiffness: they are taken as names of places")
    return parts, cautions


def name_cells(mesh: Mesh, kind: str, cells: Array) -> str:
    """ "12 cells tri3 (ids 4, 5 … in group 'web')" for messages."""
    groups = [name for name, rows in mesh.cell_groups.items() if np.isin(cells, rows).any()]
    inside = f" in group {', '.join(repr(name) for name in groups[:3])}" if groups else ""
    return f"{len(cells)} cells {kind} (ids {some_ids(mesh.cell_ids[cells])}{inside})"


def _lacks(prop: Property, kind: str) -> str:
    """What a property must give for cells of this kind and does not."""
    wanted, given = {1: ("section", prop.section), 2: ("thickness", prop.thickness)}.get(KINDS[kind].dim, ("", 0))
    return wanted if given is None else ""


def _idle_error(design: Design, kind: str, prop: Property | None, cells: Array) -> ModelError:
    mesh = design.mesh
    what = f"design '{design.name}': {name_cells(mesh, kind, cells)}"
    parts: dict[str, Any] = {"file": mesh.source or None}
    if kind not in FORMULATIONS:
        return ModelError(
            f"{what} have no element formulation",
            expected=f"kinds: {', '.join(sorted(FORMULATIONS))}",
            do="mesh this region with one of these kinds, or leave the cells out of the mesh",
            **parts,
        )
    if prop is None:
        return ModelError(
            f"{what} have no material",
            do="add an assignment whose target is their group, their kind or '*'",
            **parts,
        )
    word, lacking = {1: "beams", 2: "shells"}[KINDS[kind].dim], _lacks(prop, kind)
    return ModelError(f"{what} are {word} without {lacking}", do=f"give '{lacking}' in their assignment", **parts)


def _check_property(prop: Property, kind: str, mesh: Mesh, cells: Array) -> None:
    try:
        check(prop.material)
    except ModelError as error:
        raise error.at(file=mesh.source or None, place=name_cells(mesh, kind, cells)) from None
    if KINDS[kind].dim == 2 and not 0.0 < (prop.thickness or 0.0) < np.inf:
        raise ModelError(
            f"{name_cells(mesh, kind, cells)} have an impossible thickness",
            found=str(prop.thickness),
            expected="above 0 m",
            do="give 'thickness' in their assignment",
        )


def check_shapes(parts: list[Part], mesh: Mesh) -> None:
    """``ModelError`` for cells that are inside out, folded or flat."""
    for formulation, _, cells, nodes in parts:
        bad = inverted(formulation.kind, mesh.points[nodes])
        if len(bad):
            raise ModelError(
                f"{name_cells(mesh, formulation.kind, cells[bad])} have a Jacobian that is zero or negative",
                file=mesh.source or None,
                expected="cells that are not inside out, folded or flat",
                do="repair the mesh there; if every cell is listed, its node order is that of another convention",
            )


def cautions_of(parts: list[Part], mesh: Mesh, turning: Array) -> list[str]:
    """What is doubtful about the cells together; ``turning`` (n_nodes,): nodes of cells with rotations."""
    return _mixed(parts, turning) + _sides(parts) + _warp(parts, mesh)


def _mixed(parts: list[Part], turning: Array) -> list[str]:
    solid = np.zeros(len(turning), bool)
    for formulation, _, _, nodes in parts:
        if not formulation.rotations:
            solid[nodes] = True
    shared = int((solid & turning).sum())
    if not shared:
        return []
    return [
        f"shells meet solids at {shared} nodes: solids have no rotations, so that the joint can turn like a hinge "
        "unless the shell lies on the solid's face"
    ]


def _sides(parts: list[Part]) -> list[str]:
    """Sheets that lie off their nodes, or whose layers differ from side to side, must agree on which side is up."""
    edges = []
    for formulation, prop, _, nodes in parts:
        kind = KINDS[formulation.kind]
        if kind.dim == 2 and (prop.offset or prop.layers != prop.layers[::-1]):
            edges += [nodes[:, [a, b]] for a, b, *_ in kind.edges]
    if not edges:
        return []
    _, count = np.unique(np.concatenate(edges), axis=0, return_counts=True)
    if not (count > 1).any():  # neighbours on the same side run through their common edge in opposite directions
        return []
    return [
        f"shells with an offset or with unlike layers disagree at {int((count > 1).sum())} common edges: their "
        "normals point to opposite sides (or more than two cells meet there); number the nodes of all cells the same "
        "way round"
    ]


def _warp(parts: list[Part], mesh: Mesh) -> list[str]:
    """Four-node shells far from flat are computed in their mean plane."""
    warped, total = 0, 0
    for formulation, _, _, nodes in parts:
        if formulation.kind == "quad4":
            corners = mesh.points[nodes]
            one, two = corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1]
            normal = np.cross(one, two)
            lift = np.abs(np.sum((corners[:, 1] - corners[:, 0]) * normal, axis=1))
            size = np.linalg.norm(normal, axis=1)
            warped += int((lift > _WARP * size**1.5).sum())
            total += len(nodes)
    if not warped:
        return []
    return [
        f"{warped} of {total} quad4 cells are warped by more than {_WARP:.0%} of their size and computed in their "
        "mean plane: split them into triangles, or mesh finer there"
    ]

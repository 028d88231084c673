"""Rows X01 and X03: the hexbeam mesh that pyvista carries (MIT licence), solved by our elements.

The frequencies of the rows were computed by another library (scikit-fem) on the same mesh. The rows do not state
the material; it is the structural steel of row A04 (with the rows' other steel, 200 GPa and 8000 kg/m³, every value
comes out lower by the same factor √(210/7850 · 8000/200) = 1.0344).
"""

from __future__ import annotations

import numpy as np
import pytest
import pyvista
from pyvista import examples

from tests.checks.reference import row
from viewer.cells import KINDS, by_vtk, measures
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import best_formulation, energies
from viewer.model.design import Assignment, Design, Material, Physics
from viewer.model.mesh import CellBlock, Mesh
from viewer.model.modes import ArrayShapes, ModeSet

_GPA, _, _POISSON, _DENSITY = (float(item.split()[0]) for item in row("A04").text.split(";"))
STEEL = Material("structural steel", _GPA * 1e9, _POISSON, _DENSITY)


def hexbeam() -> Mesh:
    grid = pyvista.read(examples.hexbeamfile)
    (cell_type,) = set(grid.celltypes.tolist())
    kind = by_vtk(cell_type)
    assert kind is not None
    nodes = grid.cells.reshape(-1, kind.n_nodes + 1)[:, 1:]
    return Mesh(
        np.array(grid.points, float),
        (CellBlock(kind.name, nodes, np.arange(1, len(nodes) + 1)),),
        np.arange(1, grid.n_points + 1),
        source="hexbeam.vtk",
    )


def quadratic(mesh: Mesh) -> Mesh:
    """The same cells with 27 nodes, new ones at the middle of edges, faces and cells."""
    linear, full = KINDS["hex8"], KINDS["hex27"]
    weights = linear.shape(full.reference)  # (27, 8)
    (block,) = mesh.blocks
    placed = np.einsum("ab,ebi->eai", weights, mesh.points[block.nodes]).reshape(-1, 3)
    points, inverse = np.unique(np.round(placed, 9), axis=0, return_inverse=True)
    return Mesh(points, (CellBlock("hex27", inverse.reshape(-1, 27), block.ids),), np.arange(1, len(points) + 1))


def design(mesh: Mesh, formulation: str = "") -> Design:
    return Design("hexbeam", mesh, Physics({STEEL.name: STEEL}, (Assignment("*", STEEL.name, None, formulation),)))


def test_mesh_x01():
    mesh = hexbeam()
    assert row("X01").quantity.startswith("hexbeam: 99 nodes, 40 hexahedra")
    assert (mesh.n_nodes, mesh.n_cells, mesh.blocks[0].kind) == (99, 40, "hex8")
    volume = measures("hex8", mesh.points[mesh.blocks[0].nodes]).sum()
    assert volume == pytest.approx(row("X01").values[0], rel=row("X01").tolerances[0])
    assert row("X01").text.endswith("[0,1]x[0,1]x[0,5]")
    np.testing.assert_allclose([mesh.points.min(axis=0), mesh.points.max(axis=0)], [[0, 0, 0], [1, 1, 5]], atol=1e-9)


@pytest.mark.parametrize(("part", "formulation"), [(0, "hex27-full"), (1, "hex8-full")])
def test_frequencies_x03(part, formulation):
    mesh = hexbeam() if formulation.startswith("hex8") else quadratic(hexbeam())
    found = solve(design(mesh, formulation), 11).freq_hz
    assert row("X03").inputs == "6 RBM, then"
    assert (found[:6] == 0).all()
    np.testing.assert_allclose(found[6:], row("X03").parts[part], rtol=row("X03").tolerances[0])


def test_incompatible_modes_better_the_bending_of_this_coarse_mesh():
    """Two cells across: the default 8-node formulation halves the error of the trilinear one against the row's
    quadratic values in bending; in torsion (the third) incompatible modes have nothing to add."""
    found = solve(design(hexbeam()), 11).freq_hz[6:]
    best, trilinear = (np.array(part) for part in row("X03").parts)
    bending = [0, 1, 3, 4]
    assert (np.abs(found / best - 1)[bending] < 0.6 * (trilinear / best - 1)[bending]).all()
    np.testing.assert_allclose(found[2], trilinear[2], rtol=1e-3)


def test_imported_quadratic_modes_are_closed_best_by_the_incompatible_element():
    mesh, fine = hexbeam(), quadratic(hexbeam())
    modes = solve(design(fine), 11)
    rows = np.array([int(np.argmin(np.linalg.norm(fine.points - point, axis=1))) for point in mesh.points])
    imported = ModeSet(mesh.node_ids, modes.freq_hz, ArrayShapes(modes.shapes.moved[:, rows]))
    best = best_formulation(design(mesh), imported)
    assert best.names == {"hex8": "hex8-incompatible"}
    found = energies(design(mesh), imported, formulations=best.names)
    assert found.trusted[6:8].all()
    assert not found.trusted[8]  # torsion is 8 % too stiff on two cells across, and said to be

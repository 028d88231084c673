"""The same mesh and material solved by an independent library (scikit-fem, BSD licence): matrices and modes.

Shares nothing with the package but the mesh: scikit-fem's own elements, quadrature, assembly and SciPy's own
eigen-solver.
"""

from __future__ import annotations

import numpy as np
import scipy.sparse.linalg as spla
import skfem
from skfem.models.elasticity import lame_parameters, linear_elasticity

from viewer.cells import KINDS
from viewer.model.modes import ArrayShapes, ModeSet

_MESHES = {"hex8": skfem.MeshHex1, "tet4": skfem.MeshTet1}
_ELEMENTS = {
    ("hex8", 1): skfem.ElementHex1,
    ("hex8", 2): skfem.ElementHex2,
    ("tet4", 1): skfem.ElementTetP1,
    ("tet4", 2): skfem.ElementTetP2,
}


def basis(mesh, degree=1):
    """Vector basis of the given degree on a mesh of one block of hex8 or tet4."""
    (block,) = mesh.blocks
    kind = _MESHES[block.kind]
    ours = KINDS[block.kind].reference
    ours = (ours + 1) / 2 if block.kind == "hex8" else ours
    theirs = kind.elem.refdom.p.T
    order = [int(np.argmin(np.linalg.norm(ours - corner, axis=1))) for corner in theirs]
    model = kind(mesh.points.T.copy(), block.nodes[:, order].T.copy())
    element = skfem.ElementVector(_ELEMENTS[block.kind, degree]())
    return skfem.Basis(model, element, intorder=2 * degree)


def matrices(space, material):
    """K and M (CSR) of a homogeneous material."""
    stiffness = linear_elasticity(*lame_parameters(material.youngs_modulus, material.poisson)).assemble(space)

    @skfem.BilinearForm
    def mass(u, v, _):
        return material.density * sum(u[i] * v[i] for i in range(3))

    return stiffness.tocsr(), mass.assemble(space).tocsr()


def modes(mesh, material, count, degree=1, held=None):
    """Mode set on the mesh's nodes; ``held``: name of a node group that is clamped, None for a free body."""
    space = basis(mesh, degree)
    stiffness, mass = matrices(space, material)
    fixed = np.empty(0, int)
    if held is not None:
        rows = mesh.node_groups[held]
        lower, upper = mesh.points[rows].min(axis=0) - 1e-9, mesh.points[rows].max(axis=0) + 1e-9
        inside = ((lower <= space.doflocs.T) & (upper >= space.doflocs.T)).all(axis=1)
        fixed = np.nonzero(inside)[0]
    free = np.setdiff1d(np.arange(stiffness.shape[0]), fixed)
    k, m = stiffness[free][:, free].tocsc(), mass[free][:, free].tocsc()
    start = np.random.default_rng(1).standard_normal(len(free))
    scale = k.diagonal().sum() / m.diagonal().sum()
    values, vectors = spla.eigsh(k, count, m, sigma=-1e-6 * scale, v0=start)
    full = np.zeros((count, stiffness.shape[0]))
    full[:, free] = vectors.T
    shapes = full[:, space.nodal_dofs[:3].T]  # (count, nodes, 3): the corner nodes
    frequencies = np.sqrt(np.maximum(values, 0)) / (2 * np.pi)
    return ModeSet(mesh.node_ids, frequencies, ArrayShapes(shapes), origin="imported", source="scikit-fem")

"""Cell kinds: shape functions, quadrature, measures, orientation, skin. Pure NumPy, nodes in VTK order."""

from viewer.cells.kinds import KINDS, CellKind, by_meshio, by_vtk
from viewer.cells.measures import (
    cofactors,
    determinants,
    inverted,
    jacobian_components,
    jacobians,
    measures,
    repair_orientation,
)
from viewer.cells.skin import Skin, skin

__all__ = [
    "KINDS", "CellKind", "Skin", "by_meshio", "by_vtk", "cofactors", "determinants", "inverted",
    "jacobian_components", "jacobians", "measures", "repair_orientation", "skin",
]

"""Cell kinds: shape functions, quadrature, measures, orientation, skin. Pure NumPy, nodes in VTK order."""

from viewer.cells.kinds import KINDS, CellKind, by_meshio, by_vtk
from viewer.cells.locate import Places, interpolation, nearest
from viewer.cells.measures import (
    cofactors,
    determinants,
    inverted,
    jacobian_components,
    jacobians,
    measures,
    repair_orientation,
)
from viewer.cells.skin import Skin, outer_faces, skin

__all__ = [
    "KINDS",
    "CellKind",
    "Places",
    "Skin",
    "by_meshio",
    "by_vtk",
    "cofactors",
    "determinants",
    "interpolation",
    "inverted",
    "jacobian_components",
    "jacobians",
    "measures",
    "nearest",
    "outer_faces",
    "repair_orientation",
    "skin",
]

"""The cell kinds and their shape functions.

A kind is built from the topology of its *family* (corners, edges, outward faces), the means that make its
higher nodes, and the monomials its shape functions span; the functions themselves follow by inverting the
Vandermonde matrix at the reference nodes, so that no formula is typed twice. Pyramids add the rational terms
of Bedrosian (1992, "Shape functions and integration formulas for three-dimensional finite element analysis",
Int. J. Numer. Meth. Engng 35:95–108): monomials divided by (1 − z).

Reference cells: line, quad and hex on [−1, 1]; triangles and tetrahedra on the unit simplex; wedges triangle ×
[−1, 1]; pyramids over the base [−1, 1]² at z = 0 with the apex at z = 1.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Any

import numpy as np
from numpy.typing import NDArray

from viewer.cells import quadrature

Array = NDArray[Any]
Nodes = tuple[int, ...]


@dataclass(frozen=True, eq=False)
class CellKind:
    """One kind of cell.

    reference  (n, dim) reference coordinates of the nodes, VTK order
    faces      of solids: (face kind, local nodes), normals outward when the Jacobian is positive
    edges      (corner, corner) or (corner, corner, mid-side) local nodes
    triangles  of surface kinds: the cell cut into triangles that use every node
    mirror     (n,) permutation of the nodes that turns the cell inside out
    powers     (n, dim) exponents of the monomials spanned; apex_power (n,): divided by (1 − z) to this power
    coefficients  (n, n) of the shape functions (columns) in those monomials (rows)
    """

    name: str
    family: str
    dim: int
    degree: int
    n_nodes: int
    n_corners: int
    reference: Array
    faces: tuple[tuple[str, Nodes], ...]
    edges: tuple[Nodes, ...]
    triangles: tuple[Nodes, ...]
    mirror: Array
    vtk_type: int
    meshio_name: str
    powers: Array
    apex_power: Array
    coefficients: Array

    def shape(self, xi: Array) -> Array:
        """(q, n) shape functions at the reference points ``xi`` (q, dim)."""
        return _monomials(self.powers, self.apex_power, np.asarray(xi, float)) @ self.coefficients

    def gradient(self, xi: Array) -> Array:
        """(q, n, dim) derivatives by the reference coordinates at ``xi`` (q, dim).

        At the apex of a pyramid the rational terms take their limit along the axis.
        """
        xi = np.asarray(xi, float)
        out = np.empty((len(xi), self.n_nodes, self.dim))
        for axis in range(self.dim):
            lower = self.powers.copy()
            lower[:, axis] = np.maximum(lower[:, axis] - 1, 0)
            terms = self.powers[:, axis] * _monomials(lower, self.apex_power, xi)
            if axis == 2 and self.apex_power.any():
                terms = terms + self.apex_power * _monomials(
                    self.powers, np.where(self.apex_power > 0, self.apex_power + 1, 0), xi
                )
            out[:, :, axis] = terms @ self.coefficients
        return out

    def rule(self, order: int) -> tuple[Array, Array]:
        """Quadrature points (q, dim) and weights (q,), exact for polynomials of degree ``order``.

        The degree counts per direction on lines, quads, hexahedra and along wedges, in total on simplices.
        """
        return quadrature.rule(self.family, order)


def _monomials(powers: Array, apex_power: Array, xi: Array) -> Array:
    """(q, m) values of the monomials; terms over (1 − z) vanish at the apex."""
    values = np.ones((len(xi), len(powers)))
    for axis in range(powers.shape[1]):
        values *= xi[:, axis, None] ** powers[:, axis]
    if apex_power.any():
        height = 1.0 - xi[:, 2, None]
        at_apex = np.abs(height) < 1e-14
        factor = np.where(at_apex, 1.0, height) ** -apex_power.astype(float)
        values *= np.where(at_apex & (apex_power > 0), 0.0, factor)
    return values


@dataclass(frozen=True)
class _Family:
    corners: tuple[tuple[float, ...], ...]
    edges: tuple[Nodes, ...] = ()
    faces: tuple[Nodes, ...] = ()


_RING4 = ((0, 1), (1, 2), (2, 3), (3, 0))
_SQUARE = ((-1.0, -1.0), (1.0, -1.0), (1.0, 1.0), (-1.0, 1.0))
_TRIANGLE = ((0.0, 0.0), (1.0, 0.0), (0.0, 1.0))

_FAMILIES = {
    "vertex": _Family(((),)),
    "line": _Family(((-1.0,), (1.0,)), ((0, 1),)),
    "tri": _Family(_TRIANGLE, ((0, 1), (1, 2), (2, 0))),
    "quad": _Family(_SQUARE, _RING4),
    "tet": _Family(
        ((0.0, 0.0, 0.0), (1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0)),
        ((0, 1), (1, 2), (2, 0), (0, 3), (1, 3), (2, 3)),
        ((0, 2, 1), (0, 1, 3), (1, 2, 3), (0, 3, 2)),
    ),
    "pyramid": _Family(
        (*((x, y, 0.0) for x, y in _SQUARE), (0.0, 0.0, 1.0)),
        (*_RING4, (0, 4), (1, 4), (2, 4), (3, 4)),
        ((0, 3, 2, 1), (0, 1, 4), (1, 2, 4), (2, 3, 4), (3, 0, 4)),
    ),
    "wedge": _Family(
        tuple((x, y, z) for z in (-1.0, 1.0) for x, y in _TRIANGLE),
        ((0, 1), (1, 2), (2, 0), (3, 4), (4, 5), (5, 3), (0, 3), (1, 4), (2, 5)),
        ((0, 2, 1), (3, 4, 5), (0, 1, 4, 3), (1, 2, 5, 4), (2, 0, 3, 5)),
    ),
    "hex": _Family(
        tuple((x, y, z) for z in (-1.0, 1.0) for x, y in _SQUARE),
        (*_RING4, (4, 5), (5, 6), (6, 7), (7, 4), (0, 4), (1, 5), (2, 6), (3, 7)),
        ((0, 3, 2, 1), (4, 5, 6, 7), (0, 1, 5, 4), (1, 2, 6, 5), (2, 3, 7, 6), (3, 0, 4, 7)),
    ),
}

# Centre nodes of the 27-node hexahedron in VTK order: −x +x −y +y −z +z, then the body.
_HEX27_CENTRES = ((0, 3, 4, 7), (1, 2, 5, 6), (0, 1, 4, 5), (2, 3, 6, 7), (0, 1, 2, 3), (4, 5, 6, 7), tuple(range(8)))
_FACE_KINDS = {(3, 3): "tri3", (3, 6): "tri6", (4, 4): "quad4", (4, 8): "quad8", (4, 9): "quad9"}
_TRIANGLES: dict[str, tuple[Nodes, ...]] = {
    "tri3": ((0, 1, 2),),
    "tri6": ((0, 3, 5), (3, 1, 4), (5, 4, 2), (3, 4, 5)),
    "quad4": ((0, 1, 2), (0, 2, 3)),
    "quad8": ((0, 4, 7), (1, 5, 4), (2, 6, 5), (3, 7, 6), (4, 5, 6), (4, 6, 7)),
    "quad9": tuple((a, b, 8) for a, b in itertools.pairwise((0, 4, 1, 5, 2, 6, 3, 7, 0))),
}

Powers = Iterable[tuple[int, ...]]


def _total(dim: int, degree: int) -> Powers:
    return (p for p in itertools.product(range(degree + 1), repeat=dim) if sum(p) <= degree)


def _tensor(dim: int, degree: int) -> Powers:
    return itertools.product(range(degree + 1), repeat=dim)


def _serendipity(dim: int) -> Powers:
    return (p for p in _tensor(dim, 2) if p.count(2) <= 1)


def _wedge(degree: int) -> Powers:
    """Polynomials of the triangle times those of the height, without the products where both are quadratic."""
    for a, b in _total(2, degree):
        for c in range(degree + 1):
            if a + b < degree or c < degree or degree == 1:
                yield a, b, c


def _kind(
    name: str,
    vtk_type: int,
    meshio_name: str,
    powers: Powers,
    *,
    centres: tuple[Nodes, ...] = (),
    rational: tuple[Nodes, ...] = (),
) -> CellKind:
    family_name = name.rstrip("0123456789")
    family = _FAMILIES[family_name]
    corners = np.array(family.corners, float).reshape(len(family.corners), -1)
    n_nodes, dim, n_corners = int(name[len(family_name) :]), corners.shape[1], len(corners)
    means: tuple[Nodes, ...] = tuple((i,) for i in range(n_corners))
    quadratic = n_nodes > n_corners
    if quadratic:
        means += family.edges + centres
    reference = np.array([corners[list(m)].mean(axis=0) for m in means])
    exponents = np.array([*powers, *rational], np.int64).reshape(n_nodes, dim)
    apex = np.zeros(n_nodes, np.int64)
    apex[n_nodes - len(rational) :] = 1
    coefficients = np.linalg.inv(_monomials(exponents, apex, reference))
    swapped = reference[:, [1, 0, *range(2, dim)]] if dim > 1 else -reference
    mirror = np.linalg.norm(swapped[:, None] - reference, axis=2).argmin(axis=1)
    node_of = {frozenset(m): i for i, m in enumerate(means)}

    def face(ring: Nodes) -> tuple[str, Nodes]:
        sides = [frozenset(pair) for pair in itertools.pairwise((*ring, ring[0]))]
        more = [node_of[s] for s in (*sides, frozenset(ring)) if s in node_of]
        return _FACE_KINDS[len(ring), len(ring) + len(more)], (*ring, *more)

    for array in (reference, exponents, apex, mirror, coefficients):
        array.flags.writeable = False
    return CellKind(
        name=name,
        family=family_name,
        dim=dim,
        degree=2 if quadratic else min(dim, 1),
        n_nodes=n_nodes,
        n_corners=n_corners,
        reference=reference,
        faces=tuple(face(ring) for ring in family.faces),
        edges=tuple((*e, node_of[frozenset(e)]) if quadratic else e for e in family.edges),
        triangles=_TRIANGLES.get(name, ()),
        mirror=mirror,
        vtk_type=vtk_type,
        meshio_name=meshio_name,
        powers=exponents,
        apex_power=apex,
        coefficients=coefficients,
    )


KINDS: Mapping[str, CellKind] = MappingProxyType(
    {
        kind.name: kind
        for kind in (
            _kind("vertex1", 1, "vertex", [()]),
            _kind("line2", 3, "line", _total(1, 1)),
            _kind("line3", 21, "line3", _total(1, 2)),
            _kind("tri3", 5, "triangle", _total(2, 1)),
            _kind("tri6", 22, "triangle6", _total(2, 2)),
            _kind("quad4", 9, "quad", _tensor(2, 1)),
            _kind("quad8", 23, "quad8", _serendipity(2)),
            _kind("quad9", 28, "quad9", _tensor(2, 2), centres=((0, 1, 2, 3),)),
            _kind("tet4", 10, "tetra", _total(3, 1)),
            _kind("tet10", 24, "tetra10", _total(3, 2)),
            _kind("pyramid5", 14, "pyramid", _total(3, 1), rational=((1, 1, 0),)),
            _kind("pyramid13", 27, "pyramid13", _total(3, 2), rational=((1, 1, 0), (2, 1, 0), (1, 2, 0))),
            _kind("wedge6", 13, "wedge", _wedge(1)),
            _kind("wedge15", 26, "wedge15", _wedge(2)),
            _kind("hex8", 12, "hexahedron", _tensor(3, 1)),
            _kind("hex20", 25, "hexahedron20", _serendipity(3)),
            _kind("hex27", 29, "hexahedron27", _tensor(3, 2), centres=_HEX27_CENTRES),
        )
    }
)
_BY_VTK = {kind.vtk_type: kind for kind in KINDS.values()}
_BY_MESHIO = {kind.meshio_name: kind for kind in KINDS.values()}


def by_vtk(vtk_type: int) -> CellKind | None:
    """The kind of a VTK cell type number; None when there is none."""
    return _BY_VTK.get(int(vtk_type))


def by_meshio(name: str) -> CellKind | None:
    """The kind of a meshio cell type name; None when there is none."""
    return _BY_MESHIO.get(name)

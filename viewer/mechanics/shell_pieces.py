"""Shells of six, eight and nine nodes as flat pieces of three and four nodes that share the mid-side nodes.

The triangle is cut into four triangles, the quadrilateral into four quadrilaterals about its centre. The eight-node
kind has no node there: the centre is condensed, it takes the place of least strain energy for given nodes (Guyan
R.J., Reduction of stiffness and mass matrices, AIAA J. 3 (1965) 380), in the mass as well. What the pieces hold is
held here: rigid motions, patches, no locking, curved sheets by facets half as large as the cells. Frequencies
converge with the second order of the pieces, not with the third or fourth that a quadratic element could reach.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from viewer.cells import KINDS
from viewer.mechanics.shell import SHELLS, ShellFormulation
from viewer.model.arrays import Array
from viewer.model.design import Property

_SIX = np.array([(0, 3, 5), (3, 1, 4), (5, 4, 2), (3, 4, 5)])
_NINE = np.array([(0, 4, 8, 7), (4, 1, 5, 8), (8, 5, 2, 6), (7, 8, 6, 3)])


@dataclass(frozen=True)
class PiecedShell:
    """``piece`` computes the pieces of one cell."""

    name: str
    kind: str
    piece: ShellFormulation
    caution: str = ""
    rotations: bool = True
    scalar_mass: bool = False

    def parts(self, xyz: Array, prop: Property) -> dict[str, Array]:
        """As :meth:`ShellFormulation.parts`."""
        pieces = [self.piece.parts(corners, prop) for corners in self._corners(xyz)]
        whole = {name: self._sum([piece[name] for piece in pieces]) for name in pieces[0]}
        carry = self._carry(np.sum(list(whole.values()), axis=0))
        return {name: _carried(matrix, carry) for name, matrix in whole.items()}

    def stiffness(self, xyz: Array, prop: Property) -> Array:
        """(b, nd, nd) stiffness of cells ``xyz`` (b, n, 3) m, N/m with rotations in rad."""
        whole = self._sum([self.piece.stiffness(corners, prop) for corners in self._corners(xyz)])
        return _carried(whole, self._carry(whole))

    def mass(self, xyz: Array, prop: Property) -> Array:
        """(b, nd, nd) consistent mass of the pieces of cells ``xyz`` (b, n, 3) m, kg and kg·m²."""
        corners = self._corners(xyz)
        whole = self._sum([self.piece.mass(piece, prop) for piece in corners])
        if self.kind != "quad8":
            return whole
        stiffness = self._sum([self.piece.stiffness(piece, prop) for piece in corners])
        return _carried(whole, self._carry(stiffness))

    @property
    def _cuts(self) -> Array:
        return _SIX if self.kind == "tri6" else _NINE

    def _corners(self, xyz: Array) -> list[Array]:
        xyz = np.asarray(xyz, float)
        if self.kind == "quad8":
            centre = np.einsum("n,bni->bi", KINDS["quad8"].shape(np.zeros((1, 2)))[0], xyz)
            xyz = np.concatenate([xyz, centre[:, None]], axis=1)
        return [xyz[:, cut] for cut in self._cuts]

    def _sum(self, matrices: list[Array]) -> Array:
        """(b, nd, nd) of all nodes, a centre included, from the matrices of the pieces."""
        cuts, batch = self._cuts, len(matrices[0])
        n, m = int(cuts.max()) + 1, cuts.shape[1]
        whole = np.zeros((n, n, batch, 6, 6))
        for cut, matrix in zip(cuts, matrices, strict=True):
            whole[np.ix_(cut, cut)] += matrix.reshape(batch, m, 6, m, 6).transpose(1, 3, 0, 2, 4)
        return whole.transpose(2, 0, 3, 1, 4).reshape(batch, 6 * n, 6 * n)

    def _carry(self, stiffness: Array) -> Array | None:
        """(b, 54, 48) all freedoms from those of the eight nodes, None where there is nothing to condense."""
        if self.kind != "quad8":
            return None
        follow = -np.linalg.solve(stiffness[:, 48:, 48:], stiffness[:, 48:, :48])
        return np.concatenate([np.broadcast_to(np.eye(48), (len(stiffness), 48, 48)), follow], axis=1)


def _carried(matrix: Array, carry: Array | None) -> Array:
    if carry is None:
        return matrix
    reduced = np.swapaxes(carry, 1, 2) @ matrix @ carry
    return 0.5 * (reduced + np.swapaxes(reduced, 1, 2))


PIECED_SHELLS: tuple[PiecedShell, ...] = tuple(
    PiecedShell(f"{kind}-{piece.name.split('-', 1)[1]}-pieces", kind, piece)
    for kind, corners in (("tri6", "tri3"), ("quad8", "quad4"), ("quad9", "quad4"))
    for piece in SHELLS
    if piece.kind == corners
)

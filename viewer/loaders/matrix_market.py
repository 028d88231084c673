"""``.mtx``: a pair of Matrix Market files, stiffness and mass, as another program has assembled them.

The order of their rows is stated, never guessed: "by node" (ux uy uz of the node with the lowest number, then of the
next; with rotations ux uy uz rx ry rz), "by direction" (ux of all nodes, then uy …), or a table with the columns
node, direction (ux … rz) and one line for each row of the matrices, which may leave out held directions.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import scipy.io
import scipy.sparse as sp

from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress
from viewer.loaders.text_table import Table
from viewer.model.arrays import Array
from viewer.model.design import DIRECTIONS
from viewer.model.matrices import GivenMatrices, MatrixFiles, SymmetricMatrix
from viewer.model.mesh import Mesh

BY_NODE, BY_DIRECTION = "by node", "by direction"
_SYMMETRIC = 1e-6  # of the largest entry: how far halves that are both written may differ
_SHORTEST_ENTRY = 2  # bytes: a digit and a line end
_LONGEST_HEAD = 10_000  # lines of comments


def read_matrices(files: MatrixFiles, mesh: Mesh, progress: Progress = SILENT) -> GivenMatrices:
    """Both matrices in SI, joined to the nodes of ``mesh``. Raises ``LoadError``."""
    progress.tick(f"reading {files.stiffness.name}")
    stiffness = _matrix(files.stiffness, files.stiffness_unit)
    progress.tick(f"reading {files.mass.name}")
    mass = _matrix(files.mass, files.mass_unit)
    if stiffness.size != mass.size:
        raise LoadError(
            "stiffness and mass have different sizes", file=files.mass, found=str(mass.size),
            expected=f"{stiffness.size} rows, as in {files.stiffness.name}",
        )  # fmt: skip
    return GivenMatrices(stiffness, mass, _dof(files, stiffness.size, mesh))


def _matrix(path: Path, unit: float) -> SymmetricMatrix:
    _check_head(path)
    try:
        read = sp.csr_array(scipy.io.mmread(path))
    except (ValueError, OverflowError, TypeError, MemoryError) as error:
        raise LoadError(
            "is damaged or no Matrix Market file", file=path, found=str(error)[:200], do="write it again"
        ) from None
    matrix = read.astype(np.float64) * unit
    matrix.sum_duplicates()
    if not np.isfinite(matrix.data).all():
        raise LoadError("holds a number that is not finite", file=path)
    top = np.abs(matrix.data).max(initial=0.0)
    skew = sp.csr_array(matrix - matrix.T)
    if top == 0 or np.abs(skew.data).max(initial=0.0) > _SYMMETRIC * top:
        raise LoadError(
            "is not symmetric" if top else "is zero", file=path,
            do="a triangle alone must be declared symmetric in the first line" if top else "",
        )  # fmt: skip
    negative = np.flatnonzero(matrix.diagonal() < 0)
    if len(negative):
        raise LoadError("has a negative number on its diagonal", file=path, place=f"row {negative[0] + 1}")
    matrix = sp.csr_array(0.5 * (matrix + matrix.T))
    matrix.sort_indices()
    return SymmetricMatrix(matrix.data, matrix.indices, matrix.indptr)


def _check_head(path: Path) -> None:
    """The first line and the sizes, before memory is taken."""
    if not path.is_file():
        raise LoadError("there is no such file", file=path, do="check the path")
    with path.open("rb") as stream:
        banner = stream.readline(200).decode("latin-1").lower().split()
        if len(banner) != 5 or banner[:2] != ["%%matrixmarket", "matrix"]:
            raise LoadError("is no Matrix Market file", file=path, place="line 1", expected="%%MatrixMarket matrix …")
        layout, numbers, symmetry = banner[2:]
        if numbers not in ("real", "integer", "double") or symmetry not in ("general", "symmetric"):
            raise LoadError(
                "holds a matrix of another kind", file=path, place="line 1", found=f"{numbers} {symmetry}",
                expected="real general or real symmetric",
            )  # fmt: skip
        line = 1
        for text in stream:
            line += 1
            if text.strip() and not text.startswith(b"%"):
                break
            if line > _LONGEST_HEAD:
                break
        words = text.split() if line > 1 else []
    counts = [int(word) for word in words if word.isdigit() and len(word) < 19]
    if len(counts) != len(words) or len(counts) != (3 if layout == "coordinate" else 2):
        raise LoadError("states no sizes", file=path, place=f"line {line}", found=repr(b" ".join(words)[:40]))
    rows, columns = counts[:2]
    entries = counts[2] if layout == "coordinate" else rows * columns // 2
    room = path.stat().st_size // _SHORTEST_ENTRY
    if rows != columns or rows == 0:
        raise LoadError("is not square", file=path, place=f"line {line}", found=f"{rows} × {columns}")
    if entries > room or rows > room:  # every row of a stiffness or mass matrix has an entry
        raise LoadError(
            "declares more than the file can hold", file=path, place=f"line {line}",
            found=f"{rows} rows, {entries} entries", do="the file is cut short: write it again",
        )  # fmt: skip


def _dof(files: MatrixFiles, size: int, mesh: Mesh) -> Array:
    """(n_nodes, 6) row of the matrices of each direction, −1 where there is none."""
    dof = np.full((mesh.n_nodes, 6), -1)
    if isinstance(files.order, Path):
        rows, columns = _table(files.order, size, mesh)
        dof[rows, columns] = np.arange(size)
        return dof
    each, rest = divmod(size, mesh.n_nodes)
    if rest or each not in (3, 6):
        raise LoadError(
            "the matrices do not have three or six directions for every node", file=files.stiffness,
            found=f"{size} rows", expected=f"{3 * mesh.n_nodes} or {6 * mesh.n_nodes} for {mesh.n_nodes} nodes",
            do="give a table with the columns node, direction and one line a row",
        )  # fmt: skip
    numbers = np.arange(size)
    by_number = np.argsort(mesh.node_ids, kind="stable")
    dof[by_number, :each] = numbers.reshape(-1, each) if files.order == BY_NODE else numbers.reshape(each, -1).T
    return dof


def _table(path: Path, size: int, mesh: Mesh) -> tuple[Array, Array]:
    """Node row and direction of every row of the matrices."""
    table = Table(path)
    table.need("node", "direction")
    if len(table) != size:
        raise table.error("does not fit the matrices", found=f"{len(table)} lines", expected=f"{size}, one a row")
    words = [word.lower() for word in table.columns["direction"]]
    wrong = next((i for i, word in enumerate(words) if word not in DIRECTIONS), None)
    if wrong is not None:
        raise table.error(
            "unknown direction", table.line_numbers[wrong], found=repr(words[wrong][:20]),
            expected=", ".join(DIRECTIONS),
        )  # fmt: skip
    ids = table.integers("node")
    order = np.argsort(mesh.node_ids, kind="stable")
    rows = order[np.minimum(np.searchsorted(mesh.node_ids, ids, sorter=order), mesh.n_nodes - 1)]
    columns = np.array([DIRECTIONS.index(word) for word in words])
    lost = np.flatnonzero(mesh.node_ids[rows] != ids)
    if len(lost):
        raise table.error("names a node that the mesh does not have", table.line_numbers[lost[0]],
                          found=f"node {ids[lost[0]]}")  # fmt: skip
    _, first, counts = np.unique(6 * rows + columns, return_index=True, return_counts=True)
    if (counts > 1).any():
        row = int(first[np.argmax(counts > 1)])
        raise table.error(
            "names a direction twice", table.line_numbers[row], found=f"{words[row]} of node {ids[row]}"
        )
    return rows, columns

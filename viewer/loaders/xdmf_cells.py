"""Topologies of XDMF grids, uniform and mixed, as VTK's cell arrays."""

from __future__ import annotations

import re
from xml.etree.ElementTree import Element

import numpy as np

from viewer.cells import KINDS
from viewer.loaders.xdmf_items import Document
from viewer.model.arrays import Array

# Number in mixed topologies, names of either generation of the format, our kind. Node order is VTK's: checked for
# all of these but hex27 against VTK's own reader.
_TOPOLOGIES = (
    (4, ("triangle",), "tri3"),
    (5, ("quadrilateral",), "quad4"),
    (6, ("tetrahedron",), "tet4"),
    (7, ("pyramid",), "pyramid5"),
    (8, ("wedge",), "wedge6"),
    (9, ("hexahedron",), "hex8"),
    (34, ("edge_3",), "line3"),
    (35, ("quadrilateral_9", "quad_9"), "quad9"),
    (36, ("triangle_6", "tri_6"), "tri6"),
    (37, ("quadrilateral_8", "quad_8"), "quad8"),
    (38, ("tetrahedron_10", "tet_10"), "tet10"),
    (39, ("pyramid_13",), "pyramid13"),
    (40, ("wedge_15",), "wedge15"),
    (48, ("hexahedron_20", "hex_20"), "hex20"),
    (50, ("hexahedron_27", "hex_27"), "hex27"),
)
_BY_NAME = {name: kind for _, names, kind in _TOPOLOGIES for name in names}
_BY_NUMBER = {number: kind for number, _, kind in _TOPOLOGIES}
# Followed by the number of nodes wherever they stand.
_COUNTED = {"polyvertex": {1: "vertex1"}, "polyline": {2: "line2"}, "polygon": {3: "tri3", 4: "quad4"}}
_COUNTED_NUMBER = {1: "polyvertex", 2: "polyline", 3: "polygon"}


def cells_of(document: Document, grid: Element) -> dict[str, Array]:
    """VTK's types, ends and connectivity."""
    topology = document.child(grid, "Topology")
    if topology is None:
        raise document.error("a grid has no Topology", place=f"Grid '{grid.get('Name', '')}'"[:80])
    name = (topology.get("TopologyType") or topology.get("Type") or "").lower()
    base = topology.get("BaseOffset", "0")
    if topology.get("Order") or not re.fullmatch(r"[01]", base):
        raise document.error(
            "a topology is not understood",
            place="Topology",
            found=f"Order {topology.get('Order')}, BaseOffset {base}"[:80],
            expected="rows from 0 or 1 in the usual order",
        )
    if name not in _BY_NAME and name not in _COUNTED and name != "mixed":
        raise document.error(
            "a topology is of a type that is not read",
            place="Topology",
            found=name[:60] or "no type",
            expected=f"mixed or one of: {', '.join([*_BY_NAME, *_COUNTED])}",
        )
    values = document.item(topology, "Topology").read()
    if values.dtype.kind not in "iu":
        values = _whole(document, values)
    values = values.astype(np.int64)
    if name == "mixed":
        types, ends, nodes = _mixed(document, values.reshape(-1))
    else:
        kind = _uniform_kind(document, topology, name, values)
        size = KINDS[kind].n_nodes
        nodes = values.reshape(-1)
        types = np.full(len(nodes) // size, KINDS[kind].vtk_type)
        ends = (np.arange(len(types)) + 1) * size
    return {"types": types, "offsets": ends, "connectivity": nodes - int(base)}


def _whole(document: Document, values: Array) -> Array:
    """Rows that were declared as numbers with a point, which is the format's default."""
    if not np.isfinite(values).all() or (values != np.round(values)).any() or (np.abs(values) > 2**52).any():
        raise document.error("connectivity is not of whole numbers", place="Topology", found=str(values.dtype))
    return values


def _uniform_kind(document: Document, topology: Element, name: str, values: Array) -> str:
    given = topology.get("NodesPerElement", "")
    width = values.shape[-1] if values.ndim > 1 else int(given) if re.fullmatch(r"\d{1,4}", given) else 0
    if name in _COUNTED:
        kind = _COUNTED[name].get(width or (1 if name == "polyvertex" else 0), "")
    else:
        kind = _BY_NAME[name]
    if not kind or (width and width != KINDS[kind].n_nodes) or values.size % KINDS[kind].n_nodes:
        raise document.error(
            "wrong number of nodes per cell",
            place="Topology",
            found=f"{values.shape} for {name}",
            expected=f"(cells, {KINDS[kind].n_nodes})" if kind else "one of the sizes that are read",
        )
    return kind


def _mixed(document: Document, values: Array) -> tuple[Array, Array, Array]:
    """Runs of cells of one kind: (number, nodes …) each, or (number, count, nodes …) for counted kinds."""
    types: list[Array] = []
    ends: list[Array] = []
    nodes: list[Array] = []
    at = total = 0
    while at < len(values):
        number = int(values[at])
        counted = number in _COUNTED_NUMBER
        if counted:
            size = int(values[at + 1]) if at + 1 < len(values) else -1
            kind = _COUNTED[_COUNTED_NUMBER[number]].get(size, "")
        else:
            kind = _BY_NUMBER.get(number, "")
        step = (2 if counted else 1) + (KINDS[kind].n_nodes if kind else 0)
        if not kind or at + step > len(values):
            raise document.error(
                "a cell ends early" if kind else "a cell is of a kind that is not read",
                place=f"Topology, number {at + 1}",
                found=f"type {number}",
                expected=f"one of {sorted([*_COUNTED_NUMBER, *_BY_NUMBER])}",
            )
        run = _run(values, at, step, counted)
        table = values[at : at + run * step].reshape(run, step)[:, 2 if counted else 1 :]
        types.append(np.full(run, KINDS[kind].vtk_type))
        ends.append(total + (np.arange(run) + 1) * table.shape[1])
        nodes.append(table.reshape(-1))
        at, total = at + run * step, total + table.size
    empty = np.empty(0, np.int64)
    return np.concatenate([empty, *types]), np.concatenate([empty, *ends]), np.concatenate([empty, *nodes])


def _run(values: Array, at: int, step: int, counted: bool) -> int:
    """Number of whole cells from ``at`` that begin alike, looked for in windows that double."""
    most, window, found = (len(values) - at) // step, 1, 1
    while found < most:
        window = min(2 * window, most - found)
        cells = values[at + found * step : at + (found + window) * step].reshape(window, step)
        alike = cells[:, 0] == values[at]
        if counted:
            alike &= cells[:, 1] == values[at + 1]
        if not alike.all():
            return found + int(np.argmin(alike))
        found += window
    return found

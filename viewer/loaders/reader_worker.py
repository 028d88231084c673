"""The process in which meshio and VTK read files: ``python -m viewer.loaders.reader_worker``.

These readers can end the process, abort, crash or fill the memory on a bad file; here that costs nothing but the
worker. A request is one line of JSON on standard input: ``{"path", "how": "meshio" | "vtk", "folder"}``. The answer
is one line of JSON on the standard output that the process was started with: ``{"arrays": [[section, name], …],
"notes": […]}`` with ``arrays.npz`` in the folder, or ``{"error": {…}}``. Whatever the libraries print goes nowhere.

Both readers hand over what a ``.vtu`` file would hold (VTK's cell arrays, groups as masks), so that one piece of
code gives it a meaning: :mod:`viewer.loaders.vtu_files`.
"""

from __future__ import annotations

import contextlib
import json
import os
import re
import sys
import tempfile
from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import Any

import numpy as np

from viewer.errors import HingelightError
from viewer.loaders.array_names import group_array, mask
from viewer.loaders.msh_views import NodeView, split_views
from viewer.loaders.worker_arrays import Arrays
from viewer.loaders.worker_guards import check_container
from viewer.loaders.worker_vtk import read_by_vtk

_SMALLEST_LIMIT, _SHARE_OF_MEMORY = 4 << 30, 0.75


def read_by_meshio(path: Path) -> Arrays:
    """Any mesh that meshio reads."""
    import meshio

    check_container(path)
    _teach_meshio()
    arrays = Arrays()
    tags: list[np.ndarray] = []
    views: list[NodeView] = []
    if path.suffix.lower() == ".msh":
        with _node_tags_into(tags), tempfile.TemporaryDirectory(prefix="hingelight-") as folder:
            plain = Path(folder) / "plain.msh"
            text, views = split_views(path.read_bytes())
            plain.write_bytes(text)
            # named, since the first reader that meshio tries for .msh is another one and may never end
            mesh = meshio.read(plain, file_format="gmsh")
    else:
        mesh = meshio.read(path)
    points = np.asarray(mesh.points, float)
    if points.ndim == 2 and points.shape[1] == 2:
        points = np.column_stack([points, np.zeros(len(points))])
        arrays.notes.append("the file is two-dimensional: z was taken as 0")
    arrays.put("Points", "Points", points)
    _put_cells(arrays, mesh.cells)
    node_ids = tags[-1] if tags and len(tags[-1]) == len(points) else np.arange(1, len(points) + 1)
    if tags and node_ids is tags[-1]:
        arrays.put("PointData", "node_id", node_ids)
    _put_views(arrays, views, node_ids)
    for name, values in mesh.point_data.items():
        arrays.put("PointData", name, values)
    for name in ("freq_hz", "damping"):
        if name in mesh.field_data:
            arrays.put("FieldData", name, mesh.field_data[name])
    for name, rows in mesh.point_sets.items():
        arrays.put("PointData", group_array(name), mask(np.asarray(rows, np.int64), len(points)))
    for name, members in _cell_groups(mesh):
        arrays.put("CellData", group_array(name), members)
    for number, names in getattr(mesh, "point_tags", {}).items():
        for name in names:
            _join(arrays, "PointData", name, np.asarray(mesh.point_data["point_tags"]) == number)
    return arrays


def _put_views(arrays: Arrays, views: list[NodeView], node_ids: np.ndarray) -> None:
    """Views of three components that cover every node, as vector arrays; equal names get a number."""
    order = np.argsort(node_ids, kind="stable")
    for number, view in enumerate(views, 1):
        rows = order[np.minimum(np.searchsorted(node_ids, view.tags, sorter=order), len(order) - 1)]
        if view.values.shape[1] != 3 or (node_ids[rows] != view.tags).any() or len(np.unique(rows)) != len(node_ids):
            arrays.notes.append(f"view '{view.name}' left out: it is no vector on every node")
            continue
        values = np.empty((len(node_ids), 3))
        values[rows] = view.values
        taken = ("PointData", view.name) in arrays.values
        arrays.put("PointData", f"{view.name} {number}" if taken else view.name, values)


def _put_cells(arrays: Arrays, blocks: Iterable[Any]) -> None:
    from viewer.cells import by_meshio

    types, sizes, nodes, unknown = [], [], [np.empty(0, np.int64)], []
    for block in blocks:
        kind, data = by_meshio(block.type), np.asarray(block.data)
        known = kind is not None and data.dtype.kind in "iu" and data.ndim == 2
        if not known:
            unknown.append(f"{len(block.data)} of type {block.type}")
        types.append(np.full(len(block.data), kind.vtk_type if known and kind else 0, np.int64))
        sizes.append(np.full(len(block.data), data.shape[1] if known else 0, np.int64))
        nodes.append(data.ravel() if known else np.empty(0, np.int64))
    if unknown:
        arrays.notes.append(f"cells left out, their kind is not known here: {', '.join(unknown)}")
    arrays.put("Cells", "types", np.concatenate([*types, np.empty(0, np.int64)]))
    arrays.put("Cells", "offsets", np.cumsum(np.concatenate([*sizes, np.empty(0, np.int64)])))
    arrays.put("Cells", "connectivity", np.concatenate(nodes))


def _cell_groups(mesh: Any) -> Iterator[tuple[str, np.ndarray]]:
    """Names and masks over all cells: cell sets, physical groups, families."""
    lengths = [len(block.data) for block in mesh.cells]
    found: dict[str, np.ndarray] = {}

    def add(name: str, number: int, members: np.ndarray) -> None:
        total = found.setdefault(name, np.zeros(sum(lengths), np.uint8))
        start = sum(lengths[:number])
        total[start : start + lengths[number]][members] = 1

    for name, parts in mesh.cell_sets.items():
        if not name.startswith("gmsh:"):
            for number, rows in enumerate(parts):
                if rows is not None and len(rows):
                    add(name, number, np.asarray(rows, np.int64))
    pairs = {k: v for k, v in mesh.field_data.items() if isinstance(v, np.ndarray) and v.shape == (2,)}
    names = {(int(v[0]), int(v[1])): k for k, v in pairs.items()}  # other field data may be lists of words
    families = getattr(mesh, "cell_tags", {})
    for number, block in enumerate(mesh.cells):
        for key, word in (("gmsh:physical", "physical"), ("medit:ref", "reference"), ("cell_tags", "")):
            if key not in mesh.cell_data:
                continue
            values = np.asarray(mesh.cell_data[key][number])
            for tag in np.unique(values[values != 0]).tolist():
                if key == "cell_tags":
                    labels = families.get(tag, [])
                elif key == "gmsh:physical":
                    labels = [names.get((tag, block.dim), f"{word} {tag}")]
                else:
                    labels = [f"{word} {tag}"]
                for label in labels:
                    add(label, number, values == tag)
    yield from found.items()


def _join(arrays: Arrays, section: str, name: str, members: np.ndarray) -> None:
    key = (section, group_array(name))
    arrays.values[key] = (arrays.values.get(key, np.zeros(len(members), np.uint8)) | members).astype(np.uint8)


def _teach_meshio() -> None:
    """meshio knows these kinds by name, size and order but not their dimension, and fails on them."""
    with contextlib.suppress(ImportError, AttributeError):
        from meshio import _mesh

        for kind in ("wedge15", "pyramid13"):
            _mesh.topological_dimension.setdefault(kind, 3)


@contextlib.contextmanager
def _node_tags_into(tags: list[np.ndarray]) -> Iterator[None]:
    """Keeps the node tags of .msh files, which meshio reads and throws away. Without effect when meshio changes."""
    from meshio import gmsh

    kept = []
    for version, first in (("_gmsh41", 0), ("_gmsh40", 1), ("_gmsh22", 1)):  # tags there count from 0 or 1
        module = getattr(gmsh, version, None)
        original = getattr(module, "_read_nodes", None)
        if original is None:
            continue

        def listening(*args: Any, _original: Any = original, _add: int = 1 - first, **named: Any) -> Any:
            answer = _original(*args, **named)
            if isinstance(answer, tuple) and len(answer) > 1 and np.ndim(answer[1]) == 1:
                tags.append(np.asarray(answer[1]).astype(np.int64) + _add)
            return answer

        kept.append((module, original))
        module._read_nodes = listening  # type: ignore[union-attr]
    try:
        yield
    finally:
        for module, original in kept:
            module._read_nodes = original  # type: ignore[union-attr]


# --- the loop ---


def _limit_memory() -> None:
    with contextlib.suppress(ImportError, ValueError, OSError, AttributeError):
        import resource

        physical = os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES")
        limit = max(_SMALLEST_LIMIT, int(physical * _SHARE_OF_MEMORY))
        resource.setrlimit(resource.RLIMIT_AS, (limit, limit))
        resource.setrlimit(resource.RLIMIT_CORE, (0, 0))


def _answer(request: dict[str, str]) -> dict[str, Any]:
    path = Path(request["path"])
    try:
        arrays = {"meshio": read_by_meshio, "vtk": read_by_vtk}[request["how"]](path)
        keys = list(arrays.values)
        np.savez(Path(request["folder"]) / "arrays.npz", *arrays.values.values())
        return {"arrays": keys, "notes": arrays.notes}
    except HingelightError as error:
        return {"error": error.to_dict()}
    except MemoryError:
        return {"error": {"problem": "needs more memory than a reader may take"}}
    except BaseException as error:  # SystemExit is how meshio answers a bad file
        return {
            "error": {
                "problem": "cannot be read",
                "found": _words(error),
                "do": "check that the file is complete and of the format that its suffix says",
            }
        }


def _words(error: BaseException) -> str:
    text = re.sub(r"\s+", " ", str(error)).strip()
    if isinstance(error, SystemExit):
        return "meshio gave the file up"
    return f"{type(error).__name__}: {text}"[:200] if text else type(error).__name__


def main() -> None:
    """Answer requests until standard input ends."""
    answers = os.fdopen(os.dup(1), "w", encoding="utf-8")
    nowhere = os.open(os.devnull, os.O_WRONLY)
    os.dup2(nowhere, 1)
    os.dup2(nowhere, 2)
    _limit_memory()
    for line in sys.stdin:
        answers.write(json.dumps(_answer(json.loads(line))) + "\n")
        answers.flush()


if __name__ == "__main__":
    main()

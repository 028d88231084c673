"""``.e``, ``.exo``, ``.ex2``: Exodus II files, in both flavours of netCDF (classic, and version 4 on HDF5).

Every time step is a mode; equal times stay separate modes. Its frequency is the global variable ``freq…``, else the
time (``step_modes.py`` says when times are none). Its shape is the nodal variables NAMEx, NAMEy, NAMEz (any case,
perhaps with ``_`` before the letter), NAME as in ``step_modes.py``; ``rotx`` … are its rotations. Blocks become cell
groups, node sets and side sets node groups. Strain energies: the element variable ``strain_energy`` (any case).

Node and side numbering by the published manual of the format (SAND92-2137).
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator, Mapping
from pathlib import Path

import numpy as np

from viewer.cells import KINDS
from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress
from viewer.loaders.netcdf_arrays import Variable, opened
from viewer.loaders.raw_data import RawBlock, RawMesh, RawModes
from viewer.loaders.step_modes import shape_names, step_frequencies
from viewer.model.arrays import Array
from viewer.model.modes import ArrayShapes

SUFFIXES = (".e", ".exo", ".ex2")
_FAMILIES = {
    "hex": ("hex8", "hex20", "hex27"),
    "tet": ("tet4", "tet10"),
    "wed": ("wedge6", "wedge15"),
    "pyr": ("pyramid5", "pyramid13"),
    "qua": ("quad4", "quad8", "quad9"),
    "she": ("quad4", "quad8", "quad9", "tri3", "tri6"),
    "tri": ("tri3", "tri6"),
    "bar": ("line2", "line3"),
    "bea": ("line2", "line3"),
    "tru": ("line2", "line3"),
    "rod": ("line2", "line3"),
    "edg": ("line2", "line3"),
    "sph": ("vertex1",),
    "cir": ("vertex1",),
}
# Ours[i] = the file's[p[i]]: mid-side nodes of upright edges come before those of the top there.
_ORDER = {
    "wedge15": (*range(9), 12, 13, 14, 9, 10, 11),
    "hex20": (*range(12), 16, 17, 18, 19, 12, 13, 14, 15),
    "hex27": (*range(12), 16, 17, 18, 19, 12, 13, 14, 15, 23, 24, 25, 26, 21, 22, 20),
}
# Corners of side 1, 2, …
_SIDES = {
    "hex": ("0154", "1265", "2376", "0473", "0321", "4567"),
    "tet": ("013", "123", "032", "021"),
    "wedge": ("0143", "1254", "0352", "021", "345"),
    "pyramid": ("014", "124", "234", "043", "0321"),
    "quad": ("0123", "0321", "01", "12", "23", "30"),
    "tri": ("012", "021", "01", "12", "20"),
    "line": ("0", "1"),
}
_COMPONENT = re.compile(r"(.+?)[_ ]?([xyz])(_re|_im)?", re.I)
_TURNED = re.compile(r"rot(ation)?s?", re.I)
_ENERGY = re.compile(r"(elastic[_ ]?)?strain[_ ]?energy", re.I)
_FILL = 9e36  # netCDF fills what was never written with 9.97e36


def read_mesh(path: Path, progress: Progress = SILENT) -> RawMesh:
    """Blocks, numbers, node sets and side sets. Raises ``LoadError``."""
    with opened(path) as arrays:
        file = _Exodus(path, arrays)
        points = file.points()
        raw = RawMesh(points, [], file.numbers("node_num_map", len(points)))
        first = 1
        for number, block in file.blocks(raw.notes):
            progress.tick(f"reading block {number}")
            if block is not None:
                raw.blocks.append(block)
                raw.cell_groups[file.set_name("eb", number, "block")] = np.arange(first, first + len(block.nodes)) - 1
                first += len(block.nodes)
        for number, name in file.sets("ns", "node set"):
            raw.node_groups[name] = file.whole(f"node_ns{number}") - 1
        for number, name in file.sets("ss", "side set"):
            raw.node_groups[name] = file.side_nodes(number)
        return raw


def read_modes(path: Path, progress: Progress = SILENT) -> RawModes:
    """Every time step as a mode. Raises ``LoadError``."""
    with opened(path) as arrays:
        file = _Exodus(path, arrays)
        nodes = file.n_nodes
        moved, turned = file.shape_variables()
        times = file.real("time_whole") if "time_whole" in arrays else np.arange(1.0, file.n_steps + 1)
        if len(times) == 0:
            raise LoadError("holds no time step, so no mode", file=path, do="write it again; it may be cut short")

        def shapes(variables: tuple[Callable[[int], Array | None], ...]) -> Array:
            out = np.zeros((len(times), nodes, 3), complex if len(variables) == 6 else float)
            for step in range(len(times)):
                progress.tick(f"reading {path.name}", step, len(times))
                for place, variable in enumerate(variables):
                    values = variable(step)
                    if values is not None:
                        out[step, :, place % 3] += values * (1j if place >= 3 else 1)
            return out

        freq = file.global_variable("freq")
        return RawModes(
            ArrayShapes(shapes(moved), shapes(turned) if turned else None),
            step_frequencies(times) if freq is None else freq,
            file.global_variable("damp"),
            file.numbers("node_num_map", nodes),
            cell_energy=file.energies(len(times)),
        )


class _Exodus:
    """The arrays of an open file under the names that the format gives them."""

    def __init__(self, path: Path, arrays: Mapping[str, Variable]) -> None:
        self.path, self.arrays = path, arrays

    def error(self, problem: str, place: str = "", **parts: str) -> LoadError:
        return LoadError(problem, file=self.path, place=place, **parts)

    def _get(self, name: str) -> Variable:
        if name not in self.arrays:
            raise self.error(
                f"array '{name}' is missing",
                found=", ".join(list(self.arrays)[:12]) or "no arrays",
                do="the file is no Exodus II file, or cut short",
            )
        return self.arrays[name]

    def real(self, name: str) -> Array:
        return self._checked(self._get(name).read(), name)

    def whole(self, name: str) -> Array:
        values = self._get(name).read()
        if values.dtype.kind not in "iu":
            raise self.error("is not of whole numbers", name, found=str(values.dtype))
        return values.astype(np.int64)

    def numbers(self, name: str, count: int) -> Array:
        """The map of numbers, 1 to ``count`` when the file has none."""
        ids = self.whole(name) if name in self.arrays else np.arange(1, count + 1)
        return ids if ids.any() or count == 0 else np.arange(1, count + 1)

    def _checked(self, values: Array, name: str, step: int | None = None) -> Array:
        if values.dtype.kind not in "fiu":
            raise self.error("is not of numbers", name, found=str(values.dtype))
        if values.dtype.kind == "f" and values.size and not np.abs(values).max() < _FILL:
            place = name if step is None else f"{name}, step {step + 1}"
            raise self.error(
                "holds numbers that were never written or are not finite", place, do="the writer was interrupted"
            )
        return values.astype(float)

    @property
    def n_nodes(self) -> int:
        return self._get("coord").shape[-1] if "coord" in self.arrays else self._get("coordx").shape[0]

    @property
    def n_steps(self) -> int:
        return self._get("vals_nod_var1").shape[0]

    def points(self) -> Array:
        if "coord" in self.arrays:
            columns = list(self.real("coord"))
        else:
            columns = [self.real(name) for name in ("coordx", "coordy", "coordz") if name in self.arrays]
        if not 1 <= len(columns) <= 3 or any(len(column) != self.n_nodes for column in columns):
            raise self.error(
                "coordinates do not belong together",
                "coord",
                found=str([len(c) for c in columns]),
                expected=f"up to three times {self.n_nodes}",
            )
        return np.column_stack([*columns, *(np.zeros(self.n_nodes) for _ in range(3 - len(columns)))])

    @property
    def _is_flat(self) -> bool:
        return self._get("coord").shape[0] == 2 if "coord" in self.arrays else "coordz" not in self.arrays

    def texts(self, name: str) -> list[str]:
        """The strings of a table of letters; empty when it is missing."""
        if name not in self.arrays:
            return []
        letters = self.arrays[name].read()
        if letters.dtype.kind != "S" or letters.ndim != 2:
            raise self.error("is no table of letters", name, found=f"{letters.dtype} {letters.shape}")
        return [b"".join(row.tolist()).split(b"\0")[0].decode("latin-1").strip() for row in letters]

    # --- blocks and sets ---

    def _block_numbers(self) -> list[int]:
        found = (re.fullmatch(r"connect([1-9]\d{0,5})", name) for name in self.arrays)
        return sorted(int(match[1]) for match in found if match)

    def blocks(self, notes: list[str]) -> Iterator[tuple[int, RawBlock | None]]:
        """Number and cells of every block; None for cells of an unknown kind, with a note."""
        starts, ids = self._starts()
        for number in self._block_numbers():
            variable = self._get(f"connect{number}")
            kind = self._kind(number)
            if not kind:
                notes.append(
                    f"{variable.shape[0]} cells of type {variable.texts.get('elem_type', 'unknown')} left out: "
                    "not known here"
                )
                yield number, None
                continue
            nodes = self.whole(f"connect{number}") - 1
            order = _ORDER.get(kind, range(nodes.shape[1]))
            yield number, RawBlock(kind, nodes[:, order], ids[starts[number] : starts[number] + len(nodes)])

    def _starts(self) -> tuple[dict[int, int], Array]:
        """First element of each block, from 0, and the numbers of all elements."""
        starts, total = {}, 0
        for number in self._block_numbers():
            shape = self._get(f"connect{number}").shape
            if len(shape) != 2:
                raise self.error("is no table of nodes", f"connect{number}", found=str(shape))
            starts[number] = total
            total += shape[0]
        ids = self.numbers("elem_num_map", total)
        if ids.shape != (total,):
            raise self.error(
                "does not fit the elements", "elem_num_map", found=str(ids.shape), expected=f"({total},)"
            )
        return starts, ids

    def _kind(self, number: int) -> str:
        variable = self._get(f"connect{number}")
        names = _FAMILIES.get(variable.texts.get("elem_type", "").lower()[:3], ())
        return next((name for name in names if KINDS[name].n_nodes == variable.shape[1]), "")

    def set_name(self, prefix: str, number: int, word: str) -> str:
        names, ids = self.texts(f"{prefix}_names"), self.arrays.get(f"{prefix}_prop1")
        if number <= len(names) and names[number - 1]:
            return names[number - 1]
        known = self.whole(f"{prefix}_prop1") if ids is not None else np.empty(0, np.int64)
        return f"{word} {known[number - 1] if number <= len(known) else number}"

    def sets(self, prefix: str, word: str) -> Iterator[tuple[int, str]]:
        """Number and name of every node set or side set that has members."""
        key = {"ns": "node_ns", "ss": "elem_ss"}[prefix]
        found = (re.fullmatch(key + r"([1-9]\d{0,5})", name) for name in self.arrays)
        for number in sorted(int(match[1]) for match in found if match):
            yield number, self.set_name(prefix, number, word)

    def side_nodes(self, number: int) -> Array:
        """Rows of the nodes on the sides of side set ``number``."""
        elements, sides = self.whole(f"elem_ss{number}") - 1, self.whole(f"side_ss{number}")
        if elements.shape != sides.shape:
            raise self.error("elements and sides do not fit", f"side_ss{number}", found=str(sides.shape))
        starts, ids = self._starts()
        if len(elements) and not 0 <= elements.min() <= elements.max() < len(ids):
            raise self.error(
                "a side set names an element that does not exist",
                f"elem_ss{number}",
                found=str(elements.max() + 1),
                expected=f"1 to {len(ids)}",
            )
        rows = [np.empty(0, np.int64)]
        for block, item in self.blocks([]):
            if item is None:
                continue
            mine = (elements >= starts[block]) & (elements < starts[block] + len(item.nodes))
            for side in np.unique(sides[mine]):
                picked = item.nodes[elements[mine & (sides == side)] - starts[block]]
                rows.append(picked[:, self._nodes_of_side(item.kind, int(side), number)].ravel())
        return np.unique(np.concatenate(rows))

    def _nodes_of_side(self, kind: str, side: int, number: int) -> list[int]:
        item = KINDS[kind]
        corners = _SIDES.get(item.family, ())
        if item.dim == 2 and self._is_flat:
            corners = corners[2:]  # in the plane, sides are edges
        if not 1 <= side <= len(corners):
            raise self.error(
                f"a {kind} has no such side", f"side_ss{number}", found=str(side), expected=f"1 to {len(corners)}"
            )
        wanted = {int(c) for c in corners[side - 1]}
        if len(wanted) == item.n_corners:
            return list(range(item.n_nodes))
        parts = [face for _, face in item.faces] if len(wanted) > 2 else list(item.edges)
        whole = next((p for p in parts if wanted == {node for node in p if node < item.n_corners}), tuple(wanted))
        return list(whole)

    # --- results ---

    def shape_variables(self) -> tuple[tuple[Callable[[int], Array | None], ...], ...]:
        """Readers of one step for x, y, z (and again for imaginary parts): translations, rotations or ()."""
        names = self.texts("name_nod_var")
        vectors: dict[str, dict[str, int]] = {}
        for place, name in enumerate(names, 1):
            match = _COMPONENT.fullmatch(name)
            if match:
                vectors.setdefault(match[1] + (match[3] or ""), {})[match[2].lower()] = place
        whole = {name: axes for name, axes in vectors.items() if len(axes) >= (2 if self._is_flat else 3)}
        chosen = shape_names([name for name in whole if not _TURNED.match(name)], self.path)
        turned = chosen.turned or self._rotations(chosen.moved, whole)
        return tuple(
            tuple(self._step_reader(whole[name].get(axis)) for name in some for axis in "xyz")
            for some in (chosen.moved, turned)
        )

    @staticmethod
    def _rotations(moved: tuple[str, ...], vectors: Mapping[str, object]) -> tuple[str, ...]:
        """Names such as "rot" with the endings that the translations have."""
        ends = [name[-3:] if len(moved) == 2 else "" for name in moved]
        names = [
            next((n for n in vectors if n.endswith(end) and _TURNED.fullmatch(n.removesuffix(end))), "")
            for end in ends
        ]
        return tuple(names) if all(names) else ()

    def _step_reader(self, place: int | None) -> Callable[[int], Array | None]:
        def read(step: int) -> Array | None:
            if place is None:
                return None
            name = f"vals_nod_var{place}"
            if name not in self.arrays and "vals_nod_var" in self.arrays:  # one table in old files
                name, pick = "vals_nod_var", place - 1
            else:
                pick = None
            variable = self._get(name)
            if step >= variable.shape[0]:
                raise self.error(
                    "a mode shape is missing",
                    name,
                    found=f"{variable.shape[0]} steps",
                    expected=f"at least {step + 1}",
                )
            values = variable.row(step)
            values = self._checked(values if pick is None else values[pick], name, step)
            if values.shape != (self.n_nodes,):
                raise self.error("does not fit the nodes", name, found=str(values.shape), expected=str(self.n_nodes))
            return values

        return read

    def global_variable(self, word: str) -> Array | None:
        """(steps,) the global variable whose name starts with ``word``."""
        for place, name in enumerate(self.texts("name_glo_var")):
            if name.lower().startswith(word):
                values = self.real("vals_glo_var")
                if values.ndim != 2 or place >= values.shape[1]:
                    raise self.error(
                        "does not fit the names of global variables", "vals_glo_var", found=str(values.shape)
                    )
                return values[:, place]
        return None

    def energies(self, steps: int) -> tuple[Array, Array] | None:
        """Element numbers and strain energies (steps, elements), NaN for blocks without."""
        names = self.texts("name_elem_var")
        place = next((i for i, name in enumerate(names, 1) if _ENERGY.fullmatch(name)), None)
        if place is None:
            return None
        starts, ids = self._starts()
        out = np.full((steps, len(ids)), np.nan)
        for number, start in starts.items():
            name, count = f"vals_elem_var{place}eb{number}", self._get(f"connect{number}").shape[0]
            if name in self.arrays:
                values = self.real(name)
                if values.shape != (steps, count):
                    raise self.error(
                        "does not fit the elements and steps",
                        name,
                        found=str(values.shape),
                        expected=str((steps, count)),
                    )
                out[:, start : start + count] = values
        return ids, out

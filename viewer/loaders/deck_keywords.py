"""``.inp`` decks: keyword lines that begin with ``*``, data lines of numbers parted by commas.

Understood: nodes, elements of the solid, shell, membrane, plane, truss and beam families, sets of nodes and of
elements (also generated, also of sets), one part in one place, includes inside the folder. Everything that would move
or make nodes or cells in a way that is not understood is refused by name; other keywords say nothing about the mesh
and are passed over. Ids are kept. The order of nodes is VTK's for all kinds but the 3-node beams, whose second node
is the middle one (from memory, no source; a wrong one would be flagged as a mid-side node gone astray).
"""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path

import numpy as np

from viewer.cells import KINDS
from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress
from viewer.loaders.deck_lines import Cells, Line, Nodes, lines_of, whole
from viewer.loaders.raw_data import RawMesh, RawModes
from viewer.model.arrays import Array

SUFFIXES = (".inp",)
_SOLIDS = {4: "tet4", 10: "tet10", 5: "pyramid5", 6: "wedge6", 15: "wedge15", 8: "hex8", 20: "hex20"}
_FLAT = {3: "tri3", 6: "tri6", 4: "quad4", 8: "quad8", 9: "quad9"}
_LINES = {2: "line2", 3: "line3"}
# Type names: family, number of nodes (or order of a beam), formulation letters.
_FAMILIES: tuple[tuple[re.Pattern[str], dict[int, str]], ...] = (
    (re.compile(r"(?:C3D|DC3D|SC)(\d+)[A-Z]*"), _SOLIDS),
    (re.compile(r"(?:S|DS|M3D|CPS|CPE|CPEG|R3D|SFM3D|DC2D)(\d)(?:[A-Z]+\d?)?"), _FLAT),
    (re.compile(r"STRI(3)"), _FLAT),
    (re.compile(r"T[23]D(\d)[A-Z]*"), _LINES),
)
_BEAM = re.compile(r"B[23]([123])[A-Z]*")  # the last figure: 1 linear, 2 quadratic, 3 cubic with two nodes
_NO_SHAPE = re.compile(r"MASS|ROTARYI|HEATCAP|SPRING[A12]|DASHPOT[A12]|CONN[23]D2|DCOUP[23]D|GAP\w*|ITT\w*|DGAP")
_REFUSED = re.compile(
    r"SYSTEM|NGEN|NFILL|NCOPY|NMAP|ELGEN|ELCOPY|IMPORT|SUBSTRUCTURE|SUBMODEL|PARAMETER|SYMMETRIC MODEL GENERATION"
)
_Members = list[int | str | range]


def read_mesh(path: Path, progress: Progress = SILENT) -> RawMesh:
    """The mesh of the deck. Raises ``LoadError``."""
    deck = _Deck(path)
    for count, line in enumerate(lines_of(path, _included)):
        if count % 100_000 == 0:
            progress.tick(f"reading {path.name}", count)
        deck.take(line)
    return deck.mesh()


def read_modes(path: Path, progress: Progress = SILENT) -> RawModes:
    """A deck holds no mode shapes: always ``LoadError``."""
    raise LoadError("holds no mode shapes", file=path, found="a text deck", do="give the file that has the results")


def _included(line: Line) -> str | None:
    word, given = _keyword(line.text) if line.text[:1] == "*" and line.text[:2] != "**" else ("", {})
    return given.get("INPUT", "") if word == "INCLUDE" else None


def _keyword(text: str) -> tuple[str, dict[str, str]]:
    """Upper-case keyword and its parameters; values keep their letters."""
    first, *rest = text.lstrip("*").split(",")
    pairs = (part.partition("=") for part in rest if part.strip())
    given = {key.strip().upper(): value.strip().strip('"') for key, _, value in pairs}
    return " ".join(first.split()).upper(), given


class _Deck:
    """What has been read so far."""

    def __init__(self, path: Path) -> None:
        self.path, self.nodes, self.cells = path, Nodes(), Cells()
        self.sets: dict[str, dict[str, _Members]] = {"NSET": {}, "ELSET": {}}
        self.left_out: dict[str, int] = {}
        self.parts = self.instances = 0
        self._take_data: Callable[[Line], None] = self._pass_over
        self._unfinished = ""  # a keyword line goes on after a comma at its end
        self._pending: list[int] = []  # numbers of an element that goes on in the next line
        self._pending_line: Line | None = None

    def take(self, line: Line) -> None:
        text = line.text
        if text.startswith("**") or not text.strip():
            return
        if self._unfinished or text.startswith("*"):
            self._end_of_data()
            text = self._unfinished + text.strip()
            self._unfinished = text if text.endswith(",") else ""
            if not self._unfinished:
                self._start(line, *_keyword(text))
            return
        self._take_data(line)

    def mesh(self) -> RawMesh:
        self._end_of_data()
        if not self.nodes.rows:
            raise LoadError("holds no nodes", file=self.path, expected="a keyword line *NODE with nodes below it")
        notes = []
        if self.left_out:
            words = ", ".join(f"{count} of type {name}" for name, count in self.left_out.items())
            notes.append(f"elements left out, they have no shape here: {words}")
        raw = RawMesh(self.nodes.points, self.cells.blocks(self.nodes), self.nodes.ids, notes=notes)
        for word, rows, groups in (
            ("NSET", self.nodes.rows, raw.node_groups),
            ("ELSET", self.cells.rows, raw.cell_groups),
        ):
            for name in self.sets[word]:
                groups[name] = self._rows(word, name, rows, notes)
        return raw

    def _rows(self, word: str, name: str, rows: dict[int, int], notes: list[str]) -> Array:
        """Rows of a set's members, those of sets it names included."""
        known = {key.upper(): key for key in self.sets[word]}
        members: set[int] = set()
        waiting, seen = [name], {name}
        while waiting:
            for member in self.sets[word][waiting.pop()]:
                if isinstance(member, int):
                    members.add(member)
                elif isinstance(member, range):  # written in one line, it may be of any length
                    members.update(member if len(member) <= len(rows) else (i for i in rows if i in member))
                elif member.upper() not in known:
                    raise LoadError(
                        f"set '{name}' names a set that does not exist", file=self.path, found=member[:60]
                    )
                elif known[member.upper()] not in seen:
                    seen.add(known[member.upper()])
                    waiting.append(known[member.upper()])
        strange = [member for member in members if member not in rows]
        if strange:
            notes.append(f"set '{name}': {len(strange)} of its {len(members)} members are not in the mesh")
        return np.array(sorted(rows[member] for member in members if member in rows), np.int64)

    # --- keywords ---

    def _start(self, line: Line, word: str, given: dict[str, str]) -> None:
        self._take_data = self._pass_over
        if _REFUSED.fullmatch(word) or (word == "NODE" and given.get("SYSTEM", "R").upper() != "R"):
            raise line.error(
                "holds something that is not understood and would change the mesh",
                found=f"*{word}" + (f", SYSTEM={given['SYSTEM']}"[:40] if word == "NODE" else ""),
                do="write all nodes and elements out, in one system of coordinates; or export .vtu or .msh",
            )
        if word == "NODE":
            members = self._set(line, "NSET", given["NSET"]) if given.get("NSET") else None
            self._take_data = lambda row: self._node(row, members)
        elif word == "ELEMENT":
            self._element_type(line, given)
        elif word in ("NSET", "ELSET"):
            self._set_data(line, word, given)
        elif word in ("PART", "INSTANCE"):
            self.parts += word == "PART"
            self.instances += word == "INSTANCE"
            if self.parts > 1 or self.instances > 1:
                raise line.error(
                    "holds several parts or places of a part", found=f"*{word}", do="write the deck without parts"
                )
            if word == "INSTANCE":
                self._take_data = self._moved_part

    def _element_type(self, line: Line, given: dict[str, str]) -> None:
        name = given.get("TYPE", "").upper()
        if _NO_SHAPE.fullmatch(name):
            self._take_data = lambda row: self._count(name)
            return
        kind = _kind(name)
        if not kind:
            raise line.error(
                "an element type is not understood",
                found=f"TYPE={name[:40]}",
                expected="solids, shells, membranes, plane, truss and beam elements",
            )
        members = self._set(line, "ELSET", given["ELSET"]) if given.get("ELSET") else None
        order = (0, 2, 1) if kind == "line3" else None
        size = KINDS[kind].n_nodes

        def take(row: Line) -> None:
            self._pending_line = self._pending_line or row
            self._pending += [whole(row, text, "an id") for text in row.text.split(",") if text.strip()]
            if len(self._pending) > size + 1:
                raise row.error(
                    "an element has too many nodes", found=str(len(self._pending) - 1), expected=f"{size} for {name}"
                )
            if len(self._pending) == size + 1:
                self.cells.add(row, kind, self._pending[0], self._pending[1:], order)
                if members is not None:
                    members.append(self._pending[0])
                self._pending, self._pending_line = [], None

        self._take_data = take

    def _set(self, line: Line, word: str, name: str) -> _Members:
        same = next((key for key in self.sets[word] if key.upper() == name.upper()), name)
        return self.sets[word].setdefault(same, [])

    def _set_data(self, line: Line, word: str, given: dict[str, str]) -> None:
        name = given.get(word)
        if not name:
            raise line.error("a set has no name", found=line.text.strip()[:60], expected=f"{word}=name")
        members = self._set(line, word, name)
        if "GENERATE" in given:
            self._take_data = lambda row: members.append(_generated(row))
            return

        def take(row: Line) -> None:
            for text in (part.strip() for part in row.text.split(",")):
                if text:
                    members.append(int(text) if text.isascii() and text.isdigit() and len(text) < 16 else text)

        self._take_data = take

    # --- data lines ---

    def _node(self, row: Line, members: _Members | None) -> None:
        fields = row.text.rstrip().rstrip(",").split(",")
        if not 2 <= len(fields) <= 7:
            raise row.error(
                "a node is not understood",
                found=row.text.strip()[:60],
                expected="id, x, y, z parted by commas, decimal points",
            )
        number = whole(row, fields[0], "a node id")
        try:
            xyz = [_number(text) for text in fields[1:4]]
        except ValueError:
            raise row.error("a coordinate is no number", found=row.text.strip()[:60]) from None
        x, y, z = [*xyz, 0.0, 0.0, 0.0][:3]
        self.nodes.add(row, number, (x, y, z))
        if members is not None:
            members.append(number)

    def _moved_part(self, row: Line) -> None:
        raise row.error("a part is moved or turned, which is not understood", found=row.text.strip()[:60])

    def _count(self, name: str) -> None:
        self.left_out[name] = self.left_out.get(name, 0) + 1

    def _pass_over(self, row: Line) -> None:
        pass

    def _end_of_data(self) -> None:
        if self._pending and self._pending_line is not None:
            raise self._pending_line.error(
                "an element has too few nodes", found=str(len(self._pending) - 1), do="the deck may be cut short"
            )


def _kind(name: str) -> str:
    """Our kind of cell for a type of element, "" when it is not understood."""
    if name == "STRI65":
        return "tri6"
    beam = _BEAM.fullmatch(name)
    if beam:
        return "line3" if beam[1] == "2" else "line2"
    for pattern, kinds in _FAMILIES:
        match = pattern.fullmatch(name)
        if match:
            return kinds.get(int(match[1]), "")
    return ""


def _generated(row: Line) -> range:
    numbers = [whole(row, text, "an id") for text in row.text.split(",") if text.strip()]
    if len(numbers) == 2:
        numbers.append(1)
    if len(numbers) != 3 or numbers[2] < 1:
        raise row.error(
            "a generated set is not understood", found=row.text.strip()[:60], expected="first, last, step"
        )
    return range(numbers[0], numbers[1] + 1, numbers[2])


def _number(text: str) -> float:
    word = text.strip()
    if not word:
        return 0.0
    if "_" in word or not word.isascii():
        raise ValueError(word)
    return float(re.sub("[dD]", "e", word, count=1) if word[-1:].isdigit() else word)

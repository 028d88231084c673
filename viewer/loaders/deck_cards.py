"""``.bdf``, ``.nas`` and ``.fem`` decks: cards of fields in columns of 8 or 16, or parted by commas.

Understood: GRID in the basic system, solids, shells and line elements up to second order with all mid-side nodes or
none, continuations, includes inside the folder. Property numbers become groups ``property N``. Springs, masses and
rigid elements have no shape and are counted in a note. Local systems of coordinates of nodes, superelements and tabs
are refused by name. Ids are kept. Order of nodes: mid-side nodes of hexahedra and wedges come bottom, upright, top.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path
from typing import NamedTuple

import numpy as np

from viewer.cells import KINDS
from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress
from viewer.loaders.deck_lines import Cells, Line, Nodes, lines_of, whole
from viewer.loaders.raw_data import RawMesh, RawModes

SUFFIXES = (".bdf", ".nas", ".fem")


class _Shape(NamedTuple):
    """First field with a node, kinds of cell with and without mid-side nodes."""

    first: int
    kinds: tuple[str, ...]


_SHAPES = {
    "CTETRA": _Shape(2, ("tet4", "tet10")),
    "CPYRA": _Shape(2, ("pyramid5", "pyramid13")),
    "CPYRAM": _Shape(2, ("pyramid5", "pyramid13")),
    "CPENTA": _Shape(2, ("wedge6", "wedge15")),
    "CHEXA": _Shape(2, ("hex8", "hex20")),
    "CTRIA3": _Shape(2, ("tri3",)),
    "CTRIAR": _Shape(2, ("tri3",)),
    "CTRIA6": _Shape(2, ("tri3", "tri6")),
    "CQUAD4": _Shape(2, ("quad4",)),
    "CQUADR": _Shape(2, ("quad4",)),
    "CSHEAR": _Shape(2, ("quad4",)),
    "CQUAD8": _Shape(2, ("quad4", "quad8")),
    "CBAR": _Shape(2, ("line2",)),
    "CBEAM": _Shape(2, ("line2",)),
    "CROD": _Shape(2, ("line2",)),
    "CTUBE": _Shape(2, ("line2",)),
    "CONROD": _Shape(1, ("line2",)),
}
_ORDER = {"hex20": (*range(12), 16, 17, 18, 19, 12, 13, 14, 15), "wedge15": (*range(9), 12, 13, 14, 9, 10, 11)}
_NO_SHAPE = re.compile(r"CELAS\d|CBUSH\w*|CGAP|CDAMP\d|CMASS\d|CONM\d|CVISC|CWELD|CFAST|RBE\d|RBAR\d?|RROD|PLOTEL\w*")
_REFUSED = re.compile(r"CTRIAX\w*|CQUADX\w*|SPOINT|EPOINT|DMIG\w*|SEBULK|SEELT|CQUAD|CHACAB|CBEND|GRIDB|SEQGP")
_SPECIAL = re.compile(r"([+-]?\d*\.?\d*)([+-]\d+)")  # 1.5-3 stands for 1.5E-3


class _Card(NamedTuple):
    name: str
    fields: list[str]
    line: Line

    def field(self, number: int) -> str:
        return self.fields[number] if number < len(self.fields) else ""


def read_mesh(path: Path, progress: Progress = SILENT) -> RawMesh:
    """The mesh of the deck. Raises ``LoadError``."""
    nodes, cells = Nodes(), Cells()
    properties: dict[int, list[int]] = {}
    left_out: dict[str, int] = {}
    for count, card in enumerate(_cards(path)):
        if count % 50_000 == 0:
            progress.tick(f"reading {path.name}", count)
        if card.name == "GRID":
            _grid(card, nodes)
        elif card.name == "GRDSET" and card.field(1).strip() not in ("", "0"):
            raise _local(card, card.field(1))
        elif card.name in _SHAPES:
            number = _cell(card, cells)
            if card.name != "CONROD" and card.field(1):
                properties.setdefault(whole(card.line, card.field(1), "a property id"), []).append(number)
        elif _NO_SHAPE.fullmatch(card.name):
            left_out[card.name] = left_out.get(card.name, 0) + 1
        elif _REFUSED.fullmatch(card.name):
            raise card.line.error(
                "holds something that is not understood and would change the mesh",
                found=card.name,
                do="export .vtu or .msh",
            )
    if not nodes.rows:
        raise LoadError("holds no nodes", file=path, expected="cards GRID")
    notes = []
    if left_out:
        words = ", ".join(f"{count} {name}" for name, count in left_out.items())
        notes.append(f"left out, they have no shape here: {words}")
    groups = {f"property {n}": np.array([cells.rows[i] for i in ids]) for n, ids in properties.items()}
    return RawMesh(nodes.points, cells.blocks(nodes), nodes.ids, cell_groups=groups, notes=notes)


def read_modes(path: Path, progress: Progress = SILENT) -> RawModes:
    """A deck holds no mode shapes: always ``LoadError``."""
    raise LoadError("holds no mode shapes", file=path, found="a text deck", do="give the file that has the results")


def _grid(card: _Card, nodes: Nodes) -> None:
    number = whole(card.line, card.field(0), "a node id")
    if card.field(1) not in ("", "0"):
        raise _local(card, card.field(1))
    try:
        x, y, z = (_number(card.field(i)) for i in (2, 3, 4))
    except ValueError as error:
        raise card.line.error(
            "a coordinate is no number", found=repr(str(error))[:40], expected="numbers with a decimal point"
        ) from None
    nodes.add(card.line, number, (x, y, z))


def _local(card: _Card, system: str) -> LoadError:
    return card.line.error(
        "nodes are given in a local system of coordinates, which is not understood",
        found=f"{card.name} in system {system[:20]}",
        expected="the basic system (0 or blank)",
        do="write the nodes in the basic system, or export .vtu or .msh",
    )


def _cell(card: _Card, cells: Cells) -> int:
    shape, line = _SHAPES[card.name], card.line
    number = whole(line, card.field(0), "an element id")
    for kind in sorted(shape.kinds, key=lambda name: -KINDS[name].n_nodes):
        size, corners = KINDS[kind].n_nodes, KINDS[kind].n_corners
        given = [card.field(shape.first + i) for i in range(size)]
        if all(given):
            nodes = [whole(line, text, "a node id") for text in given]
            cells.add(line, kind, number, nodes, _ORDER.get(kind))
            return number
        if all(given[:corners]) and any(given[corners:]):
            raise line.error(
                "some mid-side nodes are missing, which is not understood",
                found=f"{sum(map(bool, given))} of {size} nodes in {card.name} {number}",
                expected="all or none",
            )
    expected = " or ".join(str(KINDS[kind].n_nodes) for kind in shape.kinds)
    found = sum(bool(text) for text in card.fields[shape.first :])
    raise line.error("an element has too few nodes", found=f"{found} in {card.name} {number}", expected=expected)


# --- cards ---


def _cards(path: Path) -> Iterator[_Card]:
    """Cards of the bulk section with their continuations. Fields are stripped."""
    bulk = not _has_bulk(path)
    needs_end = not bulk
    card: _Card | None = None
    for line in lines_of(path, _included):
        text = line.text.split("$", 1)[0].rstrip()
        if not text:
            continue
        start = text.lstrip()[:6].upper()
        if start.rstrip() == "BEGIN":
            if text.upper().split()[1:2] not in (["BULK"], []):
                raise line.error("holds several bulk sections, which is not understood", found=text.strip()[:40])
            bulk = True
            continue
        if not bulk:
            continue
        if start == "ENDDAT":
            needs_end = False
            break
        name, fields = _fields(line, text)
        if not name:
            if card is None:
                raise line.error("a continuation follows nothing", found=text[:40])
            card.fields.extend(fields)
            if len(card.fields) > 100_000:
                raise line.error("a card has too many continuations")
            continue
        if card is not None:
            yield card
        card = _Card(name, fields, line)
    if needs_end:
        raise LoadError("ends without ENDDATA", file=path, do="the deck may be cut short: write it again")
    if card is not None:
        yield card


def _has_bulk(path: Path) -> bool:
    return any(line.text.lstrip()[:16].upper().split()[:2] == ["BEGIN", "BULK"] for line in lines_of(path, _included))


def _included(line: Line) -> str | None:
    if line.text.lstrip()[:1] not in ("I", "i"):  # nearly every line
        return None
    match = re.match(r"\s*INCLUDE\b\s*(.*)", line.text, re.I)
    return match[1].split("$")[0].strip().strip("'\"") if match else None


def _fields(line: Line, text: str) -> tuple[str, list[str]]:
    """Name of the card ("" for a continuation) and its fields, eight to a line or four in wide columns."""
    if "\t" in text:
        raise line.error("holds a tab, which parts no fields here", found=text[:40], do="put blanks or commas")
    if "," in text:
        words = [word.strip() for word in text.split(",")]
        head, given = words[0], words[1:]
        count = 4 if head.endswith("*") or head.startswith("*") else 8
        fields = (given + [""] * count)[:count]
    else:
        head = text[:8].strip()
        width = 16 if head.endswith("*") or head.startswith("*") else 8
        fields = [text[at : at + width].strip() for at in range(8, 72, width)]
    name = head.upper().rstrip("*")
    if (name == "GRID" or name in _SHAPES) and " " in "".join(fields):
        word = next(word for word in fields if " " in word)
        raise line.error("fields do not stand in columns of 8 or 16", found=repr(word))
    return ("", fields) if not name or name[0] in "+*" else (name, fields)


def _number(text: str) -> float:
    """Real numbers have a decimal point; without that rule, decimal commas would shift the fields unseen."""
    if not text:
        return 0.0
    if "_" in text or not text.isascii() or not re.search(r"[.a-zA-Z]", text):
        raise ValueError(text)
    match = _SPECIAL.fullmatch(text)
    word = f"{match[1]}e{match[2]}" if match and match[1].strip("+-.") else re.sub("[dD]", "e", text, count=1)
    try:
        return float(word)
    except ValueError:
        raise ValueError(text) from None

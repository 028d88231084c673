"""XML as a tree, with document types and entities refused and nesting bounded."""

from __future__ import annotations

import xml.parsers.expat
from pathlib import Path
from xml.etree.ElementTree import Element, TreeBuilder

from viewer.errors import LoadError

_LARGEST, _DEEPEST = 2_000_000_000, 60


def parse_tree(path: Path) -> Element:
    """The root element. Raises ``LoadError``."""
    if path.stat().st_size > _LARGEST:
        raise LoadError("is too large for text", file=path, do="keep the numbers in an HDF5 file beside it")
    builder, depth = TreeBuilder(), 0

    def refuse(*_: object) -> None:
        raise LoadError("declares a document type or entities", file=path, expected="plain XML", do="remove them")

    def start(tag: str, given: dict[str, str]) -> None:
        nonlocal depth
        depth += 1
        if depth > _DEEPEST:
            raise LoadError("is nested too deeply", file=path, place=f"line {parser.CurrentLineNumber}")
        builder.start(tag, given)

    def end(tag: str) -> None:
        nonlocal depth
        depth -= 1
        builder.end(tag)

    parser = xml.parsers.expat.ParserCreate()
    parser.StartDoctypeDeclHandler = parser.EntityDeclHandler = refuse
    parser.StartElementHandler, parser.EndElementHandler = start, end
    parser.CharacterDataHandler = builder.data
    parser.buffer_text, parser.buffer_size = True, 1 << 20
    try:
        parser.Parse(path.read_bytes(), True)
    except xml.parsers.expat.ExpatError as error:
        raise LoadError(
            "is not a complete XML file",
            file=path,
            place=f"line {error.lineno}",
            found=str(error),
            do="write it again; it may be cut short",
        ) from None
    return builder.close()

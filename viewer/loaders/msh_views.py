"""``$NodeData`` sections of ``.msh`` files, read here because meshio fails on partial ones and keeps only the last
of several with the same name. Layout: the published description of the MSH file format.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np

from viewer.errors import LoadError
from viewer.model.arrays import Array

_SECTION = re.compile(rb"^\$(NodeData|ElementData|ElementNodeData)[ \t]*\r?\n", re.M)


@dataclass(frozen=True)
class NodeView:
    """One view: its name, the tags of the nodes it covers, values (n, components)."""

    name: str
    tags: Array
    values: Array


def split_views(data: bytes) -> tuple[bytes, list[NodeView]]:
    """The file without its data sections, and the node views in the order of the file. Raises ``LoadError``."""
    rest, views, at = [], [], 0
    binary = re.match(rb"\s*\$MeshFormat\s+\S+\s+1\s", data) is not None
    while (match := _SECTION.search(data, at)) is not None:
        rest.append(data[at : match.start()])
        name = match[1]
        close = data.find(b"$End" + name, match.end())
        if close < 0:
            raise LoadError(
                "a section does not end", place=f"${name.decode()}", do="the file is cut short: write it again"
            )
        if name == b"NodeData":
            view, end = _view(data, match.end(), close, binary)
            views.append(view)
            close = data.find(b"$End" + name, end)  # bytes of numbers may look like the end
        at = close + len(b"$End" + name)
    return b"".join([*rest, data[at:]]), views


def _view(data: bytes, start: int, close: int, binary: bool) -> tuple[NodeView, int]:
    place = "$NodeData"

    def line() -> bytes:
        nonlocal start
        end = data.find(b"\n", start)
        if end < 0:
            raise LoadError("a section ends early", place=place)
        text, start = data[start:end].strip(), end + 1
        return text

    def number() -> int:
        text = line()
        if not re.fullmatch(rb"\d{1,12}", text):
            raise LoadError("expected a count", place=place, found=repr(text[:40]))
        return int(text)

    strings = [line() for _ in range(min(number(), 100))]
    name = strings[0].strip(b'"').decode("utf-8", "replace") if strings else "view"
    place = f"$NodeData '{name}'"
    for _ in range(min(number(), 100)):
        line()
    integers = [number() for _ in range(min(number(), 100))]
    if len(integers) < 3 or integers[1] not in (1, 3, 9):
        raise LoadError(
            "integer tags are not as expected",
            place=place,
            found=str(integers),
            expected="time step, 1, 3 or 9 components, number of nodes",
        )
    components, count = integers[1], integers[2]
    if binary:
        record = np.dtype([("tag", "<i4"), ("values", "<f8", (components,))])
        if count * record.itemsize > len(data) - start:
            raise LoadError("declares more than the file can hold", place=place, found=f"{count} nodes")
        table = np.frombuffer(data, record, count, start)
        return NodeView(name, table["tag"].astype(np.int64), table["values"].copy()), start + count * record.itemsize
    words = data[start:close].split()
    if len(words) != count * (components + 1):
        raise LoadError(
            "the number of values is not the one declared",
            place=place,
            found=str(len(words)),
            expected=str(count * (components + 1)),
        )
    try:
        values = np.array(words, "S").astype(np.float64).reshape(count, components + 1)
    except ValueError as error:
        raise LoadError("holds something that is no number", place=place, found=str(error)[:80]) from None
    return NodeView(name, values[:, 0].astype(np.int64), values[:, 1:]), close

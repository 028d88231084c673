"""Readers for formats of your own: what a plug-in gives and gets.

A plug-in is an installed package with an entry point in the group ``hingelight.readers``. The entry point names a
module (or an object) with

``SUFFIXES``                     suffixes in lower case, as ``(".acme",)``
``read_mesh(path, progress)``    → :class:`RawMesh`
``read_modes(path, progress)``   → :class:`RawModes`

Only arrays are fetched there: points in the file's unit, node rows from 0 in VTK's order, ids, groups as rows.
Indices, numbers, ids, orientation, units and the joining of shapes to the mesh by node id are checked afterwards,
alike for all formats. Raise :class:`LoadError` with the place, what was found and what was expected; anything else
that is raised is put into one. Call ``progress.tick("reading …")`` now and then, so that reading can be cancelled.
Suffixes that Hingelight reads itself stay with it; a plug-in that cannot be loaded does not disturb the others.

A full example, ``acme_readers.py``, for a text file of lines ``node ID X Y Z``, ``tri ID N1 N2 N3`` and
``mode HZ`` followed by ``u ID UX UY UZ``::

    import numpy as np
    from viewer.loaders.plugin_api import ArrayShapes, LoadError, RawBlock, RawMesh, RawModes

    SUFFIXES = (".acme",)

    def _rows(path, word):
        with open(path, encoding="utf-8") as stream:
            for number, line in enumerate(stream, 1):
                if line.split()[:1] == [word]:
                    try:
                        yield [float(text) for text in line.split()[1:]]
                    except ValueError:
                        raise LoadError("holds no number", place=f"line {number}", found=line.strip()) from None

    def read_mesh(path, progress):
        nodes = np.array(list(_rows(path, "node")), float).reshape(-1, 4)
        cells = np.array(list(_rows(path, "tri")), np.int64).reshape(-1, 4)
        row = {int(number): at for at, number in enumerate(nodes[:, 0])}
        try:
            corners = np.array([[row[n] for n in cell] for cell in cells[:, 1:].tolist()], np.int64).reshape(-1, 3)
        except KeyError as error:
            raise LoadError("an element names a node that does not exist", found=f"node {error}") from None
        return RawMesh(nodes[:, 1:], [RawBlock("tri3", corners, cells[:, 0])], node_ids=nodes[:, 0])

    def read_modes(path, progress):
        freq = np.array([values[0] for values in _rows(path, "mode")])
        moved = np.array(list(_rows(path, "u")), float).reshape(len(freq), -1, 4)
        return RawModes(ArrayShapes(moved[:, :, 1:]), freq, node_ids=moved[0, :, 0])

and in its ``pyproject.toml``::

    [project.entry-points."hingelight.readers"]
    acme = "acme_readers"
"""

from __future__ import annotations

import functools
import re
from collections.abc import Mapping
from importlib.metadata import entry_points
from pathlib import Path
from types import MappingProxyType
from typing import NamedTuple, Protocol

from viewer.errors import HingelightError, LoadError
from viewer.jobs import Progress
from viewer.loaders.raw_data import RawBlock, RawMesh, RawModes
from viewer.model.modes import ArrayShapes

__all__ = ["GROUP", "ArrayShapes", "LoadError", "Progress", "RawBlock", "RawMesh", "RawModes", "Reader"]

GROUP = "hingelight.readers"


class Reader(Protocol):
    """What an entry point names."""

    SUFFIXES: tuple[str, ...]

    def read_mesh(self, path: Path, progress: Progress) -> RawMesh:
        """The mesh in the file."""

    def read_modes(self, path: Path, progress: Progress) -> RawModes:
        """The mode shapes in the file."""


class PlugIn:
    """A plug-in's reader whose failures name it."""

    def __init__(self, name: str, reader: Reader) -> None:
        self._name, self._reader = name, reader

    def read_mesh(self, path: Path, progress: Progress) -> RawMesh:
        return self._asked("read_mesh", RawMesh, path, progress)

    def read_modes(self, path: Path, progress: Progress) -> RawModes:
        return self._asked("read_modes", RawModes, path, progress)

    def _asked(self, what: str, kind: type, path: Path, progress: Progress):
        try:
            answer = getattr(self._reader, what)(path, progress)
        except (HingelightError, OSError, MemoryError):
            raise
        except (Exception, SystemExit) as error:
            raise LoadError(
                f"the plug-in '{self._name}' failed on this file",
                file=path,
                found=" ".join(f"{type(error).__name__}: {error}".split())[:200],
                do="check the file; if it is right, tell those who wrote the plug-in",
            ) from error
        if not isinstance(answer, kind):
            raise LoadError(
                f"the plug-in '{self._name}' gave something else than it should",
                file=path,
                found=type(answer).__name__,
                expected=kind.__name__,
                do="tell those who wrote the plug-in",
            )
        return answer


class PlugIns(NamedTuple):
    """Readers by suffix, and what kept others from being loaded, in words."""

    by_suffix: Mapping[str, PlugIn]
    faults: tuple[str, ...]


@functools.cache
def plug_ins() -> PlugIns:
    """Every installed plug-in, loaded once. Never raises: a broken one becomes a fault."""
    found: dict[str, PlugIn] = {}
    faults = []
    for point in sorted(entry_points(group=GROUP), key=lambda point: (point.name, point.value)):
        try:
            reader = point.load()
            suffixes = tuple(reader.SUFFIXES)
            for suffix in suffixes:
                if not re.fullmatch(r"\.[a-z0-9_+-]{1,20}", suffix):
                    raise ValueError(f"suffix {suffix!r}")
            if not callable(reader.read_mesh) or not callable(reader.read_modes):
                raise TypeError("read_mesh and read_modes are no functions")
        except (Exception, SystemExit) as error:
            words = " ".join(f"{type(error).__name__}: {error}".split())
            faults.append(f"plug-in '{point.name}' could not be loaded: {words}"[:200])
            continue
        for suffix in suffixes:
            if suffix in found:
                faults.append(f"plug-in '{point.name}' comes second for {suffix} and is not asked")
            else:
                found[suffix] = PlugIn(point.name, reader)
    return PlugIns(MappingProxyType(found), tuple(faults))

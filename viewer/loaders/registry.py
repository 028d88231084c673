"""The one door: which module reads which file, and every failure turned into a ``LoadError``."""

from __future__ import annotations

import importlib
import os
from collections.abc import Callable, Sequence
from dataclasses import replace
from pathlib import Path
from types import ModuleType
from typing import Any

from viewer.errors import HingelightError, LoadError
from viewer.jobs import SILENT, Progress
from viewer.loaders.hammer_runs import merge_runs
from viewer.loaders.raw_data import RawMesh, RawModes, ReadReport, finish_mesh, finish_modes
from viewer.loaders.raw_tests import finish_test
from viewer.loaders.vtu_xml import OtherReaderNeeded
from viewer.model.mesh import Mesh
from viewer.model.modes import ModeSet
from viewer.model.testset import TestSet

# Modules with SUFFIXES, read_mesh(path, progress), read_modes(path, progress) and perhaps write(path, mesh, modes,
# progress). They are imported when their suffix turns up. Plug-ins come after them, formats of the worker last.
_OWN = {
    ".vtu": "vtu_files",
    ".vtkhdf": "vtkhdf_files",
    ".xdmf": "xdmf_files",
    ".xmf": "xdmf_files",
    ".inp": "deck_keywords",
    ".bdf": "deck_cards",
    ".nas": "deck_cards",
    ".fem": "deck_cards",
    ".npz": "npz_files",
    ".h5": "hdf5_files",
    ".hdf5": "hdf5_files",
    ".csv": "csv_tables",
    ".unv": "universal_files",
    ".uff": "universal_files",
    ".e": "exodus_files",
    ".exo": "exodus_files",
    ".ex2": "exodus_files",
}
# Modules with read_runs(path, progress) for test sets.
_TESTS = {".csv": "hammer_tables", ".unv": "hammer_universal", ".uff": "hammer_universal"}
_WRITTEN = (".vtu", ".vtkhdf", ".npz", ".h5", ".hdf5", ".csv", ".unv", ".uff")
_WORKER = "meshio_files"
# First bytes that give a container away, whatever the suffix says; some formats come in either container.
_EITHER = (".e", ".exo", ".ex2")
_SIGNATURES = (
    (b"PK\x03\x04", "a zip archive (.npz)", (".npz",)),
    (b"\x89HDF\r\n\x1a\n", "an HDF5 file", (".h5", ".hdf5", ".med", ".vtkhdf")),
)


def read_mesh(path: str | os.PathLike[str], length_unit: float = 1.0, progress: Progress = SILENT) -> Mesh:
    """Read a mesh; ``length_unit`` metres per unit of length in the file. Raises ``LoadError``."""
    return read_mesh_report(path, length_unit, progress)[0]


def read_mesh_report(
    path: str | os.PathLike[str], length_unit: float = 1.0, progress: Progress = SILENT
) -> tuple[Mesh, ReadReport]:
    """As :func:`read_mesh`, with what was noticed in words: cells put right, kinds left out, implausible size."""

    def work(file: Path) -> tuple[Mesh, ReadReport]:
        raw: RawMesh = _through(file, "read_mesh", progress)
        progress.tick("checking the mesh")
        return finish_mesh(raw, file, length_unit)

    return _guarded(path, work)


def read_modes(
    path: str | os.PathLike[str], mesh: Mesh, length_unit: float = 1.0, progress: Progress = SILENT
) -> ModeSet:
    """Read mode shapes and join them to ``mesh`` by node id: rows come in the order of ``mesh.node_ids``.

    Shapes of large uncompressed files stay in the file and are read one at a time; an error in them (a number that
    is not finite) then shows when that mode is asked for. Frequencies that the file lacks come from a table
    ``NAME_frequencies.csv`` beside it (columns mode, freq_hz and perhaps damping). Raises ``LoadError``.
    """

    def work(file: Path) -> ModeSet:
        raw: RawModes = _through(file, "read_modes", progress)
        if raw.freq_hz is None:
            csv_tables = _module("csv_tables")
            table = csv_tables.frequency_table(file)
            if table.is_file():
                freq, damping = csv_tables.read_frequencies(table, raw.shapes.count)
                raw = replace(raw, freq_hz=freq, damping=damping)
        return finish_modes(raw, mesh, file, length_unit)

    return _guarded(path, work)


def read_test(
    path: str | os.PathLike[str] | Sequence[str | os.PathLike[str]],
    length_unit: float | None = None,
    progress: Progress = SILENT,
) -> TestSet:
    """Read a test set from a universal file or a set of tables; of several, which are runs of one test, merge them.

    ``length_unit`` metres per unit of length of the points; None where the files state it. The set is named after
    the (first) file. Raises ``LoadError``.
    """
    files = [path] if isinstance(path, str | os.PathLike) else list(path)
    runs = [run for file in files for run in _guarded(file, lambda p: _runs(p, length_unit, progress))]
    return _guarded(files[0], lambda _: merge_runs(runs))


def _runs(file: Path, length_unit: float | None, progress: Progress) -> list[TestSet]:
    suffix = file.suffix.lower()
    progress.tick(f"reading {file.name}")
    if suffix not in _TESTS:
        raise LoadError(
            "unknown format of a test",
            file=file,
            found=suffix or "no suffix",
            expected=f"one of: {', '.join(_TESTS)}",
        )
    return [finish_test(raw, file, length_unit) for raw in _module(_TESTS[suffix]).read_runs(file, progress)]


def write_interchange(
    path: str | os.PathLike[str], mesh: Mesh, modes: ModeSet | None = None, progress: Progress = SILENT
) -> Path:
    """Write a mesh and its mode shapes in metres as .vtu, .vtkhdf, .npz, .h5 or .csv; to six digits as .unv.

    Atomic; returns the path.

    Raises ``LoadError`` when the suffix is none of these or the modes are not those of the mesh, ``ExportError``
    when the place cannot be written.
    """
    target = Path(path)
    suffix = target.suffix.lower()
    if suffix not in _WRITTEN:
        raise LoadError(
            "cannot be written in this format",
            file=target,
            found=target.suffix or "no suffix",
            expected=f"one of: {', '.join(_WRITTEN)}",
        )
    if modes is not None and (len(modes.node_ids) != mesh.n_nodes or not (modes.node_ids == mesh.node_ids).all()):
        raise LoadError(
            "the mode shapes are not those of the mesh", file=target, expected="equal node ids in equal order"
        )
    _module(_OWN[suffix]).write(target, mesh, modes, progress)
    return target


def _module(name: str) -> ModuleType:
    return importlib.import_module(f"viewer.loaders.{name}")


def _through(file: Path, what: str, progress: Progress) -> Any:
    """Call ``what`` of the module that reads ``file``."""
    suffix = file.suffix.lower()
    progress.tick(f"reading {file.name}")
    if suffix not in _OWN:
        plug_ins = _module("plugin_api").plug_ins()
        if suffix in plug_ins.by_suffix:
            return getattr(plug_ins.by_suffix[suffix], what)(file, progress)
        worked = _module(_WORKER).suffixes()
        if suffix not in worked:
            raise LoadError(
                "unknown format",
                file=file,
                found=suffix or "no suffix",
                expected=f"one of: {', '.join(sorted({*_OWN, *worked, *plug_ins.by_suffix}))}",
                do="; ".join(plug_ins.faults),
            )
    try:
        return getattr(_module(_OWN.get(suffix, _WORKER)), what)(file, progress)
    except OtherReaderNeeded:
        return getattr(_module(_WORKER), what)(file, progress)


def _guarded(path: str | os.PathLike[str], work: Callable[[Path], Any]) -> Any:
    file = Path(path)
    try:
        _check_file(file)
        return work(file)
    except HingelightError as error:
        raise error.at(file=file) from None
    except OSError as error:
        raise LoadError("cannot be opened", file=file, found=error.strerror or str(error)) from None
    except MemoryError:
        raise LoadError("needs more memory than there is", file=file, do="read it on a larger machine") from None
    except (Exception, SystemExit) as error:
        raise LoadError(
            "cannot be read",
            file=file,
            found=f"{type(error).__name__}: {error}"[:300],
            do="check that the file is complete and of the format that its suffix says",
        ) from error


def _is_set_of_tables(file: Path) -> bool:
    return _module("csv_tables").has_tables(file) or _module("hammer_tables").set_exists(file)


def _check_file(file: Path) -> None:
    if file.suffix.lower() == ".csv" and not file.exists() and _is_set_of_tables(file):
        return  # named by what the names of its tables have in common
    if file.is_dir():
        raise LoadError("is a folder", expected="a file", do="name a file in it")
    if not file.exists():
        raise LoadError("there is no such file", do="check the path")
    if not file.is_file():
        raise LoadError("is not an ordinary file")
    if file.stat().st_size == 0:
        raise LoadError("is empty")
    with file.open("rb") as stream:
        head = stream.read(16)
    suffix = file.suffix.lower()
    for signature, words, suffixes in _SIGNATURES:
        if suffix in _EITHER and head.startswith(signature):
            continue  # the reader looks for itself
        if head.startswith(signature) != (suffix in suffixes) and (suffix in suffixes or suffix in _OWN):
            raise LoadError(
                "its content is not what its suffix says",
                place="first bytes",
                found=words if head.startswith(signature) else repr(head[:8]),
                expected=f"a {suffix} file",
                do="rename it, or write it again",
            )

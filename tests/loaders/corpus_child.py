"""The process that reads the corpus: bounded memory, one line of JSON a case, its answer another."""

from __future__ import annotations

import json
import os
import sys
from pathlib import Path

LIMIT = 3 << 30  # bytes of address space, for this process and the reader worker it starts
WORKER_SECONDS = 30.0


def _tree(folder: Path) -> dict[str, int]:
    return {str(path): path.stat().st_size for path in folder.rglob("*")}


def _read(path: Path, whole: Path | None, may: str) -> dict[str, object]:
    from viewer.loaders import read_mesh, read_modes

    mesh = read_mesh(whole) if whole is not None else None
    try:
        modes = read_modes(whole, mesh) if whole is not None else None
    except Exception:
        modes = None
    found = read_mesh(path)
    if mesh is None:
        return {"read": "nothing to compare with"}
    differs = _differs(mesh, found, may)
    if differs or modes is None:
        return {"read": differs or may or "equal"}
    read = read_modes(path, mesh)
    for index in range(read.count):
        if not (read.shape(index) == modes.shape(index)).all():
            return {"read": f"mode {index + 1} differs"}
    if read.freq_hz.tolist() != modes.freq_hz.tolist():
        return {"read": "frequencies differ"}
    return {"read": may or "equal"}


def _differs(mesh, found, may: str) -> str:
    """ "" when ``found`` is ``mesh``, or, if that may be, a first part of it."""
    part = slice(None) if may != "part" else slice(found.n_nodes)
    if not (found.points.shape == mesh.points[part].shape and (found.points == mesh.points[part]).all()):
        return "points differ"
    if may == "part":
        return "" if found.n_cells <= mesh.n_cells else "more cells than there were"
    same = [b.kind for b in found.blocks] == [b.kind for b in mesh.blocks] and all(
        (a.nodes == b.nodes).all() for a, b in zip(found.blocks, mesh.blocks, strict=True)
    )
    return "" if same else "cells differ"


def main() -> None:
    sys.path.insert(0, str(Path(__file__).resolve().parents[2]))
    answers = os.fdopen(os.dup(1), "w", encoding="utf-8")
    os.dup2(2, 1)
    try:
        import resource

        resource.setrlimit(resource.RLIMIT_AS, (LIMIT, LIMIT))
    except (ImportError, ValueError, OSError):
        resource = None  # type: ignore[assignment]
    from tests.loaders.corpus import cases
    from viewer.errors import HingelightError
    from viewer.loaders.worker_client import shared_worker

    shared_worker()._time_limit = WORKER_SECONDS
    known = {case.name: case for case in cases()}
    for line in sys.stdin:
        request = json.loads(line)
        case, folder = known[request["case"]], Path(request["folder"])
        path = case.make(folder)
        os.chdir(folder)
        before = _tree(folder)
        try:
            answer = _read(path, case.whole(folder), case.may)
        except HingelightError as error:
            answer = {"error": str(error), "type": type(error).__name__}
        except BaseException as error:
            answer = {"crash": f"{type(error).__name__}: {error}"}
        answer["left"] = sorted(set(_tree(folder).items()) ^ set(before.items()))
        if resource is not None:
            answer["peak"] = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024
        answers.write(json.dumps(answer) + "\n")
        answers.flush()


if __name__ == "__main__":
    main()

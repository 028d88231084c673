"""Coverage-guided fuzzing of the parsers that run in our own process.

``pip install .[fuzz]`` (Linux), then for example ``python tests/fuzz/fuzz_vtu.py -max_total_time=600``. Further
arguments go to the fuzzer: a folder keeps what was found interesting, ``-artifact_prefix=FOLDER/`` says where inputs
that broke something are written; such an input as the only argument runs it once.

An input counts as broken when reading it ends in anything but a ``HingelightError`` in foreseen words, gives arrays
that are not as promised, takes more than 20 s or 2.5 GB.
"""

from __future__ import annotations

import contextlib
import shutil
import sys
import tempfile
from collections.abc import Callable, Iterable
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))


def fuzz(read: Callable[[Path], None], write: Callable[[Path, bytes], Path], seeds: Iterable[bytes]) -> None:
    """Run the fuzzer on ``read(write(folder, data))``, starting from ``seeds``."""
    import atheris

    with contextlib.ExitStack() as stack:
        folder = Path(stack.enter_context(tempfile.TemporaryDirectory(prefix="hingelight-fuzz-")))
        start = folder / "seeds"
        start.mkdir()
        for number, data in enumerate(seeds):
            (start / f"seed-{number}").write_bytes(data)
        place = folder / "input"

        def once(data: bytes) -> None:
            from viewer.errors import HingelightError

            shutil.rmtree(place, ignore_errors=True)
            place.mkdir()
            try:
                read(write(place, data))
            except HingelightError as error:
                if "cannot be read; found" in str(error) or _our_own_slip(error):
                    raise AssertionError(f"a failure that no check foresaw: {error}") from error

        given = [argument for argument in sys.argv[1:] if not argument.startswith("-")]
        own = [] if any(Path(argument).is_file() for argument in given) else [str(start)]
        limits = ["-timeout=20", "-rss_limit_mb=2500", "-max_len=20000"]
        # folders in the order in which the fuzzer takes them: the first one is added to
        atheris.Setup([sys.argv[0], *limits, *sys.argv[1:], *own], once)
        atheris.Fuzz()


def fuzz_format(name: str, seeds: Callable[[Path], Iterable[bytes]]) -> None:
    """Fuzz one file format through the one door; ``seeds(folder)`` makes good files."""
    instrumented()
    with tempfile.TemporaryDirectory(prefix="hingelight-seeds-") as folder:
        start = list(seeds(Path(folder)))
    fuzz(read_all, lambda place, data: _written(place / name, data), start)


def instrumented() -> None:
    """Import the loaders so that the fuzzer sees which branches an input takes."""
    import atheris

    with atheris.instrument_imports(include=["viewer.loaders", "viewer.model"]):
        import viewer.loaders.array_layout
        import viewer.loaders.csv_tables
        import viewer.loaders.deck_cards
        import viewer.loaders.deck_keywords
        import viewer.loaders.dossier_file
        import viewer.loaders.exodus_files
        import viewer.loaders.hammer_tables
        import viewer.loaders.hammer_universal
        import viewer.loaders.hdf5_files
        import viewer.loaders.npz_files
        import viewer.loaders.registry
        import viewer.loaders.universal_files
        import viewer.loaders.vtkhdf_files
        import viewer.loaders.vtu_files
        import viewer.loaders.xdmf_files  # noqa: F401
    from viewer.errors import LoadError
    from viewer.loaders import meshio_files

    def not_here() -> None:
        raise LoadError("is left to the worker, which is not fuzzed here")

    meshio_files.shared_worker = not_here  # type: ignore[assignment]


def read_all(path: Path) -> None:
    """Mesh, and shapes on it, to the last number; everything promised is checked."""
    import numpy as np

    from viewer.errors import HingelightError
    from viewer.loaders import read_mesh, read_modes

    try:
        mesh = read_mesh(path)
    except HingelightError as error:
        if "cannot be read; found" in str(error):
            raise
        mesh = _any_mesh()
    assert np.isfinite(mesh.points).all()
    assert all(b.nodes.min() >= 0 and b.nodes.max() < mesh.n_nodes for b in mesh.blocks)
    assert len(np.unique(mesh.node_ids)) == mesh.n_nodes
    assert len(np.unique(mesh.cell_ids)) == mesh.n_cells
    assert all(((rows >= 0) & (rows < mesh.n_cells)).all() for rows in mesh.cell_groups.values())
    modes = read_modes(path, mesh)
    for index in range(min(modes.count, 50)):
        assert modes.shape(index).shape == (mesh.n_nodes, 3)
        assert np.isfinite(modes.shape(index)).all()


def read_hammer_test(path: Path) -> None:
    """A test set; everything promised is checked, and what is written of it reads the same."""
    import numpy as np

    from viewer.loaders import read_test, write_test

    test = read_test(path, None if path.suffix == ".unv" else 0.001)
    assert all(np.isfinite(array).all() for array in (test.points, test.directions, test.freq_hz, test.shapes))
    assert np.allclose(np.linalg.norm(test.directions, axis=1), 1, atol=1e-9)
    assert (test.freq_hz > 0).all() and (np.diff(test.freq_hz) >= 0).all()
    assert ((test.lines >= 0) & (test.lines < len(test.labels))).all()
    again = read_test(write_test(path.with_name("again.csv"), test), 1.0)
    assert np.array_equal(again.shapes, test.shapes) and np.array_equal(again.sensor, test.sensor)


def small_tests():
    """A hammer test of two modes, real and complex."""
    from viewer.model.testset import TestSet

    for factor in (1, 1 + 0.1j):
        shapes = [[factor, 2, 3], [1, -2 * factor, 0.5]]
        directions = [[1, 0, 0], [0, 0, -1], [0, 1, 0]]
        points = [[0, 0, 0], [0.5, 0, 0], [0.5, 0.25, 1]]
        yield TestSet(
            "a", ("1", "2", "5"), points, [[0, 1], [1, 2]], [0, 1, 1], directions, [5.0, 9], shapes, [0.01, 0.02]
        )


def _our_own_slip(error: BaseException) -> bool:
    """Whether "the file is damaged" stands for an error that no library raised but our own code."""
    trace, last = error.__context__.__traceback__ if error.__context__ is not None else None, ""
    while trace is not None:
        last, trace = trace.tb_frame.f_code.co_filename, trace.tb_next
    return "is damaged or no" in str(error) and "/viewer/" in last


def small_mesh():
    """Two cells, a group of either kind."""
    from viewer.model.mesh import CellBlock, Mesh

    points = [[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1], [1, 1, 0]]
    blocks = (CellBlock("tet4", [[0, 1, 2, 3]], [7]), CellBlock("tri3", [[1, 4, 2]], [9]))
    return Mesh(points, blocks, [5, 4, 3, 2, 1], {"a": [0, 1]}, {"b": [1]})


def small_modes(is_complex: bool = False):
    import numpy as np

    from viewer.model.modes import ArrayShapes, ModeSet

    moved = np.arange(30.0).reshape(2, 5, 3) * (1 + 1j if is_complex else 1)
    return ModeSet([5, 4, 3, 2, 1], [3.0, 3.0], ArrayShapes(moved, moved), [0.01, 0.02], "mass")


def written_files(folder: Path, suffix: str) -> Iterable[bytes]:
    """Files of a format that we write: mesh alone, with modes, with complex ones."""
    from viewer.loaders import write_interchange

    for modes in (None, small_modes(), small_modes(True)):
        yield write_interchange(folder / f"seed{suffix}", small_mesh(), modes).read_bytes()


def _any_mesh():
    return small_mesh()


def _written(path: Path, data: bytes) -> Path:
    path.write_bytes(data)
    return path

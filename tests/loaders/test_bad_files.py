"""Random damage, tables cut anywhere, failures deep inside. Bad files by class of fault stand in test_corpus.py."""

import numpy as np
import pytest

from tests.loaders.corpus_vtu import VTU
from tests.loaders.samples import (
    assert_same_mesh,
    assert_same_modes,
    clear,
    make_mesh,
    make_modes,
    read_all,
)
from viewer.errors import LoadError
from viewer.loaders import read_mesh, write_interchange

SUFFIXES = (".vtu", ".vtkhdf", ".npz", ".h5", ".csv")


# --- cut short, everywhere ---


@pytest.mark.parametrize("percent", [1, 10, 30, 50, 70, 90])
@pytest.mark.parametrize("table", ["cut.csv", "cut_nodes.csv", "cut_elements.csv", "cut_frequencies.csv"])
def test_table_cut_short(tmp_path, mesh, modes, table, percent):
    path = write_interchange(tmp_path / "cut.csv", mesh, modes)
    data = (tmp_path / table).read_bytes()
    (tmp_path / table).write_bytes(data[: len(data) * percent // 100])
    try:
        found, read, _ = read_all(path, mesh)
    except LoadError as error:
        clear(error, path)
    else:  # a cut between two lines of elements leaves a smaller mesh, which nothing can tell
        assert table == "cut_elements.csv"
        assert found.n_cells < mesh.n_cells
        assert_same_modes(modes, read)


@pytest.mark.parametrize("suffix", [".vtu", ".vtkhdf", ".npz", ".h5"])
@pytest.mark.parametrize("seed", range(25))
def test_bytes_turned(tmp_path, mesh, modes, suffix, seed):
    """Random damage: an error of ours, or arrays of the right size."""
    path = write_interchange(tmp_path / f"hit{suffix}", mesh, modes)
    data, rng = bytearray(path.read_bytes()), np.random.default_rng(seed)
    for at in rng.integers(0, len(data), 3):
        data[at] ^= int(rng.integers(1, 256))
    path.write_bytes(bytes(data))
    try:
        found, _, shapes = read_all(path, mesh)
    except LoadError as error:
        clear(error, path)
    else:
        assert found.points.shape == (found.n_nodes, 3)
        assert np.isfinite(found.points).all()
        assert all(np.isfinite(shape).all() and shape.shape == (mesh.n_nodes, 3) for shape in shapes)
        assert all(b.nodes.min() >= 0 and b.nodes.max() < found.n_nodes for b in found.blocks)


# --- at the door ---


def test_unexpected_failures_become_ours(tmp_path, monkeypatch, mesh):
    """Even a reader that ends the process with SystemExit."""
    from viewer.loaders import npz_files

    path = write_interchange(tmp_path / "a.npz", mesh)
    for failure in (SystemExit(1), RuntimeError("odd"), MemoryError(), RecursionError(), PermissionError(13, "no")):

        def broken(*_, failure=failure):
            raise failure

        monkeypatch.setattr(npz_files, "read_mesh", broken)
        with pytest.raises(LoadError) as caught:
            read_mesh(path)
        clear(caught.value, path, foreseen=False)


def test_the_hand_written_file_is_right(tmp_path):
    (tmp_path / "a.vtu").write_text(VTU)
    mesh, modes, shapes = read_all(tmp_path / "a.vtu", read_mesh(tmp_path / "a.vtu"))
    assert mesh.blocks[0].nodes.tolist() == [[0, 1, 2], [1, 3, 2]]
    assert mesh.node_ids.tolist() == [4, 3, 2, 1]
    assert modes.freq_hz.tolist() == [5]
    assert shapes[0][3].tolist() == [1, 1, 1]


def test_reading_writes_nothing(tmp_path):
    mesh = make_mesh()
    modes = make_modes(mesh)
    for suffix in SUFFIXES:
        write_interchange(tmp_path / f"a{suffix}", mesh, modes)
    before = sorted(p.name for p in tmp_path.iterdir())
    for suffix in SUFFIXES:
        assert_same_mesh(mesh, read_mesh(tmp_path / f"a{suffix}"))
    assert sorted(p.name for p in tmp_path.iterdir()) == before

"""Every carrier gives back what was put in: ids, groups, order, kinds, repeated frequencies, complex parts."""

import itertools
import pickle
import subprocess
import sys

import numpy as np
import pytest

from tests.loaders.samples import (
    assert_same_mesh,
    assert_same_modes,
    make_mesh,
    make_modes,
    one_of_each_kind,
)
from viewer.errors import Cancelled, LoadError
from viewer.jobs import Progress
from viewer.loaders import raw_data, read_mesh, read_mesh_report, read_modes, write_interchange
from viewer.loaders.file_shapes import FileShapes
from viewer.model.modes import ArrayShapes

SUFFIXES = (".vtu", ".vtkhdf", ".npz", ".h5", ".csv")


@pytest.mark.parametrize("suffix", SUFFIXES)
@pytest.mark.parametrize(("is_complex", "rotations", "damping"), list(itertools.product((False, True), repeat=3)))
def test_round_trip(tmp_path, suffix, is_complex, rotations, damping):
    mesh = make_mesh()
    modes = make_modes(mesh, is_complex=is_complex, rotations=rotations, damping=damping)
    path = write_interchange(tmp_path / f"größe{suffix}", mesh, modes)
    again, report = read_mesh_report(path)
    assert_same_mesh(mesh, again)
    assert report.notes == ()
    assert report.warnings == ()
    assert_same_modes(modes, read_modes(path, again))
    assert not list(tmp_path.glob(".part*"))


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_every_kind_of_cell(tmp_path, suffix):
    mesh = one_of_each_kind()
    path = write_interchange(tmp_path / f"kinds{suffix}", mesh)
    assert_same_mesh(mesh, read_mesh(path))


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_shapes_are_joined_by_node_id_never_by_row(tmp_path, mesh, modes, suffix):
    """The mode file has its nodes in another order than the mesh."""
    order = np.random.default_rng(3).permutation(mesh.n_nodes)
    place = np.argsort(order)
    turned = mesh.with_(
        points=mesh.points[order],
        node_ids=mesh.node_ids[order],
        node_groups={},
        blocks=tuple(type(b)(b.kind, place[b.nodes], b.ids) for b in mesh.blocks),
    )
    shapes = ArrayShapes(np.stack([modes.shape(i)[order] for i in range(4)]))
    path = write_interchange(tmp_path / f"m{suffix}", turned, modes.with_(node_ids=turned.node_ids, shapes=shapes))
    assert_same_modes(modes, read_modes(path, mesh))


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_other_nodes_are_refused_with_a_few_named(tmp_path, mesh, modes, suffix):
    path = write_interchange(tmp_path / f"m{suffix}", mesh, modes)
    ids = mesh.node_ids.copy()
    ids[[2, 5]] = 9001, 9002
    with pytest.raises(
        LoadError, match=r"not those of this mesh.*2 nodes only in the mesh \(9001, 9002\).*133, 103|103, 133"
    ):
        read_modes(path, mesh.with_(node_ids=ids))


@pytest.mark.parametrize("suffix", [".vtu", ".vtkhdf", ".npz", ".h5"])
def test_large_sets_stay_in_the_file(tmp_path, monkeypatch, mesh, suffix):
    monkeypatch.setattr(raw_data, "_READ_AT_ONCE", 0)
    modes = make_modes(mesh, is_complex=True, rotations=True)
    path = write_interchange(tmp_path / f"m{suffix}", mesh, modes)
    read = read_modes(path, mesh)
    assert isinstance(read.shapes, FileShapes)
    assert_same_modes(modes, pickle.loads(pickle.dumps(read)))
    scaled = read_modes(path, mesh, length_unit=0.001)
    assert np.allclose(scaled.shape(2), modes.shape(2) * 0.001, rtol=1e-15)
    assert np.array_equal(scaled.rotations(2), modes.rotations(2))
    assert scaled.normalisation == "unknown"  # unit modal mass holds only in the file's own units
    path.write_bytes(path.read_bytes() + b" ")
    with pytest.raises(LoadError, match="changed since it was opened"):
        read.shape(0)


def test_number_that_is_not_finite_shows_when_its_mode_is_asked_for(tmp_path, monkeypatch, mesh, modes):
    monkeypatch.setattr(raw_data, "_READ_AT_ONCE", 0)
    moved = np.stack([modes.shape(i) for i in range(4)])
    moved[2, 6, 1] = np.nan
    path = write_interchange(tmp_path / "m.vtu", mesh, modes.with_(shapes=ArrayShapes(moved)))
    read = read_modes(path, mesh)
    read.shape(1)
    with pytest.raises(LoadError, match=r"mode 3, row 7: holds a number that is not finite"):
        read.shape(2)


def test_length_unit_scales_points(tmp_path, mesh):
    path = write_interchange(tmp_path / "m.npz", mesh)
    assert np.allclose(read_mesh(path, 0.001).points, mesh.points * 0.001, rtol=1e-15)


def test_implausible_size_is_flagged_in_words(tmp_path, mesh):
    path = write_interchange(tmp_path / "m.vtu", mesh.with_(points=mesh.points * 1000))
    _, report = read_mesh_report(path)
    assert "332 m" in report.warnings[0]
    assert "unit of length" in report.warnings[0]
    assert read_mesh_report(path, 0.001)[1].warnings == ()


def test_cells_inside_out_are_put_right_and_counted(tmp_path, mesh):
    from viewer.cells import measures

    inverted = mesh.blocks[0].nodes[:, [4, 5, 6, 7, 0, 1, 2, 3]]
    block = type(mesh.blocks[0])("hex8", inverted, mesh.blocks[0].ids)
    path = write_interchange(tmp_path / "m.vtu", mesh.with_(blocks=(block,), cell_groups={}))
    read, report = read_mesh_report(path)
    assert any("2 cells were turned inside out" in note for note in report.notes)
    assert np.allclose(measures("hex8", read.points[read.blocks[0].nodes]), 1e-3)


def test_modes_of_another_mesh_are_not_written(tmp_path, mesh, modes):
    with pytest.raises(LoadError, match="not those of the mesh"):
        write_interchange(tmp_path / "m.vtu", mesh.with_(node_ids=mesh.node_ids + 1), modes)
    with pytest.raises(LoadError, match=r"cannot be written in this format; found: \.xyz"):
        write_interchange(tmp_path / "m.xyz", mesh, modes)
    assert not list(tmp_path.iterdir())


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_cancelled_writing_leaves_nothing(tmp_path, mesh, modes, suffix):
    calls = iter([False, False, True])
    with pytest.raises(Cancelled):
        write_interchange(tmp_path / f"m{suffix}", mesh, modes, Progress(stop=lambda: next(calls, True)))
    assert not list(tmp_path.iterdir())


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_broken_writing_leaves_the_old_file(tmp_path, mesh, modes, suffix):
    class Broken(ArrayShapes):
        def translations(self, index):
            if index == 2:
                raise LoadError("broken on purpose")
            return super().translations(index)

    path = write_interchange(tmp_path / f"m{suffix}", mesh, modes)
    before = {p.name: p.read_bytes() for p in tmp_path.iterdir()}
    with pytest.raises(LoadError, match="on purpose"):
        write_interchange(path, mesh, modes.with_(shapes=Broken(modes.shapes.moved)))
    assert {p.name: p.read_bytes() for p in tmp_path.iterdir()} == before


SCRIPT = """
import numpy as np, pyvista, sys
grid = pyvista.ImageData(dimensions=(4, 3, 2)).cast_to_unstructured_grid()
grid.point_data["node_id"] = np.arange(grid.n_points) + 101
for number in range(3):
    grid.point_data[f"mode_{number + 1:03d}"] = np.sin((number + 1) * grid.points)
grid.field_data["freq_hz"] = [10.0, 20.0, 20.0]
grid.point_data["group_root"] = (grid.points[:, 0] == 0).astype(int)
grid.save(sys.argv[1])
"""


def test_ten_lines_of_anybodys_script(tmp_path):
    """A file made with general-purpose libraries only, by VTK's own writer."""
    assert len(SCRIPT.strip().splitlines()) <= 10
    path = tmp_path / "anybody.vtu"
    subprocess.run([sys.executable, "-c", SCRIPT, str(path)], check=True)
    mesh = read_mesh(path)
    modes = read_modes(path, mesh)
    assert [(b.kind, len(b)) for b in mesh.blocks] == [("hex8", 6)]  # from VTK's voxels
    assert mesh.node_ids.tolist() == list(range(101, 125))
    assert mesh.node_groups["root"].tolist() == [0, 4, 8, 12, 16, 20]
    assert modes.freq_hz.tolist() == [10, 20, 20]
    assert np.allclose(modes.shape(2), np.sin(3 * mesh.points), atol=1e-6)


def test_numpy_alone_is_enough(tmp_path):
    points = np.random.default_rng(1).random((4, 3))
    np.savez(
        tmp_path / "a.npz", points=points, cells_tri3=[[0, 1, 2], [1, 3, 2]], modes=np.ones((2, 4, 3)), freq_hz=[1, 2]
    )
    mesh, report = read_mesh_report(tmp_path / "a.npz")
    assert mesh.node_ids.tolist() == [1, 2, 3, 4]
    assert any("no node ids" in note for note in report.notes)
    assert read_modes(tmp_path / "a.npz", mesh).freq_hz.tolist() == [1, 2]


def test_compressed_npz_is_read_to_memory(tmp_path, mesh, modes):
    arrays = dict(np.load(write_interchange(tmp_path / "a.npz", mesh, modes)))
    np.savez_compressed(tmp_path / "b.npz", **arrays)
    assert_same_mesh(mesh, read_mesh(tmp_path / "b.npz"))
    assert_same_modes(modes, read_modes(tmp_path / "b.npz", mesh))


def test_frequencies_from_a_table_beside_the_file(tmp_path, mesh):
    np.savez(tmp_path / "a.npz", node_id=mesh.node_ids, modes=np.ones((2, 16, 3)))
    with pytest.raises(LoadError, match=r"frequencies of the modes are missing.*a_frequencies\.csv"):
        read_modes(tmp_path / "a.npz", mesh)
    (tmp_path / "a_frequencies.csv").write_text("mode;freq_hz;damping\n2;7,5;0,02\n1;7,25;0,01\n")
    modes = read_modes(tmp_path / "a.npz", mesh)
    assert modes.freq_hz.tolist() == [7.25, 7.5]
    assert modes.damping.tolist() == [0.01, 0.02]

"""``.xdmf`` against meshio's and VTK's readers and writers: topologies, steps, sets, references."""

import re

import h5py
import meshio
import numpy as np
import pytest
import pyvista
from vtkmodules.vtkIOXdmf2 import vtkXdmfReader

from tests.loaders.samples import END_QUAD, cube_rows, grid_points
from viewer.cells import KINDS
from viewer.errors import LoadError
from viewer.loaders import raw_data, read_mesh, read_mesh_report, read_modes
from viewer.loaders.file_shapes import FileShapes

QUADRATIC = {
    "tri6": "Tri_6",
    "quad8": "Quad_8",
    "quad9": "Quad_9",
    "tet10": "Tet_10",
    "pyramid13": "Pyramid_13",
    "wedge15": "Wedge_15",
    "hex20": "Hex_20",
}
SHAPES = np.random.default_rng(8).normal(size=(3, 16, 3))


def item(values, kind="Float", width=8):
    values = np.asarray(values)
    text = " ".join(repr(v) for v in values.ravel().tolist())
    size = " ".join(map(str, values.shape))
    return f'<DataItem Format="XML" NumberType="{kind}" Precision="{width}" Dimensions="{size}">{text}</DataItem>'


def grid(inner, points=None, cells=None, topology="Hexahedron", name="mesh"):
    points, cells = grid_points() if points is None else points, cube_rows() if cells is None else cells
    return (
        f'<Grid Name="{name}"><Topology TopologyType="{topology}" NumberOfElements="{len(cells)}">'
        f'{item(cells, "Int", 8)}</Topology><Geometry GeometryType="XYZ">{item(points)}</Geometry>{inner}</Grid>'
    )


def document(*grids):
    return '<?xml version="1.0"?><Xdmf Version="3.0"><Domain>' + "".join(grids) + "</Domain></Xdmf>"


def vector(values, name="u"):
    return f'<Attribute Name="{name}" AttributeType="Vector" Center="Node">{item(values)}</Attribute>'


def series(steps):
    inner = "".join(steps)
    return f'<Grid Name="modes" GridType="Collection" CollectionType="Temporal">{inner}</Grid>'


def step(number, time, extra=""):
    point = """xpointer(//Grid[@Name="mesh"]/*[self::Topology or self::Geometry])""".replace('"', "&quot;")
    return (
        f'<Grid Name="step {number}"><xi:include xmlns:xi="http://www.w3.org/2001/XInclude" xpointer="{point}"/>'
        f'<Time Value="{time}"/>{vector(SHAPES[number])}{extra}</Grid>'
    )


@pytest.mark.parametrize("kind", QUADRATIC)
def test_node_order_is_that_of_vtks_reader(tmp_path, kind):
    """One cell on its reference nodes: VTK's reader and ours give the same connectivity; mid nodes are mid-edge."""
    xyz = np.zeros((KINDS[kind].n_nodes, 3))
    xyz[:, : KINDS[kind].dim] = KINDS[kind].reference
    rows = np.arange(len(xyz))[None]
    path = tmp_path / "a.xdmf"
    path.write_text(document(grid("", xyz, rows, QUADRATIC[kind])))
    mesh, report = read_mesh_report(path)
    assert mesh.blocks[0].kind == kind
    assert report.warnings == ()
    reader = vtkXdmfReader()
    reader.SetFileName(str(path))
    reader.Update()
    seen = pyvista.wrap(reader.GetOutputDataObject(0))
    assert seen.celltypes.tolist() == [KINDS[kind].vtk_type]
    assert mesh.blocks[0].nodes[0].tolist() == seen.cell_connectivity.tolist()


def test_mixed_quadratic_and_counted_cells(tmp_path):
    """Two hexahedra, a line, a quadrilateral, a hexahedron, two 6-node triangles, by the numbers of the format."""
    cubes = cube_rows()
    six = np.array([[0, 2, 8, 1, 9, 4], [8, 2, 10, 9, 6, 5]])
    numbers = [9, *cubes[0], 9, *cubes[1], 2, 2, 0, 3, 5, *END_QUAD[0], 9, *cubes[2]]
    numbers += [n for row in six for n in (36, *row)]
    path = tmp_path / "a.xdmf"
    path.write_text(document(grid("", None, np.array(numbers), "Mixed")))
    mesh = read_mesh(path)
    assert [(b.kind, len(b)) for b in mesh.blocks] == [
        ("hex8", 2),
        ("line2", 1),
        ("quad4", 1),
        ("hex8", 1),
        ("tri6", 2),
    ]
    assert mesh.blocks[4].nodes.tolist() == six.tolist()
    assert mesh.blocks[0].nodes.tolist() == cubes[:2].tolist()


def test_many_mixed_cells_equal_meshios_reading(tmp_path, monkeypatch):
    """A run of 3 000 cells and kinds in turn."""
    monkeypatch.chdir(tmp_path)
    rng = np.random.default_rng(4)
    points = rng.random((500, 3))
    cells = [("tetra", rng.permuted(np.tile(np.arange(500), (3000, 1)), axis=1)[:, :4])]
    cells += [(kind, np.arange(n)[None] + k) for k in range(40) for kind, n in (("wedge", 6), ("pyramid", 5))]
    meshio.write("a.xdmf", meshio.Mesh(points, cells), data_format="XML")
    mesh, other = read_mesh("a.xdmf"), meshio.read("a.xdmf")
    assert mesh.n_cells == sum(len(block.data) for block in other.cells) == 3080
    for kind, name in (("tet4", "tetra"), ("pyramid5", "pyramid")):
        ours = np.concatenate([b.nodes for b in mesh.blocks if b.kind == kind])
        theirs = np.concatenate([b.data for b in other.cells if b.type == name])
        assert np.array_equal(np.sort(ours, axis=1), np.sort(theirs, axis=1))  # inside-out cells are put right


@pytest.mark.parametrize("data_format", ["XML", "Binary", "HDF"])
def test_series_as_meshio_writes_it(tmp_path, monkeypatch, data_format):
    """Steps of equal time stay apart; in an uncompressed HDF5 file the shapes stay there."""
    monkeypatch.chdir(tmp_path)
    monkeypatch.setattr(raw_data, "_READ_AT_ONCE", 0)
    with meshio.xdmf.TimeSeriesWriter("a.xdmf", data_format=data_format) as writer:
        writer.write_points_cells(grid_points(), [("hexahedron", cube_rows()), ("quad", END_QUAD)])
        for time, shape in zip((4.5, 4.5, 7.0), SHAPES, strict=True):
            writer.write_data(time, point_data={"u": shape, "scalar": np.ones(16)})
    mesh = read_mesh("a.xdmf")
    assert [(b.kind, len(b)) for b in mesh.blocks] == [("hex8", 3), ("quad4", 1)]
    assert mesh.blocks[0].nodes.tolist() == cube_rows().tolist()
    modes = read_modes("a.xdmf", mesh)
    assert modes.freq_hz.tolist() == [4.5, 4.5, 7]
    for index, shape in enumerate(SHAPES):
        assert np.allclose(modes.shape(index), shape, rtol=1e-15, atol=0)


def test_shapes_stay_in_the_hdf5_file(tmp_path, monkeypatch):
    monkeypatch.setattr(raw_data, "_READ_AT_ONCE", 0)
    with h5py.File(tmp_path / "data.h5", "w") as file:
        for number, shape in enumerate(SHAPES):
            file[f"steps/u{number}"] = shape
    steps = [
        f'<Grid Name="s"><Geometry Reference="/Xdmf/Domain/Grid[1]/Geometry[1]"/><Time Value="{number + 0.5}"/>'
        '<Attribute Name="u" AttributeType="Vector" Center="Node"><DataItem Format="HDF" Precision="8"'
        f' Dimensions="16 3">data.h5:/steps/u{number}</DataItem></Attribute></Grid>'
        for number in range(3)
    ]
    path = tmp_path / "a.xdmf"
    path.write_text(document(grid(""), series(steps)))
    modes = read_modes(path, read_mesh(path))
    assert isinstance(modes.shapes, FileShapes)
    assert all(np.array_equal(modes.shape(i), SHAPES[i]) for i in range(3))


def test_frequency_of_a_step_comes_before_its_time(tmp_path):
    told = [f'<Information Name="freq_hz" Value="{f}"/>' for f in (11, 12, 12)]
    path = tmp_path / "a.xdmf"
    path.write_text(document(grid(""), series(step(n, n, told[n]) for n in range(3))))
    assert read_modes(path, read_mesh(path)).freq_hz.tolist() == [11, 12, 12]
    attribute = '<Attribute Name="freq_hz" Center="Grid"><DataItem Dimensions="1">{}</DataItem></Attribute>'
    path.write_text(document(grid(""), series(step(n, n, attribute.format(n + 20)) for n in range(3))))
    assert read_modes(path, read_mesh(path)).freq_hz.tolist() == [20, 21, 22]


def test_times_in_a_list(tmp_path):
    path = tmp_path / "a.xdmf"
    listed = f'<Time TimeType="List">{item([7.5, 7.5, 9.0])}</Time>'
    steps = [re.sub("<Time [^>]*>", "", step(n, n)) for n in range(3)]
    path.write_text(document(grid(""), series([listed, *steps])))
    assert read_modes(path, read_mesh(path)).freq_hz.tolist() == [7.5, 7.5, 9]
    path.write_text(document(grid(""), series([listed, *steps[:2]])))
    with pytest.raises(LoadError, match="list of times does not fit the steps; found: 3 times; expected: 2"):
        read_modes(path, read_mesh(path))


def test_table_beside_the_file_comes_before_times(tmp_path):
    path = tmp_path / "a.xdmf"
    path.write_text(document(grid(""), series(step(n, n + 0.5) for n in range(2))))
    assert read_modes(path, read_mesh(path)).freq_hz.tolist() == [0.5, 1.5]
    (tmp_path / "a_frequencies.csv").write_text("mode,freq_hz\n1,30\n2,40\n")
    assert read_modes(path, read_mesh(path)).freq_hz.tolist() == [30, 40]


def test_sets_ids_and_our_own_names(tmp_path):
    ids = f'<Attribute Name="node_id" Center="Node">{item(np.arange(16) + 101, "Int")}</Attribute>'
    cells = f'<Attribute Name="elem_id" Center="Cell">{item([9, 8, 7], "Int")}</Attribute>'
    sets = (
        f'<Set Name="root" SetType="Node">{item([0, 4, 8, 12], "Int")}</Set>'
        f'<Set Name="tip" SetType="Cell">{item([2], "UInt")}</Set><Set Name="skin" SetType="Face"/>'
    )
    modes = "".join(vector(SHAPES[n], f"mode_{n + 1:03d}") for n in (0, 1))
    freq = f'<Attribute Name="freq_hz" Center="Grid">{item([5.0, 5.0])}</Attribute>'
    path = tmp_path / "größe.xdmf"
    path.write_text(document(grid(ids + cells + sets + modes + freq)), encoding="utf-8")
    mesh, report = read_mesh_report(path)
    assert mesh.node_ids.tolist() == list(range(101, 117))
    assert mesh.cell_ids.tolist() == [9, 8, 7]
    assert mesh.node_groups["root"].tolist() == [0, 4, 8, 12]
    assert mesh.cell_groups["tip"].tolist() == [2]
    assert any("set 'skin' left out" in note for note in report.notes)
    found = read_modes(path, mesh)
    assert found.freq_hz.tolist() == [5, 5]
    assert np.array_equal(found.shape(1), SHAPES[1])


def test_one_named_vector_among_several_is_the_shape(tmp_path):
    path = tmp_path / "a.xdmf"
    extra = vector(np.ones((16, 3)), "normals")
    path.write_text(document(grid(""), series(step(n, n + 0.5, extra) for n in range(2))))
    with pytest.raises(LoadError, match=r"step 1: no vector array .* is clearly the mode shape; found: u, normals"):
        read_modes(path, read_mesh(path))
    path.write_text(path.read_text().replace('Name="u"', 'Name="displacement"'))
    assert np.array_equal(read_modes(path, read_mesh(path)).shape(1), SHAPES[1])


def test_plain_bytes_of_either_order(tmp_path):
    grid_points().astype(">f4").tofile(tmp_path / "points.bin")
    text = document(grid("")).replace(
        item(grid_points()),
        '<DataItem Format="Binary" Endian="Big" Precision="4" Dimensions="16 3">points.bin</DataItem>',
    )
    (tmp_path / "a.xmf").write_text(text)
    assert np.array_equal(read_mesh(tmp_path / "a.xmf").points, grid_points())

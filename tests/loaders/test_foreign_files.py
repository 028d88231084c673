"""Files that other libraries write: meshio's and VTK's own writers, in the encodings they offer."""

import itertools

import meshio
import numpy as np
import pytest
import pyvista
from vtkmodules.vtkIOLegacy import vtkUnstructuredGridWriter
from vtkmodules.vtkIOXML import vtkXMLUnstructuredGridWriter

from tests.loaders.samples import END_QUAD, clear, cube_rows, grid_points
from viewer.cells import KINDS, measures
from viewer.errors import LoadError
from viewer.loaders import read_mesh, read_mesh_report, read_modes

SHAPES = np.random.default_rng(5).normal(size=(2, 16, 3))


def vtk_grid() -> pyvista.UnstructuredGrid:
    grid = pyvista.UnstructuredGrid({12: cube_rows(), 9: END_QUAD}, grid_points())
    for number, shape in enumerate(SHAPES, 1):
        grid.point_data[f"mode_{number:03d}"] = shape
    grid.point_data["node_id"] = np.arange(16)[::-1] + 1
    grid.point_data["temperature"] = np.arange(16.0)
    grid.cell_data["elem_id"] = [4, 3, 2, 1]
    grid.cell_data["group_skin"] = np.array([0, 0, 0, 1], np.uint8)
    grid.field_data["freq_hz"] = np.array([3.0, 3.0])
    grid.field_data["remark"] = ["two words", "<&>"]
    return grid


def check(path, *, exact=True):
    mesh, report = read_mesh_report(path)
    assert np.array_equal(mesh.points, grid_points())
    kinds = {block.kind: block for block in mesh.blocks}
    assert kinds["hex8"].nodes.tolist() == cube_rows().tolist()
    assert kinds["hex8"].ids.tolist() == [4, 3, 2]
    assert mesh.node_ids.tolist() == list(range(16, 0, -1))
    modes = read_modes(path, mesh)
    assert modes.freq_hz.tolist() == [3, 3]
    assert all(
        np.allclose(modes.shape(i), SHAPES[i], rtol=0 if exact else 1e-6, atol=0 if exact else 1e-6) for i in (0, 1)
    )
    return mesh, report


@pytest.mark.parametrize(
    ("mode", "compressor", "header", "order"),
    [
        case
        for case in itertools.product(
            ("Ascii", "Binary", "Appended", "AppendedBase64"),
            ("None", "ZLib", "LZMA", "LZ4"),
            ("UInt32", "UInt64"),
            ("Little", "Big"),
        )
        if case[0] != "Ascii" or case[1:] == ("None", "UInt32", "Little")
    ],
)
def test_vtu_as_vtk_writes_it(tmp_path, mode, compressor, header, order):
    writer = vtkXMLUnstructuredGridWriter()
    writer.SetInputData(vtk_grid())
    writer.SetFileName(str(tmp_path / "a.vtu"))
    getattr(writer, f"SetDataModeTo{mode.removesuffix('Base64')}")()
    writer.SetEncodeAppendedData(mode == "AppendedBase64")
    getattr(writer, f"SetCompressorTypeTo{compressor}")()
    getattr(writer, f"SetHeaderTypeTo{header}")()
    getattr(writer, f"SetByteOrderTo{order}Endian")()
    writer.SetBlockSize(128)  # several blocks to an array
    writer.Write()
    # VTK prints text with fewer digits than a double holds
    mesh, _ = check(tmp_path / "a.vtu", exact=mode != "Ascii")
    assert mesh.cell_groups["skin"].tolist() == [3]


@pytest.mark.parametrize("binary", [True, False])
def test_legacy_vtk_as_vtk_writes_it(tmp_path, binary):
    writer = vtkUnstructuredGridWriter()
    writer.SetInputData(vtk_grid())
    writer.SetFileName(str(tmp_path / "a.vtk"))
    getattr(writer, "SetFileTypeToBinary" if binary else "SetFileTypeToASCII")()
    writer.Write()
    mesh, _ = check(tmp_path / "a.vtk", exact=binary)
    assert mesh.cell_groups["skin"].tolist() == [3]


def test_surfaces_and_pieces_through_vtk(tmp_path):
    sphere = pyvista.Sphere(radius=0.1)
    for suffix in (".vtk", ".vtp", ".stl", ".ply", ".obj"):
        pyvista.save_meshio(tmp_path / f"a{suffix}", sphere) if suffix == ".obj" else sphere.save(
            tmp_path / f"a{suffix}"
        )
        mesh = read_mesh(tmp_path / f"a{suffix}")
        assert {block.kind for block in mesh.blocks} == {"tri3"}
        assert mesh.n_cells == sphere.n_cells
        area = sum(measures(b.kind, mesh.points[b.nodes]).sum() for b in mesh.blocks)
        assert area == pytest.approx(sphere.area, rel=1e-4)  # single precision in these formats
    (tmp_path / "b.vtu").write_text(
        """<VTKFile type="UnstructuredGrid"><UnstructuredGrid>"""
        + 2
        * """
        <Piece NumberOfPoints="3" NumberOfCells="1"><Points><DataArray type="Float64" NumberOfComponents="3">
        0 0 0 1 0 0 0 1 0</DataArray></Points><Cells><DataArray type="Int64" Name="connectivity" format="ascii">0 1 2
        </DataArray><DataArray type="Int64" Name="offsets">3</DataArray><DataArray type="UInt8" Name="types"
        format="ascii">5</DataArray></Cells></Piece>"""
        + "</UnstructuredGrid></VTKFile>"
    )
    assert read_mesh(tmp_path / "b.vtu").n_cells == 2


def meshio_mesh(**more) -> meshio.Mesh:
    return meshio.Mesh(grid_points(), [("hexahedron", cube_rows()), ("quad", END_QUAD)], **more)


@pytest.mark.parametrize("compression", [None, "zlib", "lzma", "ascii"])
def test_vtu_as_meshio_writes_it(tmp_path, compression):
    path = tmp_path / "a.vtu"
    mesh = meshio_mesh(point_data={"first": SHAPES[0], "second": SHAPES[1], "scalar": np.ones(16)})
    if compression == "ascii":
        meshio.vtu.write(path, mesh, binary=False)
    else:
        meshio.vtu.write(path, mesh, compression=compression)
    (tmp_path / "a_frequencies.csv").write_text("mode,freq_hz\n1,5\n2,6\n")  # meshio writes no field arrays
    read = read_mesh(path)
    assert [(b.kind, len(b)) for b in read.blocks] == [("hex8", 3), ("quad4", 1)]
    modes = read_modes(path, read)
    assert modes.freq_hz.tolist() == [5, 6]
    # meshio prints text with 12 digits after the point
    assert np.allclose(modes.shape(1), SHAPES[1], rtol=0, atol=1e-11 if compression == "ascii" else 0)


def physical(**more) -> meshio.Mesh:
    tags = [np.array([1, 1, 7]), np.array([2])]
    return meshio_mesh(
        cell_data={"gmsh:physical": tags, "gmsh:geometrical": tags},
        field_data={"beam": np.array([1, 3]), "clamp": np.array([2, 2])},
        **more,
    )


@pytest.mark.parametrize("version", ["gmsh22", "gmsh"])
@pytest.mark.parametrize("binary", [True, False])
def test_msh_with_physical_groups(tmp_path, version, binary):
    entity = np.array([[2, 2] if row in (0, 4, 8, 12) else [3, 1] for row in range(16)])
    more = {"point_data": {"gmsh:dim_tags": entity}} if version == "gmsh" else {}
    meshio.write(tmp_path / "a.msh", physical(**more), file_format=version, binary=binary)
    mesh, report = read_mesh_report(tmp_path / "a.msh")
    assert [(b.kind, len(b)) for b in mesh.blocks] == [("hex8", 3)]
    assert np.allclose(measures("hex8", mesh.points[mesh.blocks[0].nodes]), 1)
    groups = {name: rows.tolist() for name, rows in mesh.cell_groups.items()}
    if version == "gmsh22":
        assert groups == {"beam": [0, 1], "physical 7": [2]}
    else:  # tags belong to entities there, and meshio writes a block of cells as one entity
        assert groups == {"beam": [0, 1, 2]}
    assert mesh.points[mesh.node_groups["clamp"], 0].tolist() == [0, 0, 0, 0]
    assert sorted(mesh.node_ids.tolist()) == list(range(1, 17))
    assert any("node groups now: clamp" in note for note in report.notes)


MSH = (
    """$MeshFormat
{version} 0 8
$EndMeshFormat
{nodes}
$Elements
{elements}
$EndElements
"""
    + "".join(
        f"""$NodeData
1
"displacement"
1
{0.5 * view}
3
{view}
3
4
"""
        + "".join(f"{tag} {tag * view} 0 {view}\n" for tag in (70, 40, 20, 10))
        + "$EndNodeData\n"
        for view in (1, 2)
    )
    + """$NodeData
1
"partial"
1
0
3
0
3
1
10 1 2 3
$EndNodeData
"""
)
NODES = ["0 0 0", "1 0 0", "0 1 0", "0 0 1"]
TAGS = [20, 10, 40, 70]


@pytest.mark.parametrize("version", ["2.2", "4.1"])
def test_msh_keeps_tags_and_every_view(tmp_path, version):
    """Two views of one name and a partial one, tags out of order: by the published layout of the format."""
    if version == "2.2":
        nodes = "$Nodes\n4\n" + "\n".join(f"{t} {p}" for t, p in zip(TAGS, NODES, strict=True)) + "\n$EndNodes"
        elements = "1\n5 4 2 0 1 20 10 40 70"
    else:
        nodes = "$Nodes\n1 4 10 70\n3 1 0 4\n" + "\n".join([*map(str, TAGS), *NODES]) + "\n$EndNodes"
        elements = "1 1 5 5\n3 1 4 1\n5 20 10 40 70"
    path = tmp_path / "a.msh"
    path.write_text(MSH.format(version=version, nodes=nodes, elements=elements))
    mesh = read_mesh(path)
    assert mesh.node_ids.tolist() == TAGS
    assert mesh.points.tolist() == [[float(x) for x in p.split()] for p in NODES]
    assert measures("tet4", mesh.points[mesh.blocks[0].nodes])[0] == pytest.approx(1 / 6)
    (tmp_path / "a_frequencies.csv").write_text("mode,freq_hz\n1,5\n2,6\n")
    modes = read_modes(path, mesh)
    assert modes.count == 2
    assert modes.shape(1).tolist() == [[2.0 * tag, 0, 2] for tag in TAGS]


def test_med_with_families(tmp_path):
    mesh = meshio_mesh(
        cell_data={"cell_tags": [np.array([-1, -1, -2]), np.array([-3])]},
        point_data={"point_tags": np.array([1] + [0] * 15)},
    )
    mesh.cell_tags = {-1: ["beam"], -2: ["beam", "tip"], -3: ["clamp"]}
    mesh.point_tags = {1: ["corner"]}
    meshio.write(tmp_path / "a.med", mesh)
    read = read_mesh(tmp_path / "a.med")
    assert {n: r.tolist() for n, r in read.cell_groups.items()} == {"beam": [0, 1, 2], "tip": [2]}
    assert {n: r.tolist() for n, r in read.node_groups.items()} == {"corner": [0], "clamp": [0, 4, 8, 12]}


@pytest.mark.parametrize("suffix", [".mesh", ".xdmf", ".off", ".su2", ".avs"])
def test_other_formats_that_meshio_knows(tmp_path, monkeypatch, suffix):
    monkeypatch.chdir(tmp_path)  # one of meshio's writers leaves a file in the working folder
    points = np.array([[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1.0]])
    cells = [("triangle", [[0, 1, 2]])] if suffix == ".off" else [("tetra", [[0, 1, 2, 3]])]
    meshio.write(tmp_path / f"a{suffix}", meshio.Mesh(points, cells))
    mesh = read_mesh(tmp_path / f"a{suffix}")
    assert mesh.points.tolist() == points.tolist()
    assert mesh.n_cells == 1


# Order of mid-edge nodes by the published description of the MSH file format, "Node ordering": (type, edges in order)
MSH_EDGES = {
    "tri6": (9, "01 12 20"),
    "quad8": (16, "01 12 23 30"),
    "tet10": (11, "01 12 20 30 23 13"),
    "hex20": (17, "01 03 04 12 15 23 26 37 45 47 56 67"),
    "wedge15": (18, "01 02 03 12 14 25 34 35 45"),
    "pyramid13": (19, "01 03 04 12 14 23 24 34"),
}


@pytest.mark.parametrize("name", MSH_EDGES)
def test_higher_order_cells_come_in_vtk_order(tmp_path, name):
    """Written by the format's published order: after reading, each mid-side node is in the middle of its edge."""
    kind, (code, edges) = KINDS[name], MSH_EDGES[name]
    corners = np.zeros((kind.n_corners, 3))
    corners[:, : kind.dim] = kind.reference[: kind.n_corners]
    points = np.vstack([corners, *((corners[int(a)] + corners[int(b)]) / 2 for a, b in edges.split())])
    lines = [f"{row + 1} {x} {y} {z}" for row, (x, y, z) in enumerate(points)]
    cell = " ".join(str(row + 1) for row in range(len(points)))
    (tmp_path / "a.msh").write_text(
        "$MeshFormat\n2.2 0 8\n$EndMeshFormat\n$Nodes\n"
        + "\n".join([str(len(points)), *lines])
        + f"\n$EndNodes\n$Elements\n1\n1 {code} 2 0 1 {cell}\n$EndElements\n"
    )
    mesh, report = read_mesh_report(tmp_path / "a.msh")
    assert report.warnings == ()
    assert mesh.blocks[0].kind == name
    for edge in kind.edges:
        first, second, middle = (mesh.points[mesh.blocks[0].nodes[0, node]] for node in edge)
        assert np.allclose(middle, (first + second) / 2, atol=1e-12)


def test_wrong_order_of_mid_side_nodes_is_flagged(tmp_path):
    kind = KINDS["hex20"]
    shuffled = np.array([*range(8), *range(19, 7, -1)])[None]
    np.savez(tmp_path / "a.npz", points=kind.reference, cells_hex20=shuffled)
    assert any("mid-side nodes" in warning for warning in read_mesh_report(tmp_path / "a.npz")[1].warnings)


def test_carriers_of_groups_become_node_groups_only_where_they_lie_on_cells(tmp_path):
    """A stiffening plate of its own stays; boundary faces, curves and points go."""
    points = np.vstack([grid_points(), [[0, 2, 0], [0, 2, 1]]])
    cells = [
        ("vertex", [[0]]),
        ("line", [[0, 1], [4, 16]]),
        ("quad", [END_QUAD[0], [4, 16, 17, 12]]),
        ("hexahedron", cube_rows()),
    ]
    sets = {
        "point": [[0], [], [], []],
        "curves": [[], [0, 1], [], []],
        "face": [[], [], [0], []],
        "fin": [[], [], [1], []],
    }
    mesh = meshio.Mesh(points, cells, cell_sets={k: [np.array(r, int) for r in v] for k, v in sets.items()})
    tags = [np.array([1]), np.array([2, 2]), np.array([3, 4]), np.array([5, 5, 5])]
    mesh.cell_data = {"gmsh:physical": tags, "gmsh:geometrical": tags}
    mesh.field_data = {
        "point": np.array([1, 0]),
        "curves": np.array([2, 1]),
        "face": np.array([3, 2]),
        "fin": np.array([4, 2]),
    }
    meshio.write(tmp_path / "a.msh", mesh, file_format="gmsh22", binary=True)
    read, report = read_mesh_report(tmp_path / "a.msh")
    assert {b.kind: len(b) for b in read.blocks} == {"quad4": 1, "hex8": 3}
    assert {n: r.tolist() for n, r in read.cell_groups.items()} == {"fin": [0], "physical 5": [1, 2, 3]}
    assert {n: r.tolist() for n, r in read.node_groups.items()} == {
        "point": [0],
        "curves": [0, 1, 4, 16],
        "face": [0, 4, 8, 12],
    }
    assert any("1 vertex1, 2 line2, 1 quad4 left out" in note for note in report.notes)


@pytest.mark.parametrize("percent", [5, 30, 60, 90])
def test_file_for_vtk_cut_short(tmp_path, percent):
    """Compressed in a way that only VTK's own reader knows: an error, or all that lies before the cut."""
    path, writer = tmp_path / "a.vtu", vtkXMLUnstructuredGridWriter()
    writer.SetCompressorTypeToLZ4()
    writer.SetInputData(vtk_grid())
    writer.SetFileName(str(path))
    writer.Write()
    whole, data = read_mesh(path), path.read_bytes()
    path.write_bytes(data[: len(data) * percent // 100])
    try:
        mesh = read_mesh(path)
    except LoadError as error:
        clear(error, path)
    else:
        assert np.array_equal(mesh.points, whole.points)
        assert np.array_equal(mesh.blocks[0].nodes, whole.blocks[0].nodes)


def test_line_cells_on_edges_stay_when_their_group_is_named_as_beams(tmp_path):
    """Two curves along the cubes: one says that it is a stiffener, the other carries a support."""
    cells = [("line", [[0, 1], [1, 2], [4, 5]]), ("hexahedron", cube_rows())]
    tags = [np.array([1, 1, 2]), np.array([3, 3, 3])]
    mesh = meshio.Mesh(grid_points(), cells, cell_data={"gmsh:physical": tags, "gmsh:geometrical": tags})
    mesh.field_data = {"lower stiffener": np.array([1, 1]), "barrier": np.array([2, 1]), "body": np.array([3, 3])}
    meshio.write(tmp_path / "a.msh", mesh, file_format="gmsh22", binary=True)
    read, report = read_mesh_report(tmp_path / "a.msh")
    assert {b.kind: len(b) for b in read.blocks} == {"line2": 2, "hex8": 3}
    assert read.cell_groups["lower stiffener"].tolist() == [0, 1]
    assert read.node_groups["barrier"].tolist() == [4, 5]
    assert any("2 line cells on edges of others kept as beams" in note and "lower stiffener" in note
               for note in report.notes)  # fmt: skip

"""Surfaces (.stl, .ply, .obj) and .cgns through VTK in the worker."""

import h5py
import numpy as np
import pytest
import pyvista

from viewer.cells import KINDS, measures
from viewer.errors import LoadError
from viewer.loaders import read_mesh, read_mesh_report, read_modes


def area(mesh):
    return sum(measures(b.kind, mesh.points[b.nodes]).sum() for b in mesh.blocks)


@pytest.mark.parametrize("suffix", [".stl", ".ply"])
@pytest.mark.parametrize("binary", [True, False])
def test_surfaces_that_vtk_writes(tmp_path, suffix, binary):
    sphere = pyvista.Sphere(radius=0.1)
    sphere.save(tmp_path / f"a{suffix}", binary=binary)
    mesh, report = read_mesh_report(tmp_path / f"a{suffix}")
    assert {block.kind for block in mesh.blocks} == {"tri3"}
    assert mesh.n_cells == sphere.n_cells
    assert mesh.n_nodes == sphere.n_points  # corners at one place are one point
    assert area(mesh) == pytest.approx(sphere.area, rel=1e-4)  # single precision in these formats
    assert any("no thickness and no material" in note for note in report.notes)


def test_binary_stl_whose_remark_begins_like_text(tmp_path):
    pyvista.Cube().triangulate().save(tmp_path / "a.stl")
    data = bytearray((tmp_path / "a.stl").read_bytes())
    data[:20] = b"solid but binary    "
    (tmp_path / "a.stl").write_bytes(data)
    assert area(read_mesh(tmp_path / "a.stl")) == pytest.approx(6)


OBJ = """# a unit square, an L of six corners beside it, textures that would tear a careless reader's mesh
v 0 0 0
v 1 0 0
v 1 1 0 1.0
v 0 1 0
vt 0 0
vt 1 1
vn 0 0 1
g square
f 1/1/1 2/2/1 3/1/1 4/2/1
g bent
v 3 0 0
v 3 1 0
v 2 1 0
v 2 2 0
f 2//1 -4//1 -3//1 -2//1 -1 3
"""


def test_obj_with_a_concave_polygon(tmp_path):
    """Area of the L by its corners (1,0) (3,0) (3,1) (2,1) (2,2) (1,1): shoelace formula."""
    x, y = np.array([[1, 3, 3, 2, 2, 1], [0, 0, 1, 1, 2, 1]], float)
    bent = abs(np.dot(x, np.roll(y, -1)) - np.dot(y, np.roll(x, -1))) / 2
    (tmp_path / "a.obj").write_text(OBJ)
    mesh, report = read_mesh_report(tmp_path / "a.obj")
    assert mesh.n_nodes == 8
    assert {block.kind for block in mesh.blocks} == {"tri3"}
    sizes = measures("tri3", mesh.points[mesh.blocks[0].nodes])
    assert sizes[mesh.cell_groups["square"]].sum() == pytest.approx(1)
    assert sizes[mesh.cell_groups["bent"]].sum() == pytest.approx(bent)
    assert any("cut into triangles" in note for note in report.notes)
    (tmp_path / "b.obj").write_text(OBJ[: OBJ.index("g bent")])
    assert [(b.kind, len(b)) for b in read_mesh(tmp_path / "b.obj").blocks] == [("quad4", 1)]


def cgns(path, points, sections, fields=(), links=()):
    """A base with one unstructured zone, by the published mapping of CGNS to HDF5."""

    def node(parent, name, label, data=None, kind="MT"):
        group = parent.create_group(name, track_order=True)
        for key, text, width in (("name", name, 33), ("label", label, 33), ("type", kind, 3)):
            group.attrs.create(key, np.array(text.encode(), f"S{width}"))
        group.attrs["flags"] = np.array([1], np.int32)
        if data is not None:
            group[" data"] = data
        return group

    def letters(text):
        return np.frombuffer(text.encode(), np.int8)

    with h5py.File(path, "w", track_order=True) as file:
        for key, text, width in (
            ("name", "HDF5 MotherNode", 33),
            ("label", "Root Node of HDF5 File", 33),
            ("type", "MT", 3),
        ):
            file.attrs.create(key, np.array(text.encode(), f"S{width}"))
        file[" format"] = np.frombuffer(b"IEEE_LITTLE_32\0", np.int8)
        file[" version"] = np.frombuffer(b"HDF5 Version 1.10.4".ljust(33, b"\0"), np.int8)
        node(file, "CGNSLibraryVersion", "CGNSLibraryVersion_t", np.array([3.4], np.float32), "R4")
        base = node(file, "Base", "CGNSBase_t", np.array([3, 3], np.int32), "I4")
        count = sum(len(cells) for _, _, cells in sections)
        zone = node(base, "Zone", "Zone_t", np.array([[len(points)], [count], [0]], np.int32), "I4")
        node(zone, "ZoneType", "ZoneType_t", letters("Unstructured"), "C1")
        grid = node(zone, "GridCoordinates", "GridCoordinates_t")
        for axis, values in zip("XYZ", points.T, strict=True):
            node(grid, f"Coordinate{axis}", "DataArray_t", values.copy(), "R8")
        first = 1
        for name, code, cells in sections:
            section = node(zone, name, "Elements_t", np.array([code, 0], np.int32), "I4")
            node(section, "ElementRange", "IndexRange_t", np.array([first, first + len(cells) - 1], np.int32), "I4")
            node(section, "ElementConnectivity", "DataArray_t", (cells + 1).astype(np.int32).ravel(), "I4")
            first += len(cells)
        if fields:
            solution = node(zone, "Solution", "FlowSolution_t")
            node(solution, "GridLocation", "GridLocation_t", letters("Vertex"), "C1")
            for name, values in fields:
                node(solution, name, "DataArray_t", values, "R8")
        for name, other in links:
            base[name] = h5py.ExternalLink(other, "/Base")
    return path


def test_cgns_20_node_hexahedron_and_a_shape(tmp_path):
    """Mid-edge nodes in the order of the published numbering (bottom, upright, top) land in the middle of edges."""
    kind = KINDS["hex20"]
    corners = kind.reference[:8]
    edges = [(0, 1), (1, 2), (2, 3), (3, 0), (0, 4), (1, 5), (2, 6), (3, 7), (4, 5), (5, 6), (6, 7), (7, 4)]
    points = np.vstack([corners, *((corners[a] + corners[b]) / 2 for a, b in edges)])
    shape = np.random.default_rng(2).normal(size=(20, 3))
    fields = [(f"Displacement{axis}", shape[:, i].copy()) for i, axis in enumerate("XYZ")]
    path = cgns(tmp_path / "a.cgns", points, [("Solid", 18, np.arange(20)[None])], fields)
    mesh, report = read_mesh_report(path)
    assert mesh.blocks[0].kind == "hex20"
    assert report.warnings == ()
    for edge in kind.edges:
        start, end, middle = (mesh.points[mesh.blocks[0].nodes[0, node]] for node in edge)
        assert np.allclose(middle, (start + end) / 2, atol=1e-12)
    (tmp_path / "a_frequencies.csv").write_text("mode,freq_hz\n1,5\n")
    modes = read_modes(path, mesh)
    assert np.array_equal(modes.shape(0), shape)


def test_cgns_that_links_to_another_file_is_refused(tmp_path):
    points = KINDS["tet4"].reference
    path = cgns(tmp_path / "a.cgns", points, [("S", 10, np.arange(4)[None])], links=[("Far", "../secret.cgns")])
    with pytest.raises(LoadError, match=r"refers to another file; found: \.\./secret\.cgns"):
        read_mesh(path)
    (tmp_path / "b.cgns").write_bytes(b"@(#)ADF Database Version B02012>" + bytes(1000))
    with pytest.raises(LoadError, match=r"container that is not read; expected: CGNS in HDF5"):
        read_mesh(tmp_path / "b.cgns")

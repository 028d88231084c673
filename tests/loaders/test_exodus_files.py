"""Exodus files written by netCDF4 in every flavour, by meshio and by VTK; numbering against VTK's own reader."""

import meshio
import netCDF4
import numpy as np
import pytest

from tests.loaders import vtk_exodus
from tests.loaders.samples import END_QUAD, clear, cube_rows, grid_points, read_all
from tests.loaders.test_foreign_files import vtk_grid
from viewer.cells import KINDS, measures
from viewer.errors import LoadError
from viewer.loaders import read_mesh, read_mesh_report, read_modes

FLAVOURS = ("NETCDF3_CLASSIC", "NETCDF3_64BIT_OFFSET", "NETCDF3_64BIT_DATA", "NETCDF4")
RNG = np.random.default_rng(11)
SHAPES, TURNS, ENERGY = RNG.normal(size=(3, 16, 3)), RNG.normal(size=(3, 16, 3)), RNG.random((3, 4))
TIMES = [10.5, 10.5, 22.0]


class Writer:
    """Names and layout by the published manual of the format (SAND92-2137, appendix on netCDF)."""

    def __init__(self, path, flavour, flat=False):
        self.nc = netCDF4.Dataset(path, "w", format=flavour)
        self.nc.createDimension("time_step", None)
        self.nc.createDimension("len_name", 33)
        self.flat = flat

    def put(self, name, values, *dims, **attributes):
        values = np.asarray(values)
        names = []
        for axis, size in enumerate(values.shape):
            dim = dims[axis] if axis < len(dims) else f"{name}_{axis}"
            if dim not in self.nc.dimensions:
                self.nc.createDimension(dim, size)
            names.append(dim)
        kind = {"f": "f8", "i": "i4", "S": "S1"}[values.dtype.kind]
        variable = self.nc.createVariable(name, kind, names)
        variable.setncatts(attributes)
        variable[: len(values)] = values
        return self

    def texts(self, name, words, dim):
        letters = np.zeros((len(words), 33), "S1")
        for row, word in zip(letters, words, strict=True):
            row[: len(word)] = [c.encode() for c in word]
        return self.put(name, letters, dim, "len_name")

    def points(self, points):
        for axis, column in zip("xy" if self.flat else "xyz", np.asarray(points, float).T, strict=False):
            self.put(f"coord{axis}", column, "num_nodes")
        return self

    def nodal(self, **variables):
        self.texts("name_nod_var", list(variables), "num_nod_var")
        for number, values in enumerate(variables.values(), 1):
            self.put(f"vals_nod_var{number}", values, "time_step", "num_nodes")
        return self

    def close(self):
        self.nc.close()


def full(path, flavour, *, freq=True):
    file = Writer(path, flavour).points(grid_points())
    file.put("time_whole", TIMES, "time_step")
    file.put("node_num_map", np.arange(16, 0, -1) * 10, "num_nodes")
    file.put("elem_num_map", [7, 5, 3, 100], "num_elem")
    file.put("eb_prop1", [4, 9], "num_el_blk").texts("eb_names", ["beam", ""], "num_el_blk")
    file.put("connect1", cube_rows() + 1, elem_type="HEX8").put("connect2", END_QUAD + 1, elem_type="SHELL4")
    file.put("ns_prop1", [77], "num_node_sets").put("node_ns1", [1, 5, 9, 13])
    file.put("ss_prop1", [1], "num_side_sets").texts("ss_names", ["far end"], "num_side_sets")
    file.put("elem_ss1", [3, 4]).put("side_ss1", [2, 3])
    xyz = {f"DISPL{axis}": SHAPES[:, :, i] for i, axis in enumerate("XYZ")}
    file.nodal(TEMPERATURE=np.ones((3, 16)), **xyz, **{f"ROT{a}": TURNS[:, :, i] for i, a in enumerate("XYZ")})
    file.texts("name_elem_var", ["STRAIN_ENERGY"], "num_elem_var")
    file.put("vals_elem_var1eb1", ENERGY[:, :3], "time_step").put("vals_elem_var1eb2", ENERGY[:, 3:], "time_step")
    if freq:
        file.texts("name_glo_var", ["other", "frequency", "damping"], "num_glo_var")
        file.put("vals_glo_var", [[0.0, 5.0, 0.01], [0, 6, 0.02], [0, 7, 0.03]], "time_step", "num_glo_var")
    file.close()
    return path


@pytest.mark.parametrize("suffix", [".e", ".exo", ".ex2"])
@pytest.mark.parametrize("flavour", FLAVOURS)
def test_everything_in_every_flavour(tmp_path, flavour, suffix):
    path = full(tmp_path / f"a{suffix}", flavour)
    mesh = read_mesh(path)
    assert np.array_equal(mesh.points, grid_points())
    assert mesh.node_ids.tolist() == list(range(160, 0, -10))
    assert [(b.kind, b.nodes.tolist(), b.ids.tolist()) for b in mesh.blocks] == [
        ("hex8", cube_rows().tolist(), [7, 5, 3]),
        ("quad4", END_QUAD.tolist(), [100]),
    ]
    assert {n: r.tolist() for n, r in mesh.cell_groups.items()} == {"beam": [0, 1, 2], "block 9": [3]}
    far = np.flatnonzero(grid_points()[:, 0] == 3)
    assert {n: r.tolist() for n, r in mesh.node_groups.items()} == {
        "node set 77": [0, 4, 8, 12],
        "far end": sorted({*far.tolist(), 0, 4}),  # side 2 of the last cube, and the first edge of the shell
    }
    modes = read_modes(path, mesh)
    assert modes.freq_hz.tolist() == [5, 6, 7]
    assert modes.damping.tolist() == [0.01, 0.02, 0.03]
    assert np.array_equal(modes.cell_energy, ENERGY)
    for i in range(3):
        assert np.array_equal(modes.shape(i), SHAPES[i])
        assert np.array_equal(modes.rotations(i), TURNS[i])
    assert np.array_equal(read_mesh(path, length_unit=0.001).points, grid_points() * 0.001)


@pytest.mark.parametrize("flavour", FLAVOURS)
def test_times_are_frequencies_and_may_repeat(tmp_path, flavour):
    path = full(tmp_path / "a.exo", flavour, freq=False)
    modes = read_modes(path, read_mesh(path))
    assert modes.freq_hz.tolist() == TIMES
    assert [np.array_equal(modes.shape(i), SHAPES[i]) for i in range(3)] == [True] * 3


@pytest.mark.parametrize("flavour", FLAVOURS)
def test_complex_shapes_in_the_plane(tmp_path, flavour):
    file = Writer(tmp_path / "a.e", flavour, flat=True).points([[0, 0], [1, 0], [1, 1], [0, 1]])
    file.put("time_whole", [3.5], "time_step").put("connect1", [[1, 2, 3, 4]], elem_type="QUAD")
    file.put("elem_ss1", [1]).put("side_ss1", [2])
    parts = {f"disp_{axis}_{part}": RNG.normal(size=(1, 4)) for axis in "xy" for part in ("re", "im")}
    file.nodal(**parts).close()
    mesh = read_mesh(tmp_path / "a.e")
    assert mesh.points[:, 2].tolist() == [0] * 4
    assert mesh.node_groups["side set 1"].tolist() == [1, 2]
    shape = read_modes(tmp_path / "a.e", mesh).shape(0)
    for i, axis in enumerate("xy"):
        assert np.array_equal(shape[:, i], parts[f"disp_{axis}_re"][0] + 1j * parts[f"disp_{axis}_im"][0])
    assert not shape[:, 2].any()


NAMES = {
    "hex8": "HEX8", "hex20": "HEX20", "hex27": "HEX27", "tet4": "TETRA", "tet10": "TETRA10", "wedge6": "WEDGE",
    "wedge15": "WEDGE15", "pyramid5": "PYRAMID", "pyramid13": "PYRAMID13", "quad4": "SHELL4", "quad8": "SHELL8",
    "quad9": "SHELL9", "tri3": "TRI3", "tri6": "TRI6", "line2": "BAR2", "line3": "BAR3",
}  # fmt: skip


@pytest.mark.parametrize("kind", [kind for kind in NAMES if kind != "quad9"])  # VTK drops its ninth node
def test_node_order_is_that_of_vtks_reader(tmp_path, kind):
    """Nodes in any place: VTK's reader of the format, an independent one, must put the same node first, second …"""
    count = KINDS[kind].n_nodes
    points = RNG.random((count, 3))
    path = tmp_path / "a.exo"
    file = Writer(path, "NETCDF3_64BIT_OFFSET").points(points)
    file.nc.setncatts({"api_version": np.float32(5.1), "version": np.float32(5.1), "title": "one cell"})
    file.nc.setncatts({"floating_point_word_size": np.int32(8), "file_size": np.int32(1)})
    for dim, size in (("num_dim", 3), ("num_elem", 1), ("len_string", 33), ("len_line", 81)):
        file.nc.createDimension(dim, size)
    file.put("eb_prop1", [1], "num_el_blk").put("eb_status", [1], "num_el_blk")
    file.nc["eb_prop1"].setncattr("name", "ID")
    file.put("time_whole", [0.0], "time_step")
    file.put("connect1", [np.arange(count) + 1], "num_el_in_blk1", "num_nod_per_el1", elem_type=NAMES[kind])
    file.close()
    vtk_exodus.apart("read", path, tmp_path / "vtk.npz")
    answer = np.load(tmp_path / "vtk.npz")
    assert answer["counts"].tolist() == [1, 1]
    assert answer["kind"] == KINDS[kind].vtk_type
    theirs = answer["points"][:count]
    mesh = read_mesh(path)
    ours = mesh.points[mesh.blocks[0].nodes[0]]
    # ours may turn the cell the right way round; then it is the mirror image
    assert np.allclose(ours, theirs, atol=1e-6) or np.allclose(ours, theirs[KINDS[kind].mirror], atol=1e-6)


@pytest.mark.parametrize("kind", ["hex20", "wedge15", "tet10", "hex8", "pyramid5"])
def test_sides_carry_the_nodes_of_one_plane(tmp_path, kind):
    """Every side of a straight cell is plane, and all of them together use every node on the outside."""
    item = KINDS[kind]
    back = np.argsort({"hex20": (*range(12), 16, 17, 18, 19, 12, 13, 14, 15),
                       "wedge15": (*range(9), 12, 13, 14, 9, 10, 11)}.get(kind, range(item.n_nodes)))  # fmt: skip
    sides = len(item.faces)
    file = Writer(tmp_path / "a.exo", "NETCDF4").points(item.reference)
    file.put("connect1", [back + 1], elem_type=NAMES[kind])
    for side in range(1, sides + 1):
        file.put(f"elem_ss{side}", [1]).put(f"side_ss{side}", [side])
    file.close()
    mesh = read_mesh(tmp_path / "a.exo")
    assert measures(kind, mesh.points[mesh.blocks[0].nodes]) == pytest.approx(measures(kind, item.reference[None]))
    found = [frozenset(rows.tolist()) for rows in mesh.node_groups.values()]
    assert set(found) == {frozenset(face) for _, face in item.faces}
    for rows in found:
        points = mesh.points[sorted(rows)]
        assert np.linalg.matrix_rank(points - points[0], tol=1e-9) == 2


@pytest.mark.parametrize("more", [{}, {"point_sets": {"root": np.array([0, 4])}}])
def test_file_of_meshio(tmp_path, more):
    mesh = meshio.Mesh(
        grid_points(), [("hexahedron", cube_rows()), ("quad", END_QUAD)],
        point_data={f"mode {axis}": SHAPES[0, :, i] for i, axis in enumerate("xyz")}, **more,
    )  # fmt: skip
    meshio.exodus.write(tmp_path / "a.exo", mesh)
    read = read_mesh(tmp_path / "a.exo")
    assert np.array_equal(read.points, grid_points())
    assert [(b.kind, b.nodes.tolist()) for b in read.blocks] == [
        ("hex8", cube_rows().tolist()),
        ("quad4", [[0, 4, 12, 8]]),
    ]
    assert not more or [r.tolist() for r in read.node_groups.values()] == [[0, 4]]
    (tmp_path / "a_frequencies.csv").write_text("mode,freq_hz\n1,5\n")
    modes = read_modes(tmp_path / "a.exo", read)
    assert modes.freq_hz.tolist() == [5]
    assert np.array_equal(modes.shape(0), SHAPES[0])


def test_file_of_vtk(tmp_path):
    vtk_grid().save(tmp_path / "grid.vtu")
    vtk_exodus.apart("write", tmp_path / "grid.vtu", tmp_path / "a.e")
    read = read_mesh(tmp_path / "a.e")
    assert {b.kind: len(b) for b in read.blocks} == {"hex8": 3, "quad4": 1}
    for kind, points in (("hex8", grid_points()[cube_rows()]), ("quad4", grid_points()[END_QUAD])):
        block = next(b for b in read.blocks if b.kind == kind)
        assert np.allclose(read.points[block.nodes], points)
    with pytest.raises(LoadError, match=r"no vector array on points|no time step"):  # that writer leaves them out
        read_modes(tmp_path / "a.e", read)


# --- damaged ---


@pytest.mark.parametrize("flavour", FLAVOURS)
@pytest.mark.parametrize("percent", [1, 10, 30, 50, 75, 90, 97])
def test_cut_short(tmp_path, flavour, percent):
    path = full(tmp_path / "a.exo", flavour)
    whole, data = read_mesh(path), path.read_bytes()
    path.write_bytes(data[: len(data) * percent // 100])
    with pytest.raises(LoadError) as caught:
        read_all(path, whole)
    clear(caught.value, path)


@pytest.mark.parametrize("flavour", FLAVOURS)
@pytest.mark.parametrize("seed", range(25))
def test_bytes_turned(tmp_path, flavour, seed):
    path = full(tmp_path / "a.exo", flavour)
    mesh = read_mesh(path)
    data, rng = bytearray(path.read_bytes()), np.random.default_rng(seed)
    limit = len(data) if seed % 2 else 3000  # the header is where it hurts
    for at in rng.integers(4, limit, 4):
        data[at] ^= int(rng.integers(1, 256))
    path.write_bytes(bytes(data))
    try:
        found, _, shapes = read_all(path, mesh)
    except LoadError as error:
        clear(error, path, foreseen=flavour != "NETCDF4")
    else:
        assert found.points.shape == (found.n_nodes, 3)
        assert all(np.isfinite(shape).all() and shape.shape == (mesh.n_nodes, 3) for shape in shapes)


def wrong(path, change):
    full(path, "NETCDF4")
    with netCDF4.Dataset(path, "a") as nc:
        change(nc)
    return path


BAD = {
    "node number outside": (lambda nc: nc["connect1"].__setitem__((0, 0), 99), r"names a point.*found: index 98"),
    "node number zero": (lambda nc: nc["connect1"].__setitem__((0, 0), 0), r"names a point.*found: index -1"),
    "numbers twice": (lambda nc: nc["node_num_map"].__setitem__(0, 150), r"node ids repeat; found: node 150"),
    "node set outside": (
        lambda nc: nc["node_ns1"].__setitem__(0, 17),
        r"node set 77' reaches outside; found: row 16",
    ),
    "element of no place": (lambda nc: nc["elem_ss1"].__setitem__(0, 5), r"elem_ss1: a side set names.*found: 5"),
    "side of no place": (lambda nc: nc["side_ss1"].__setitem__(0, 7), r"side_ss1: a hex8 has no such side; found: 7"),
    "no coordinates": (lambda nc: nc.renameVariable("coordx", "x"), r"array 'coordx' is missing"),
    "step never written": (
        lambda nc: nc["time_whole"].__setitem__(3, 30.0),
        r"never written|a mode shape is missing; found: 3 steps",
    ),
    "frequency negative": (
        lambda nc: nc["vals_glo_var"].__setitem__((1, 1), -6),
        r"freq_hz 2: a frequency is negative",
    ),
    "energy negative": (
        lambda nc: nc["vals_elem_var1eb1"].__setitem__((1, 1), -6),
        r"mode 2, element 5: .*is negative",
    ),
    "no shape": (lambda nc: nc.renameVariable("name_nod_var", "x"), r"holds no vector array on points"),
}


@pytest.mark.parametrize("case", BAD)
def test_bad_files(tmp_path, case):
    change, message = BAD[case]
    whole = read_mesh(full(tmp_path / "whole.exo", "NETCDF4"))
    path = wrong(tmp_path / "a.exo", change)
    with pytest.raises(LoadError, match=message) as caught:
        read_all(path, whole)
    clear(caught.value, path)


@pytest.mark.parametrize(
    "content", [b"hello", b"CDF", b"CDF\x09", b"CDF\x01" + b"\xff" * 40, b"\x89HDF\r\n\x1a\n123"]
)
def test_no_exodus_at_all(tmp_path, content):
    path = tmp_path / "a.exo"
    path.write_bytes(content)
    with pytest.raises(LoadError) as caught:
        read_mesh(path)
    clear(caught.value, path)


def test_unknown_cells_are_named(tmp_path):
    file = Writer(tmp_path / "a.exo", "NETCDF3_CLASSIC").points(grid_points())
    file.put("connect1", [[1, 2, 3, 4, 5, 6, 7]], elem_type="NFACED").put("connect2", END_QUAD + 1, elem_type="quad")
    file.close()
    mesh, report = read_mesh_report(tmp_path / "a.exo")
    assert [(b.kind, b.ids.tolist()) for b in mesh.blocks] == [("quad4", [2])]
    assert "1 cells of type NFACED left out: not known here" in report.notes

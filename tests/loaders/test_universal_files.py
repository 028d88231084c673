"""Universal files: layouts by the published descriptions of the data sets, files of pyuff, and round trips."""

import numpy as np
import pytest
import pyuff

from tests.loaders import universal_samples as sample
from tests.loaders.samples import cube_rows, grid_points, make_modes, one_of_each_kind
from viewer.cells import KINDS, measures
from viewer.errors import LoadError
from viewer.loaders import read_mesh, read_mesh_report, read_modes, universal_files, write_interchange
from viewer.loaders.universal_cells import DESCRIPTORS
from viewer.loaders.universal_sections import read_universal
from viewer.model.mesh import CellBlock, Mesh

SQUARE = [[0.0, 0, 0], [2, 0, 0], [2, 2, 0], [0, 2, 0]]
LABELS = [11, 7, 1234567890, 3]
QUAD = sample.elements_2412((5, 94, LABELS))


def put(tmp_path, *parts, name="a.unv", newline="\n"):
    path = tmp_path / name
    path.write_bytes("".join(parts).replace("\n", newline).encode("latin-1"))
    return path


# --- written by the descriptions of the data sets ---


@pytest.mark.parametrize("newline", ["\n", "\r\n", "   \n"])
def test_nodes_and_elements(tmp_path, newline):
    mesh = read_mesh(put(tmp_path, sample.nodes_2411(LABELS, SQUARE), QUAD, newline=newline))
    assert mesh.node_ids.tolist() == LABELS
    assert mesh.points.tolist() == SQUARE
    assert [(b.kind, b.ids.tolist(), b.nodes.tolist()) for b in mesh.blocks] == [("quad4", [5], [[0, 1, 2, 3]])]


def test_columns_that_touch(tmp_path):
    """Ten-digit labels and negative numbers leave no blank between fields."""
    points = [[-1.23456e-100, -2e-100, -3.5], [1.0, -2.0, -3.5], [1.0, 2.0, -3.5]]
    labels = [2147483645, 2147483646, 2147483647]
    lines = [
        sample.record("4I10,1P3E13.5", n, 1, 2000000001, 2000000002, *p) for n, p in zip(labels, points, strict=True)
    ]
    assert "20000000012000000002-1.23456E-100-2.00000E-100 " in lines[0]
    path = put(tmp_path, sample.data_set(15, *lines), sample.elements_2412((1, 91, labels)))
    mesh = read_mesh(path)
    assert mesh.node_ids.tolist() == labels
    assert mesh.points.tolist() == points


def test_exponents_without_letter_and_free_columns(tmp_path):
    nodes = "    -1\n  2411\n1 1 1 11\n1.5-101 2.5d0 3\n2 1 1 11\n  1.0D+00  0.0  0.0\n3 1 1 11\n0 1 0\n    -1\n"
    mesh = read_mesh(put(tmp_path, nodes, "    -1\n2412\n4 91 1 1 7 3\n1 2 3\n    -1\n"))
    assert mesh.points.tolist() == [[1.5e-101, 2.5, 3], [1, 0, 0], [0, 1, 0]]


@pytest.mark.parametrize("kind", list(DESCRIPTORS))
def test_node_order(tmp_path, kind):
    """Corner, mid-edge, corner … around every face ring, as the format numbers parabolic elements."""
    # by hand, from the numbering of parabolic elements: corner and mid-side nodes alternate around each ring
    rings = {
        "line3": "0 01 1",
        "tri6": "0 01 1 12 2 20",
        "quad8": "0 01 1 12 2 23 3 30",
        "tet10": "0 01 1 12 2 20 03 13 23 3",
        "wedge15": "0 01 1 12 2 20 03 14 25 3 34 4 45 5 53",
        "hex20": "0 01 1 12 2 23 3 30 04 15 26 37 4 45 5 56 6 67 7 74",
    }
    descriptor = DESCRIPTORS[kind]
    item = KINDS[kind]
    corners = np.zeros((item.n_corners, 3))
    corners[:, : item.dim] = item.reference[: item.n_corners]
    ring = rings.get(kind, " ".join(str(i) for i in range(item.n_corners))).split()
    points = np.array([corners[[int(c) for c in word]].mean(axis=0) for word in ring])
    labels = list(range(10, 10 + len(points)))
    path = put(tmp_path, sample.nodes_2411(labels, points), sample.elements_2412((1, descriptor, labels)))
    mesh, report = read_mesh_report(path)
    assert report.warnings == ()
    assert mesh.blocks[0].kind == kind
    xyz = mesh.points[mesh.blocks[0].nodes]
    assert measures(kind, xyz)[0] == pytest.approx(
        measures(kind, KINDS[kind].reference[None] @ np.eye(item.dim, 3))[0]
    )
    for edge in item.edges:
        if len(edge) == 3:
            first, second, middle = (xyz[0, node] for node in edge)
            assert np.allclose(middle, (first + second) / 2)


def test_rods_with_and_without_a_line_of_orientation(tmp_path):
    nodes = sample.nodes_2411([1, 2, 3, 4], SQUARE)
    rods = sample.data_set(
        2412,
        *(sample.record("6I10", 1, 11, 1, 1, 7, 2), sample.record("8I10", 1, 2)),
        *(sample.record("6I10", 2, 11, 1, 1, 7, 2), sample.record("3I10", 0, 1, 1), sample.record("8I10", 2, 3)),
        *(sample.record("6I10", 3, 21, 1, 1, 7, 2), sample.record("3I10", 0, 1, 1), sample.record("8I10", 3, 4)),
        *(sample.record("6I10", 4, 161, 1, 1, 7, 1), sample.record("8I10", 4)),
    )
    mesh, report = read_mesh_report(put(tmp_path, nodes, rods))
    assert [(b.kind, b.nodes.tolist(), b.ids.tolist()) for b in mesh.blocks] == [
        ("line2", [[0, 1], [1, 2]], [1, 2]),
        ("line2", [[2, 3]], [3]),
    ]
    assert any("1 of descriptor 161 with 1 nodes" in warning for warning in report.warnings)


def test_coordinate_systems(tmp_path):
    """Points of data sets 15 and 781 in cylindrical and spherical systems on turned and moved ones."""
    systems = sample.data_set(
        18,
        # 5: cartesian at (1, 0, 0), x along y, z along z; by a point on x and one on the xz plane
        *(sample.record("5I10", 5, 0, 0, 8, 1), "MOVED", sample.record("1P6E13.5", 1, 0, 0, 1, 1, 0)),
        sample.record("1P6E13.5", 1, 1, 1),
        # 6: cylindrical on 5, from the same origin and axes
        *(sample.record("5I10", 6, 1, 5, 8, 1), "ROUND", sample.record("1P6E13.5", 0, 0, 0, 1, 0, 0)),
        sample.record("1P6E13.5", 1, 0, 1),
    )
    ball = sample.data_set(
        2420,
        sample.record("2I10", 1),
        "PART",
        sample.record("4I10", 9, 2, 8),
        "BALL",
        *(sample.record("1P3D25.16", *row) for row in ([0, 1, 0], [-1, 0, 0], [0, 0, 1], [10, 0, 0])),
    )
    nodes = sample.data_set(
        15,
        sample.record("4I10,1P3E13.5", 1, 0, 0, 1, 7, 8, 9),
        sample.record("4I10,1P3E13.5", 2, 5, 0, 1, 2, 0, 3),
        sample.record("4I10,1P3E13.5", 3, 6, 0, 1, 2, 90, 3),
        sample.record("4I10,1P3E13.5", 4, 9, 0, 1, 2, 0, 90),
    )
    path = put(tmp_path, systems, ball, nodes, sample.elements_2412((1, 94, [1, 2, 3, 4])))
    mesh, report = read_mesh_report(path)
    assert np.allclose(mesh.points, [[7, 8, 9], [1, 2, 3], [-1, 0, 3], [10, 2, 0]], atol=1e-6)
    assert any("degrees" in note for note in report.notes)
    lone = put(tmp_path, nodes, QUAD, name="b.unv")
    with pytest.raises(LoadError, match=r"node 2: .*does not define; found: system 5"):
        read_mesh(lone)


def test_units(tmp_path):
    shape = [[0.0, 0, 1], [0, 0, 2], [0, 0, 3], [0, 0, 4]]
    path = put(
        tmp_path,
        sample.units(1000.0, 1000.0, 5, "mm (milli newton)"),
        sample.nodes_2411(LABELS, SQUARE),
        QUAD,
        sample.mode_55(LABELS, shape, 12.5, mass=1.0),
    )
    for unit in (1.0, 0.001):
        mesh = read_mesh(path, length_unit=unit)
        assert np.allclose(mesh.points, np.array(SQUARE) / 1000)
        modes = read_modes(path, mesh, length_unit=unit)
        assert np.allclose(modes.shape(0), np.array(shape) / 1000)
        assert modes.normalisation == "unknown"  # one of another mass unit
    assert any("states its unit of length: 0.001 m" in note for note in read_mesh_report(path)[1].notes)
    with pytest.raises(LoadError, match=r"stated twice and differs; found: 0.001 m in the file, 0.0254 m beside it"):
        read_mesh(path, length_unit=0.0254)


def test_normal_modes(tmp_path):
    shape = [[1.0, 0, 1], [-2, 0, 2], [0, 0, -3e-7], [0, 0, 4]]
    labels = LABELS[::-1]
    path = put(
        tmp_path,
        sample.units(),
        sample.nodes_2411(LABELS, SQUARE),
        QUAD,
        sample.mode_55(labels, shape[::-1], 12.5, mass=1.0, viscous=0.02),
        sample.mode_55(LABELS[:3], shape[:3], 12.5, mode=2, mass=1.0, hysteretic=0.02),
    )
    mesh = read_mesh(path)
    modes = read_modes(path, mesh)
    assert modes.freq_hz.tolist() == [12.5, 12.5]
    assert modes.damping.tolist() == [0.02, 0.01]
    assert modes.normalisation == "mass"
    assert modes.shape(0).tolist() == shape
    assert modes.shape(1).tolist() == [*shape[:3], [0, 0, 0]]  # note 9: no entry is no motion


def test_rotations_and_those_that_are_not_given(tmp_path):
    six = [[1.0, 2, 3, 0.1, 0.2, 0.3]] * 4
    geometry = sample.nodes_2411(LABELS, SQUARE) + QUAD
    for values, has in ((six, True), ([[*row[:3], 0, 0, 0] for row in six], False)):
        path = put(tmp_path, geometry, sample.mode_55(LABELS, values, 1.0))
        modes = read_modes(path, read_mesh(path))
        assert modes.shape(0).tolist() == [[1, 2, 3]] * 4
        assert modes.shapes.has_rotations == has
        assert not has or modes.rotations(0).tolist() == [[0.1, 0.2, 0.3]] * 4
        assert modes.damping is None
        assert modes.normalisation == "unknown"


@pytest.mark.parametrize("components", [3, 6])
def test_complex_modes(tmp_path, components):
    shape = (np.arange(4 * components).reshape(4, components) + 1) * (1 + 0.25j)
    eigenvalue = -0.01 * 200 + 1j * 200 * np.sqrt(1 - 1e-4)
    path = put(
        tmp_path, sample.nodes_2411(LABELS, SQUARE), QUAD, sample.complex_mode_55(LABELS, shape.tolist(), eigenvalue)
    )
    modes = read_modes(path, read_mesh(path))
    assert modes.freq_hz[0] == pytest.approx(200 / (2 * np.pi), rel=1e-5)
    assert modes.damping[0] == pytest.approx(0.01, rel=1e-4)
    assert np.allclose(modes.shape(0), shape[:, :3])
    assert components == 3 or np.allclose(modes.rotations(0), shape[:, 3:])


def test_analysis_data(tmp_path):
    """2414: modes at nodes and strain energies of elements; 55 beside it is the older copy."""
    shape = [[1.0, 2, 3], [4, 5, 6], [7, 8, 9], [0, 0, 1e-9]]
    nodes, cells = sample.nodes_2411(LABELS, SQUARE), sample.elements_2412((5, 91, LABELS[:3]), (2, 91, LABELS[1:]))
    path = put(
        tmp_path,
        nodes,
        cells,
        sample.mode_55(LABELS, [[9.0, 9, 9]] * 4, 1.0),
        sample.analysis_2414(1, LABELS, shape, 33.0, mode=1, mass=1.0, damping=0.03),
        sample.analysis_2414(1, LABELS, shape, 44.0, mode=2, mass=1.0),
        sample.analysis_2414(2, [5, 2], [[0.25], [0.5]], 33.0, mode=1, quantity=7),
        sample.analysis_2414(2, [2, 5], [[4.0], [2.0]], 44.0, mode=2, quantity=7),
    )
    modes = read_modes(path, read_mesh(path))
    assert modes.freq_hz.tolist() == [33, 44]
    assert modes.damping.tolist() == [0.03, 0]
    assert modes.shape(1).tolist() == shape
    assert modes.cell_energy.tolist() == [[0.25, 0.5], [2, 4]]
    gap = put(tmp_path, nodes, cells, sample.analysis_2414(1, LABELS[1:], shape[1:], 33.0), name="b.unv")
    with pytest.raises(LoadError, match=r"1 nodes have no result in a mode; found: node 11 is missing"):
        read_modes(gap, read_mesh(gap))


def test_complex_analysis_data(tmp_path):
    shape = [[1 + 1j, 2 - 2j, 3j], [4.0 + 0j, 5, 6], [7j, 8j, 9j], [0j, 0j, 1 + 0j]]
    data = sample.analysis_2414(1, LABELS, shape, 0.0, analysis=7, real=(-3.0, 4.0, 0, 0, 0, 0))
    path = put(tmp_path, sample.nodes_2411(LABELS, SQUARE), QUAD, data)
    modes = read_modes(path, read_mesh(path))
    assert np.array_equal(modes.shape(0), shape)
    assert modes.freq_hz[0] == pytest.approx(5 / (2 * np.pi))
    assert modes.damping[0] == pytest.approx(0.6)


def test_trace_lines_and_the_parts_of_a_hammer_test(tmp_path):
    path = put(
        tmp_path,
        sample.nodes_15([1, 2, 3, 4], SQUARE),
        sample.trace_line(1, [1, 2, 3, 0, 4, 1], "edge"),
        sample.mode_55([1, 2, 3, 4], [[0.0, 0, 1]] * 4, 20.0, quantity=12),
    )
    parts = read_universal(path)
    (line,) = parts.trace_lines
    assert (line.name, line.nodes, line.strokes()) == ("edge", (1, 2, 3, 0, 4, 1), [(1, 2), (2, 3), (4, 1)])
    assert parts.results[0].values.tolist() == [[0, 0, 1]] * 4
    mesh, report = read_mesh_report(path)
    assert {tuple(sorted(mesh.node_ids[pair].tolist())) for pair in mesh.blocks[0].nodes} == {(1, 2), (2, 3), (1, 4)}
    assert any("trace lines" in note for note in report.notes)
    assert read_modes(path, mesh).shape(0)[0].tolist() == [0, 0, 1]


def test_long_trace_lines(tmp_path):
    """More than a line of nodes, labels that touch, and a count that leaves repeated nodes out."""
    nodes = [*range(1, 9), 2147483646, 2147483647, 2147483647, 1]
    for count in (12, 11):
        text = sample.trace_line(1, nodes).replace(f"{12:10d}{1:10d}", f"{count:10d}{1:10d}", 1)
        (line,) = read_universal(put(tmp_path, text)).trace_lines
        assert line.nodes == tuple(nodes)
        assert (2147483646, 2147483647) in line.strokes()
    with pytest.raises(LoadError, match=r"ends inside a trace line; found: 12 nodes; expected: 13"):
        read_universal(put(tmp_path, sample.trace_line(1, nodes).replace(f"{12:10d}{1:10d}", f"{13:10d}{1:10d}", 1)))


def test_unknown_data_sets_are_left_out_and_named(tmp_path):
    strange = sample.data_set(151, "title", "", "text -1 in it", "        -1") + sample.data_set(2429)
    mesh, report = read_mesh_report(put(tmp_path, strange, sample.nodes_2411(LABELS, SQUARE), "\n", QUAD, strange))
    assert mesh.n_cells == 1
    assert "data sets left out: 151 (2 times), 2429 (2 times)" in report.notes


# --- written by pyuff ---


def pyuff_file(path, *sets):
    file = pyuff.UFF(str(path))
    for number, item in enumerate(sets):
        file.write_sets(item, "overwrite" if number == 0 else "add")
    return path


def pyuff_mode(labels, shape, freq, damping, number):
    return pyuff.prepare_55(
        model_type=1,
        id1="NONE",
        id2="NONE",
        id3="NONE",
        id4="NONE",
        id5="NONE",
        analysis_type=2,
        data_ch=2,
        spec_data_type=8,
        load_case=1,
        mode_n=number,
        modal_m=1.0,
        modal_damp_vis=damping,
        modal_damp_his=0.0,
        freq=freq,
        node_nums=labels,
        r1=shape[:, 0],
        r2=shape[:, 1],
        r3=shape[:, 2],
        n_data_per_node=3,
        data_type=2,
    )


@pytest.mark.parametrize("nodes", [15, 2411])
@pytest.mark.parametrize("binary", [0, 1])
def test_file_of_pyuff(tmp_path, nodes, binary):
    points, rows = grid_points(), cube_rows()
    labels, zero = np.arange(16) + 101, np.zeros(16, int)
    prepare = pyuff.prepare_15 if nodes == 15 else pyuff.prepare_2411
    shapes = np.random.default_rng(3).normal(size=(2, 16, 3))
    response = pyuff.prepare_58(
        binary=binary,
        func_type=4,
        rsp_node=101,
        rsp_dir=1,
        ref_dir=1,
        ref_node=102,
        data=np.arange(600) * (1 + 2j),
        x=np.arange(600.0),
        id1="a",
        rsp_ent_name="b",
        ref_ent_name="c",
        abscissa_spacing=1,
        abscissa_spec_data_type=18,
        ordinate_spec_data_type=12,
        orddenom_spec_data_type=13,
    )
    path = pyuff_file(
        tmp_path / "a.uff",
        pyuff.prepare_164(
            units_code=1, units_description="SI", temp_mode=1, length=1.0, force=1.0, temp=1.0, temp_offset=0.0
        ),
        response,
        prepare(
            node_nums=labels, def_cs=zero, disp_cs=zero, color=zero, x=points[:, 0], y=points[:, 1], z=points[:, 2]
        ),
        {
            "type": 2412,
            115: [
                {
                    "element_nums": 5 + i,
                    "fe_descriptor": 115,
                    "phys_table": 1,
                    "mat_table": 1,
                    "color": 7,
                    "num_nodes": 8,
                    "nodes_nums": labels[row],
                }
                for i, row in enumerate(rows)
            ],
        },
        pyuff.prepare_82(trace_num=1, n_nodes=4, color=0, id="edge", nodes=labels[:4]),
        response,
        pyuff_mode(labels, shapes[0], 12.0, 0.01, 1),
        pyuff_mode(labels, shapes[1], 34.5, 0.02, 2),
    )
    mesh, report = read_mesh_report(path)
    assert np.allclose(mesh.points, points, rtol=0, atol=1e-12)
    assert mesh.node_ids.tolist() == labels.tolist()
    assert mesh.blocks[0].nodes.tolist() == rows.tolist()
    assert mesh.cell_ids.tolist() == [5, 6, 7]
    assert "data sets left out: 58 (2 times)" in report.notes
    modes = read_modes(path, mesh)
    assert modes.freq_hz.tolist() == [12, 34.5]
    assert modes.damping.tolist() == [0.01, 0.02]
    assert modes.normalisation == "mass"
    assert all(np.allclose(modes.shape(i), shapes[i], rtol=1e-5, atol=1e-8) for i in (0, 1))
    assert read_universal(path).trace_lines[0].nodes == (101, 102, 103, 104)


def test_coordinate_systems_of_pyuff(tmp_path):
    turned = np.array([[0, 1.0, 0], [-1, 0, 0], [0, 0, 1], [5, 6, 7]])
    path = pyuff_file(
        tmp_path / "a.uff",
        {
            "type": 2420,
            "CS_sys_labels": [12],
            "CS_types": [0],
            "CS_colors": [1],
            "CS_names": ["a"],
            "CS_matrices": [turned],
        },
        pyuff.prepare_15(
            node_nums=[1, 2, 3],
            def_cs=[12, 12, 12],
            disp_cs=[0, 0, 0],
            color=[0, 0, 0],
            x=[0.0, 1, 0],
            y=[0.0, 0, 1],
            z=[0.0, 0, 0],
        ),
    )
    parts = read_universal(path)
    assert parts.frames[12].axes.tolist() == turned[:3].tolist()
    assert universal_files.part_points(parts)[1].tolist() == [[5, 6, 7], [5, 7, 7], [4, 6, 7]]


# --- round trips, read by pyuff as well ---


@pytest.mark.parametrize("is_complex", [False, True])
@pytest.mark.parametrize("rotations", [False, True])
def test_round_trip(tmp_path, mesh, is_complex, rotations):
    modes = make_modes(mesh, is_complex=is_complex, rotations=rotations)
    path = write_interchange(tmp_path / "a.unv", mesh, modes)
    again = read_mesh(path)
    assert np.array_equal(again.points, mesh.points)
    assert np.array_equal(again.node_ids, mesh.node_ids)
    assert {n: r.tolist() for n, r in again.node_groups.items()}.items() >= {
        n: r.tolist() for n, r in mesh.node_groups.items()
    }.items()
    read = read_modes(path, again)
    assert np.allclose(read.freq_hz, modes.freq_hz, rtol=1e-5)
    assert np.allclose(read.damping, modes.damping, rtol=1e-4, atol=1e-9)
    for i in range(modes.count):
        assert np.allclose(read.shape(i), modes.shape(i), rtol=1e-5, atol=1e-5)
        assert not rotations or np.allclose(read.rotations(i), modes.rotations(i), rtol=1e-5, atol=1e-5)


def test_pyuff_reads_what_is_written(tmp_path, mesh):
    modes = make_modes(mesh)
    path = write_interchange(tmp_path / "a.unv", mesh.with_(node_groups={}, cell_groups={}), modes)
    sets = {s["type"]: s for s in pyuff.UFF(str(path)).read_sets()}
    assert sets[2411]["node_nums"].tolist() == mesh.node_ids.tolist()
    assert np.array_equal(np.column_stack([sets[2411][axis] for axis in "xyz"]), mesh.points)
    assert sets[2412][115][0]["nodes_nums"] == mesh.node_ids[mesh.blocks[0].nodes[0]].tolist()
    last = sets[55]
    assert last["freq"] == pytest.approx(1 / 3, rel=1e-5)
    assert np.allclose(np.column_stack([last["r1"], last["r2"], last["r3"]]), modes.shape(3), rtol=1e-5, atol=1e-8)


def test_every_kind_of_cell_there_and_back(tmp_path):
    whole = one_of_each_kind()
    blocks = [b for b in whole.blocks if b.kind in DESCRIPTORS]
    mesh = Mesh(whole.points, tuple(blocks), whole.node_ids)
    again = read_mesh(write_interchange(tmp_path / "a.unv", mesh))
    assert [(b.kind, b.nodes.tolist()) for b in again.blocks] == [(b.kind, b.nodes.tolist()) for b in blocks]
    with pytest.raises(LoadError, match="universal files have no pyramid5"):
        write_interchange(
            tmp_path / "b.unv", whole.with_(blocks=tuple(b for b in whole.blocks if b.kind == "pyramid5"))
        )
    assert not (tmp_path / "b.unv").exists()
    with pytest.raises(LoadError, match="node ids do not fit"):
        write_interchange(tmp_path / "b.unv", Mesh(SQUARE, (CellBlock("quad4", [[0, 1, 2, 3]], [1]),), [0, 1, 2, 3]))

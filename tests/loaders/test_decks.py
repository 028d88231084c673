"""Text decks: ids, sets and orders kept, what is not understood refused by name; meshio as the other reader."""

import meshio
import numpy as np
import pytest

from tests.loaders.samples import END_QUAD, cube_rows, grid_points
from viewer.cells import KINDS, measures
from viewer.errors import LoadError
from viewer.loaders import read_mesh, read_mesh_report, read_modes

INP = """** a remark
*HEADING
 two tetrahedra on a shelf
*NODE, NSET=ALL
 10, 0., 0., 0.
 20, 1., 0., 0.
 30, 0., 1.
*NODE
 40, 0., 0., 1.0D0
 50, 1., 1., 1.
*ELEMENT, TYPE=C3D4,
 ELSET=body
 7, 10, 20, 30, 40
*Element, type=c3d4, elset=Body
 5, 20, 30, 40,
 50
*ELEMENT, TYPE=S3R, ELSET=skin
 100, 10, 20, 30
*ELEMENT, TYPE=MASS, ELSET=m
 900, 50
*NSET, NSET=root, GENERATE
 10, 40, 10
*NSET, NSET=both
 root, 50
*ELSET, ELSET=all
 Body, skin
*ELSET, ELSET=far
 5, 12345
*MATERIAL, NAME=M
*ELASTIC
 1., 0.3
"""


def write(folder, text, name="a.inp"):
    (folder / name).write_bytes(text.encode("utf-8"))
    return folder / name


def test_keyword_deck(tmp_path):
    mesh, report = read_mesh_report(write(tmp_path, INP))
    assert mesh.node_ids.tolist() == [10, 20, 30, 40, 50]
    assert mesh.points[3].tolist() == [0, 0, 1]
    assert [(b.kind, b.ids.tolist()) for b in mesh.blocks] == [("tet4", [7, 5]), ("tri3", [100])]
    groups = {name: mesh.node_ids[rows].tolist() for name, rows in mesh.node_groups.items()}
    assert groups == {"ALL": [10, 20, 30], "root": [10, 20, 30, 40], "both": [10, 20, 30, 40, 50]}
    cells = {name: mesh.cell_ids[rows].tolist() for name, rows in mesh.cell_groups.items()}
    assert cells == {"body": [7, 5], "skin": [100], "all": [7, 5, 100], "far": [5]}
    assert any("1 of type MASS" in note for note in report.notes)
    assert any("set 'far': 1 of its 2 members" in note for note in report.notes)


@pytest.mark.parametrize("ends", ["\n", "\r\n", "\r"])
def test_ends_of_lines_and_byte_order_mark(tmp_path, ends):
    assert read_mesh(write(tmp_path, "\ufeff" + INP.replace("\n", ends))).n_cells == 3


def deck(*cards):
    return "\n".join(["SOL 103", "CEND", "BEGIN BULK", *cards, "ENDDATA", ""])


def small(name, *fields):
    """A card in columns of 8 with continuations."""
    rows = [fields[i : i + 8] for i in range(0, len(fields), 8)] or [()]
    return "\n".join(f"{name if i == 0 else '':<8}" + "".join(f"{f:>8}" for f in row) for i, row in enumerate(rows))


CARDS = [
    small("GRID", 11, "", "0.0", "0.0", "0.0"),
    "GRID,12,0,1.,,",
    f"GRID*   {13:>16}{'':>16}{'0.0':>16}{'1.0':>16}*A\n*A      {'-2.5-1':>16}",
    small("GRID", 15, "", "1.+0", "1.0", "1.D0"),
    "$ a remark",
    small("CTETRA", 8, 3, 11, 12, 13, 15),
    "CTRIA3,4,9,11,12,13 $ behind a card",
    small("CONM2", 77, 15, "", "2.0"),
    small("CBAR", 90, 5, 11, 15, "0.0", "0.0", "1.0"),
]


def test_card_deck(tmp_path):
    mesh, report = read_mesh_report(write(tmp_path, deck(*CARDS), "a.bdf"))
    assert mesh.node_ids.tolist() == [11, 12, 13, 15]
    assert mesh.points.tolist() == [[0, 0, 0], [1, 0, 0], [0, 1, -0.25], [1, 1, 1]]
    assert [(b.kind, b.ids.tolist()) for b in mesh.blocks] == [("tet4", [8]), ("tri3", [4]), ("line2", [90])]
    assert {n: mesh.cell_ids[r].tolist() for n, r in mesh.cell_groups.items()} == {
        "property 3": [8],
        "property 9": [4],
        "property 5": [90],
    }
    assert any("1 CONM2" in note for note in report.notes)


# Order of mid-edge nodes as decks write it: bottom, upright, top. The independent judge is the geometry.
EDGES = {
    "tet10": ("C3D10", "CTETRA", "01 12 20 03 13 23", "01 12 20 03 13 23"),
    "hex20": (
        "C3D20R",
        "CHEXA",
        "01 12 23 30 45 56 67 74 04 15 26 37",
        "01 12 23 30 04 15 26 37 45 56 67 74",
    ),
    "wedge15": ("C3D15", "CPENTA", "01 12 20 34 45 53 03 14 25", "01 12 20 03 14 25 34 45 53"),
    "pyramid13": ("", "CPYRAM", "", "01 12 23 30 04 14 24 34"),
}


@pytest.mark.parametrize("name", EDGES)
@pytest.mark.parametrize("suffix", [".inp", ".nas"])
def test_quadratic_cells_come_in_vtk_order(tmp_path, name, suffix):
    """Mid-side nodes land in the middle of their edges, and nothing is flagged."""
    keyword, card, first, second = EDGES[name]
    edges = (first if suffix == ".inp" else second).split()
    if not edges:
        pytest.skip("no such element")
    kind = KINDS[name]
    corners = kind.reference[: kind.n_corners]
    points = np.vstack([corners, *((corners[int(a)] + corners[int(b)]) / 2 for a, b in edges)])
    ids = list(range(1, len(points) + 1))
    if suffix == ".inp":
        nodes = "".join(f"{i}, {x}, {y}, {z}\n" for i, (x, y, z) in zip(ids, points, strict=True))
        text = f"*NODE\n{nodes}*ELEMENT, TYPE={keyword}\n1, " + ",\n".join(map(str, ids)) + "\n"
    else:
        rows = [small("GRID", i, "", *map(str, xyz)) for i, xyz in zip(ids, points.tolist(), strict=True)]
        text = deck(*rows, small(card, 1, 1, *ids))
    mesh, report = read_mesh_report(write(tmp_path, text, f"a{suffix}"))
    assert mesh.blocks[0].kind == name
    assert report.warnings == ()
    for edge in kind.edges:
        start, end, middle = (mesh.points[mesh.blocks[0].nodes[0, node]] for node in edge)
        assert np.allclose(middle, (start + end) / 2, atol=1e-12)


@pytest.mark.parametrize("suffix", [".inp", ".bdf", ".nas", ".fem"])
def test_decks_that_meshio_writes(tmp_path, suffix):
    path = tmp_path / f"a{suffix}"
    triangle = END_QUAD[:, :3]
    meshio.write(path, meshio.Mesh(grid_points(), [("hexahedron", cube_rows()), ("triangle", triangle)]))
    mesh = read_mesh(path)
    assert np.array_equal(mesh.points, grid_points())
    assert [(b.kind, b.nodes.tolist()) for b in mesh.blocks] == [
        ("hex8", cube_rows().tolist()),
        ("tri3", triangle.tolist()),
    ]
    assert np.allclose(measures("hex8", mesh.points[mesh.blocks[0].nodes]), 1)


@pytest.mark.parametrize(
    ("name", "whole", "call"),
    [("a.inp", INP, "*INCLUDE, INPUT={}"), ("a.bdf", deck(*CARDS), "INCLUDE '{}'")],
)
def test_includes_inside_the_folder(tmp_path, name, whole, call):
    (tmp_path / "parts").mkdir()
    lines = whole.splitlines()
    cut = next(i for i, line in enumerate(lines) if line.startswith(("*ELEMENT, TYPE=S3R", "CTRIA3")))
    write(tmp_path / "parts", "\n".join(lines[cut : cut + 2]) + "\n", "skin.txt")
    text = "\n".join([*lines[:cut], call.format("parts/skin.txt"), *lines[cut + 2 :]])
    assert read_mesh(write(tmp_path, text, name)).n_cells == 3


def test_a_deck_has_no_modes(tmp_path):
    path = write(tmp_path, INP)
    with pytest.raises(LoadError, match="holds no mode shapes; found: a text deck"):
        read_modes(path, read_mesh(path))

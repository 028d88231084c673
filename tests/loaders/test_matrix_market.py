"""Matrices by scikit-fem, written by SciPy, as the physics of a design: modes, closure, trust; and bad files."""

import numpy as np
import pytest
import scipy.io
import scipy.sparse as sp
import scipy.sparse.linalg as spla

from tests import independent
from tests.loaders.samples import clear
from tests.meshes import box_mesh
from viewer.errors import DossierError, LoadError, ModelError
from viewer.export.rows import mode_rows
from viewer.loaders import read_matrices, write_interchange
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies
from viewer.mechanics.given_matrices import totals
from viewer.model.design import Design, LumpedMass, Material, Physics, Selector, Support
from viewer.model.matrices import MatrixFiles
from viewer.model.modes import ArrayShapes, ModeSet
from viewer.workspace import Workspace, study

STEEL = Material("steel", 2.1e11, 0.3, 7850.0)
MESH = box_mesh("hex8", (5, 2, 1), (0.5, 0.1, 0.05))


@pytest.fixture(scope="module")
def theirs():
    """Stiffness and mass of scikit-fem, three rows a node in the order of the mesh, and the held rows."""
    space = independent.basis(MESH)
    at = np.empty(space.N, int)
    for axis, rows in enumerate(space.nodal_dofs):
        nodes = [int(np.argmin(np.linalg.norm(MESH.points - point, axis=1))) for point in space.doflocs[:, rows].T]
        at[3 * np.array(nodes) + axis] = rows
    stiffness, mass = independent.matrices(space, STEEL)
    held = (3 * MESH.node_groups["x0"][:, None] + np.arange(3)).ravel()
    return sp.csr_array(stiffness)[at][:, at], sp.csr_array(mass)[at][:, at], held


def put(folder, stiffness, mass, order="by node", **more) -> MatrixFiles:
    scipy.io.mmwrite(folder / "K.mtx", sp.coo_array(stiffness), **more)
    scipy.io.mmwrite(folder / "M.mtx", sp.coo_array(mass), **more)
    return MatrixFiles(folder / "K.mtx", folder / "M.mtx", order)


def made(files, mesh=MESH, held=True) -> Design:
    supports = (Support("root", Selector(group="x0")),) if held else ()
    return Design("box", mesh, Physics(supports=supports, matrices=read_matrices(files, mesh)))


def lowest(stiffness, mass, held, count=4):
    free = np.setdiff1d(np.arange(stiffness.shape[0]), held)
    start = np.random.default_rng(1).standard_normal(len(free))
    values, vectors = spla.eigsh(
        stiffness[free][:, free].tocsc(), count, mass[free][:, free].tocsc(), sigma=0, v0=start
    )
    shapes = np.zeros((count, stiffness.shape[0]))
    shapes[:, free] = vectors.T
    return np.sqrt(values) / (2 * np.pi), shapes.reshape(count, -1, 3)


@pytest.mark.parametrize("symmetry", ["symmetric", "general"])
def test_modes_closure_and_trust(tmp_path, theirs, symmetry):
    stiffness, mass, _ = theirs
    design = made(put(tmp_path, stiffness, mass, symmetry=symmetry))
    freq, shapes = lowest(*theirs)
    computed = solve(design, 4)
    assert computed.freq_hz == pytest.approx(freq, rel=1e-7)
    given = ModeSet(MESH.node_ids, freq, ArrayShapes(3.0 * shapes))
    found = totals(design, given)
    assert found.closure == pytest.approx(np.ones(4), abs=1e-7)
    assert found.modal_mass == pytest.approx(np.full(4, 9.0))
    assert found.strain == pytest.approx(found.kinetic)
    assert (found.residual < 1e-9).all()
    assert found.trusted.all()
    assert totals(design, given, [2]).to_dict(0)["mode"] == 3
    mixed = ModeSet(MESH.node_ids, freq[:1], ArrayShapes(shapes[:1] + shapes[1:2]))
    assert not totals(design, mixed).trusted.any()
    with pytest.raises(ModelError):
        energies(design, given)  # by element: there are none


def test_parts_beside_the_matrices_are_refused(tmp_path, theirs):
    design = made(put(tmp_path, *theirs[:2]))
    heavier = Physics(masses=(LumpedMass("camera", Selector(group="x0"), 1.0),), matrices=design.physics.matrices)
    with pytest.raises(ModelError, match="parts of its own beside them"):
        solve(design.with_(physics=heavier), 2)


def test_other_orders_and_rows_left_out(tmp_path, theirs):
    stiffness, mass, held = theirs
    freq, _ = lowest(*theirs)
    by_direction = np.arange(len(mass.toarray())).reshape(-1, 3).T.ravel()
    files = put(
        tmp_path, stiffness[by_direction][:, by_direction], mass[by_direction][:, by_direction], "by direction"
    )
    assert solve(made(files), 4).freq_hz == pytest.approx(freq, rel=1e-7)
    rows = np.random.default_rng(3).permutation(np.setdiff1d(np.arange(stiffness.shape[0]), held))
    names = [f"{MESH.node_ids[row // 3]},{['ux', 'uy', 'uz'][row % 3]}" for row in rows]
    (tmp_path / "rows.csv").write_text("node,direction\n" + "\n".join(names) + "\n")
    reduced = put(tmp_path, stiffness[rows][:, rows], mass[rows][:, rows], tmp_path / "rows.csv")
    design = made(reduced, held=False)
    modes = solve(design, 4)
    assert modes.freq_hz == pytest.approx(freq, rel=1e-7)
    assert not modes.shape(0)[MESH.node_groups["x0"]].any()
    assert totals(design, modes).trusted.all()


def test_free_body(tmp_path, theirs):
    design = made(put(tmp_path, *theirs[:2]), held=False)
    modes = solve(design, 8)
    assert (modes.freq_hz[:6] < 1e-3 * modes.freq_hz[6]).all()
    found = totals(design, modes)
    assert np.isnan(found.closure[:6]).all()
    assert found.closure[6:] == pytest.approx([1, 1], abs=1e-6)


def test_nodes_in_another_order(tmp_path, theirs):
    """By node means by ascending number, wherever the mesh file puts its nodes."""
    stiffness, mass, _ = theirs
    files = put(tmp_path, stiffness, mass)
    turned = np.arange(MESH.n_nodes)[::-1]
    mesh = MESH.with_(
        points=MESH.points[turned], node_ids=MESH.node_ids[turned],
        blocks=tuple(type(b)(b.kind, turned[b.nodes], b.ids) for b in MESH.blocks),
        node_groups={"x0": turned[MESH.node_groups["x0"]]},
    )  # fmt: skip
    assert solve(made(files, mesh), 3).freq_hz == pytest.approx(solve(made(files), 3).freq_hz, rel=1e-9)


DOSSIER = """
title = "Box"
[[designs]]
name = "box"
mesh = "box.npz"
stiffness = "K.mtx"
mass_matrix = "M.mtx"
matrix_order = "by node"
solve = 3
supports = [{group = "x0"}]
"""


def test_in_a_dossier(tmp_path, theirs):
    stiffness, mass, _ = theirs
    put(tmp_path, stiffness / 1e3, mass * 1e3)
    write_interchange(tmp_path / "box.npz", MESH)
    (tmp_path / "dossier.toml").write_text(DOSSIER + '[units]\nstiffness = "N/mm"\nmass = "g"\n')
    opened = Workspace(cache=None).open(tmp_path)
    item = opened.study("box")
    freq, _ = lowest(*theirs)
    assert item.modes.freq_hz == pytest.approx(freq[:3], rel=1e-6)
    assert item.energies is None
    assert any("given as matrices, so energies by element are not known" in words for words in item.cautions)
    assert item.modal_mass(0) == 1
    row = mode_rows(item)[0]
    assert row["closure"] == pytest.approx(1)
    assert row["energies_trusted"] is True
    assert row["strain_energy_most_in"] is None
    again = study(item.design, item.modes.with_(normalisation="unknown"))
    assert again.modal_mass(0) == pytest.approx(1)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('mass_matrix = "M.mtx"\n', "", "says no mass_matrix"),
        ('matrix_order = "by node"\n', "", "says no matrix_order"),
        ("by node", "by luck", "no such file"),
        ("solve = 3", 'solve = 3\nmasses = [{group = "x0", mass = 1}]', "says both stiffness and masses"),
    ],
)
def test_bad_dossiers(tmp_path, theirs, old, new, message):
    put(tmp_path, *theirs[:2])
    write_interchange(tmp_path / "box.npz", MESH)
    (tmp_path / "dossier.toml").write_text(DOSSIER.replace(old, new))
    with pytest.raises(DossierError, match=message):
        Workspace(cache=None).open(tmp_path)


HEAD = "%%MatrixMarket matrix coordinate real symmetric\n"
BAD = {
    "hello": ("hello\n", r"line 1: is no Matrix Market file"),
    "complex": (
        "%%MatrixMarket matrix coordinate complex general\n1 1 1\n1 1 1 0\n",
        r"of another kind; found: complex",
    ),
    "skew": ("%%MatrixMarket matrix coordinate real skew-symmetric\n2 2 1\n2 1 1\n", r"of another kind"),
    "no sizes": (HEAD + "% words\n\nx y z\n", r"line 4: states no sizes; found: b'x y z'"),
    "head alone": (HEAD, r"states no sizes"),
    "oblong": (HEAD + "3 2 1\n1 1 1\n", r"line 2: is not square; found: 3 × 2"),
    "thousands of millions": (HEAD + "3 3 2000000000\n1 1 1\n", r"declares more than the file can hold"),
    "many rows": (HEAD + "2000000000 2000000000 1\n1 1 1\n", r"declares more than the file can hold"),
    "cut": (HEAD + "3 3 3\n1 1 1.0\n2 2 1\n", r"is damaged or no Matrix Market file"),
    "index outside": (HEAD + "2 2 2\n1 1 1.0\n3 2 1\n", r"is damaged or no Matrix Market file"),
    "word": (HEAD + "2 2 2\n1 1 1.0\n2 2 x\n", r"is damaged or no Matrix Market file"),
    "infinite": (HEAD + "2 2 2\n1 1 1.0\n2 2 inf\n", r"not finite"),
    "negative": (HEAD + "2 2 2\n1 1 1.0\n2 2 -1\n", r"row 2: has a negative number on its diagonal"),
    "one half": (HEAD.replace("symmetric", "general") + "2 2 3\n1 1 1.0\n2 2 1\n2 1 1\n", r"is not symmetric"),
    "other size": (HEAD + "2 2 2\n1 1 1.0\n2 2 1\n", r"different sizes; found: 3; expected: 2 rows"),
    "not of this mesh": (HEAD + "3 3 3\n1 1 1\n2 2 1\n3 3 1\n", r"three or six directions.*found: 3 rows"),
}


@pytest.mark.parametrize("case", BAD)
def test_bad_matrices(tmp_path, case):
    text, message = BAD[case]
    path = tmp_path / "K.mtx"
    path.write_text(text)
    (tmp_path / "M.mtx").write_text(HEAD + "3 3 3\n1 1 1\n2 2 1\n3 3 1\n")
    with pytest.raises(LoadError, match=message) as caught:
        read_matrices(MatrixFiles(path, tmp_path / "M.mtx", "by node"), MESH)
    clear(caught.value, path)


@pytest.mark.parametrize(
    ("lines", "message"),
    [
        (["1,ux", "1,uy"], r"does not fit the matrices; found: 2 lines"),
        (["1,ux", "1,uy", "1,up"], r"line 4: unknown direction; found: 'up'"),
        (["1,ux", "1,uy", "999,uz"], r"line 4: names a node that the mesh does not have; found: node 999"),
        (["1,ux", "1,uy", "1,ux"], r"line 2: names a direction twice; found: ux of node 1"),
    ],
)
def test_bad_order(tmp_path, lines, message):
    files = put(tmp_path, np.eye(3), np.eye(3), tmp_path / "rows.csv")
    (tmp_path / "rows.csv").write_text("node,direction\n" + "\n".join(lines) + "\n")
    with pytest.raises(LoadError, match=message):
        read_matrices(files, MESH)

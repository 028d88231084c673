"""The sample meshes: written again byte for byte, small, sound, and moving as their dossiers say."""

from __future__ import annotations

import importlib.util
from pathlib import Path

import numpy as np
import pytest
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components

from viewer.cells import KINDS, measures, repair_orientation
from viewer.insight.common_support import common_support
from viewer.insight.correlate import mac
from viewer.loaders import read_dossier, read_mesh
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies
from viewer.mechanics.patch import RigidPatch

ROOT = Path(__file__).parents[2] / "sample_meshes"
FOLDERS = ("boom", "fork", "trough")
GROUPS = {  # cells of every group, node groups; lengths in m
    "boom/baseline.vtu": ("top flange_left flange_right flap score_line floor camera_seat nose", "root tip"),
    "boom/modified.vtu": ("top flange_left flange_right flap score_line floor camera_seat nose lip", "root tip"),
    "fork/fork.vtu": ("tine_left bend_left crossbar bend_right tine_right stem", "root"),
    "trough/plain.vtu": ("floor wall_left wall_right", "fixed_end"),
    "trough/strapped.vtu": ("floor wall_left wall_right straps", "fixed_end"),
}
OPENINGS = {  # openings of the sheet, counted on the part, and its Euler characteristic V − E + F
    "boom/baseline.vtu": (3, -1),  # root end, window, underside between seat and nose with both slits: χ = 2 − 3
    "boom/modified.vtu": (3, -1),  # the lip is a closed band, χ = 0
    "trough/plain.vtu": (1, 1),  # a bent rectangle
    # seven triangles between straps and one opening at each end; each of the 8 strips, χ = 1, shares two straight
    # lines, χ = 1, with the rims
    "trough/strapped.vtu": (9, -7),
}


def script():
    spec = importlib.util.spec_from_file_location("make_samples", ROOT / "make_samples.py")
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def test_the_script_writes_the_committed_files_byte_for_byte(tmp_path):
    module = script()
    module.main(tmp_path)
    written = sorted(p.relative_to(tmp_path).as_posix() for p in tmp_path.rglob("*.vtu"))
    assert written == sorted(GROUPS)
    assert sorted(p.relative_to(ROOT).as_posix() for p in ROOT.rglob("*.vtu")) == written
    for name in written:
        assert (tmp_path / name).read_bytes() == (ROOT / name).read_bytes(), name


@pytest.mark.parametrize("name", GROUPS)
def test_a_mesh_is_small_sound_and_whole(name):
    path = ROOT / name
    assert path.stat().st_size < 2_000_000
    mesh = read_mesh(path)
    cell_groups, node_groups = (set(words.split()) for words in GROUPS[name])
    assert set(mesh.cell_groups) == cell_groups
    assert set(mesh.node_groups) == node_groups
    assert all(len(rows) for rows in (*mesh.cell_groups.values(), *mesh.node_groups.values()))
    everyone = np.sort(np.concatenate(list(mesh.cell_groups.values())))
    assert np.array_equal(everyone, np.arange(mesh.n_cells))  # groups share nothing and leave nothing out

    assert len(mesh.used_nodes) == mesh.n_nodes
    assert len(np.unique(np.round(mesh.points * 1e5), axis=0)) == mesh.n_nodes  # none closer than about 10 µm
    (block,) = mesh.blocks
    assert (measures(block.kind, mesh.points[block.nodes]) > 0).all()
    if KINDS[block.kind].dim == 3:
        assert repair_orientation(block.kind, mesh.points, block.nodes)[1] == 0

    pairs = np.concatenate([block.nodes[:, [0, k]] for k in range(1, block.nodes.shape[1])])
    joined = coo_matrix((np.ones(len(pairs)), pairs.T), shape=(mesh.n_nodes,) * 2)
    assert connected_components(joined, directed=False)[0] == 1


@pytest.mark.parametrize("name", OPENINGS)
def test_sheets_are_open_only_where_they_should_be(name):
    """Free edges and Euler's characteristic: a seam that is not welded, or a stray hole, changes one of them."""
    mesh = read_mesh(ROOT / name)
    quads = mesh.blocks[0].nodes
    edges = np.sort(np.stack([quads, np.roll(quads, -1, axis=1)], axis=-1).reshape(-1, 2), axis=1)
    lines, count = np.unique(edges, axis=0, return_counts=True)
    free = lines[count == 1]
    used, rows = np.unique(free, return_inverse=True)
    rows = rows.reshape(-1, 2)
    graph = coo_matrix((np.ones(len(rows)), rows.T), shape=(len(used),) * 2)
    openings, euler = OPENINGS[name]
    assert connected_components(graph, directed=False)[0] == openings
    assert mesh.n_nodes - len(lines) + mesh.n_cells == euler
    if name.endswith("baseline.vtu"):  # the window's rim is rounded, not a staircase
        rim = mesh.points[
            used[
                (mesh.points[used, 2] > -1e-9)
                & (np.abs(mesh.points[used, 1]) < 0.065)
                & (mesh.points[used, 0] > 0.05)
                & (mesh.points[used, 0] < 0.3)
            ]
        ]
        corner = np.array([0.11 + 0.020, -0.062 + 0.020])
        near = rim[(rim[:, 0] < corner[0] - 1e-6) & (rim[:, 1] < corner[1] - 1e-6)]
        assert len(near) >= 3
        assert np.allclose(np.linalg.norm(near[:, :2] - corner, axis=1), 0.020, atol=1e-6)


@pytest.mark.parametrize("name", GROUPS)
def test_cells_are_well_shaped(name):
    """Corner angles of quadrilaterals and of the faces of hexahedra; 30° … 150° is common practice, no source.

    Exception: the two cells in the upper corners of the boom's nose lie on the bend, whose facets meet at 157.5°.
    """
    mesh = read_mesh(ROOT / name)
    (block,) = mesh.blocks
    faces = [face[:4] for _, face in KINDS[block.kind].faces] if KINDS[block.kind].dim == 3 else [(0, 1, 2, 3)]
    for face in faces:
        corners = mesh.points[block.nodes[:, list(face)]]
        ahead, behind = np.roll(corners, -1, 1) - corners, np.roll(corners, 1, 1) - corners
        cosine = (ahead * behind).sum(-1) / np.linalg.norm(ahead, axis=-1) / np.linalg.norm(behind, axis=-1)
        angle = np.degrees(np.arccos(cosine))
        assert angle.min() > 30
        assert angle.max() < (165 if "nose" in mesh.cell_groups else 150)
        assert (angle.max(axis=1) > 150).sum() == (2 if "nose" in mesh.cell_groups else 0)


@pytest.fixture(scope="module")
def solved():
    """Designs, modes and energies by folder and design."""
    found = {}
    for folder in FOLDERS:
        dossier = read_dossier(ROOT / folder / "dossier.toml")
        for plan in dossier.plans:
            design = plan.build(read_mesh(plan.mesh_file, plan.length_unit))
            modes = solve(design, plan.mode_count)
            found[folder, plan.name] = design, modes, energies(design, modes), dossier
    return found


def test_dossiers_say_that_the_parts_are_invented():
    for folder in FOLDERS:
        dossier = read_dossier(ROOT / folder / "dossier.toml")
        assert "invented" in dossier.title
        comment = (ROOT / folder / "dossier.toml").read_text("utf-8").partition("title =")[0]
        assert "nothing in this folder was ever built or measured" in comment


def _motion(design, shape, group):
    """Best rigid motion (translation, rotation) of a cell group about its centroid, the shape's peak being 1."""
    rows = design.mesh.nodes_of_cells(design.mesh.cell_groups[group])
    points = design.mesh.points[rows]
    return RigidPatch(points, points.mean(axis=0)).motion(shape[rows]) / np.linalg.norm(shape, axis=1).max()


@pytest.mark.parametrize("name", ["baseline", "modified"])
def test_the_boom_does_what_its_names_say(solved, name):
    design, modes, found, _ = solved["boom", name]
    assert 60 < modes.freq_hz[0] < 120
    seat = [_motion(design, modes.shape(i), "camera_seat") for i in range(4)]
    assert abs(seat[0][2]) > 0.5  # nods: up and down, no sideways motion
    assert abs(seat[0][1]) < 0.02
    nose = [_motion(design, modes.shape(i), "nose") for i in range(4)]
    assert abs(nose[1][1]) > 5 * abs(nose[1][2])  # sways: the tip goes sideways
    assert abs(seat[2][3]) > 2 * abs(seat[1][3])  # twists: about the boom's own axis
    flap = found.kinetic[:, design.mesh.cell_groups["flap"]].sum(axis=1) / found.total_kinetic
    assert flap[3] > 0.6  # flap flaps: it alone carries the energy
    assert found.trusted[:4].all()


def test_the_redesign_of_the_boom_helps_and_its_pairs_correspond(solved):
    (first, mine, _, dossier), (second, theirs, _, _) = solved["boom", "baseline"], solved["boom", "modified"]
    assert theirs.freq_hz[0] > 1.1 * mine.freq_hz[0]
    for pair in dossier.pairs:
        assert _alike(first, mine, pair.first_mode, second, theirs, pair.second_mode) > 0.85
    lost = [_alike(first, mine, 5, second, theirs, mode) for mode in range(1, theirs.count + 1)]
    assert max(lost) < 0.3  # mode 5 has no partner, as the dossier says


def test_the_fork_spreads(solved):
    design, modes, _, _ = solved["fork", "baseline"]
    left, right = (_motion(design, modes.shape(2), side) for side in ("tine_left", "tine_right"))
    assert left[1] * right[1] < 0
    assert abs(left[1]) == pytest.approx(abs(right[1]), rel=0.01)  # the part is symmetric
    together = [_motion(design, modes.shape(0), side)[1] for side in ("tine_left", "tine_right")]
    assert together[0] * together[1] > 0


def test_straps_raise_the_twisting_of_the_trough(solved):
    (plain, mine, _, dossier), (strapped, theirs, _, _) = solved["trough", "plain"], solved["trough", "strapped"]
    (twist,) = (pair for pair in dossier.pairs if pair.first_mode == 1)
    before, after = mine.freq_hz[0], theirs.freq_hz[twist.second_mode - 1]
    assert after > 4 * before
    for design, modes, mode in ((plain, mine, 1), (strapped, theirs, twist.second_mode)):
        floor = _motion(design, modes.shape(mode - 1), "floor")
        assert abs(floor[3]) * 0.075 > 1.5 * np.abs(floor[1:3]).max()  # rim speed by turning beats going sideways
    nod = next(pair for pair in dossier.pairs if pair.first_mode == 2)
    assert theirs.freq_hz[nod.second_mode - 1] == pytest.approx(mine.freq_hz[1], rel=0.1)  # bending hardly changes


def _alike(first, mine, i, second, theirs, j):
    support = common_support(first, second)
    one, two = support.values_of_first(mine.shape(i - 1)), support.values_of_second(theirs.shape(j - 1))
    return float(mac(one, two)[0, 0])

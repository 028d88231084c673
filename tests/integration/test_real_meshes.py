"""Real meshes load, solve free in steel and animate, from the dossier that ``hingelight check`` prints for them.

What the files hold (nodes, cells, groups, size) is read off by meshio itself or stated by its documentation; a free
body has six rigid-body modes at 0 Hz (mechanics of rigid bodies), and its volume does not depend on who reads it.
"""

from __future__ import annotations

import json
import re
import shutil
from pathlib import Path

import meshio
import numpy as np
import pytest
from PIL import Image
from pyvista import examples
from typer.testing import CliRunner

from tests.integration.real_meshes import real_mesh
from viewer.cells import KINDS, measures
from viewer.cli import app
from viewer.loaders import read_mesh

# name → (unit of length to fill in, cell kinds with their numbers, node groups, cell groups)
SOLIDS = {
    "sphere_mixed.1.meshb": ("mm", {"tet4": 9072, "wedge6": 3024}, {"reference 1"}, set()),
    "cylinder.med": ("cm", {"pyramid5": 18, "tet4": 63}, {"Side", "Top"}, {"A", "B", "C"}),
    "hch_strct.4.meshb": ("mm", {"wedge6": 96, "hex8": 144}, {"reference 1"}, set()),
    "hexbeam": ("cm", {"hex8": 40}, set(), set()),
}
SHEETS = {"insulated-4.1.msh": ("cm", {"tri3": 111}, {"convection"}, {"wire", "insulation"})}
BOTH = {**SOLIDS, **SHEETS}


def mesh_file(name: str) -> Path:
    return Path(examples.hexbeamfile) if name == "hexbeam" else real_mesh(name)


def run(*arguments: object) -> str:
    result = CliRunner().invoke(app, [str(a) for a in arguments])
    assert result.exit_code == 0, result.output + str(result.exception)
    return result.stdout


def filled_in(draft: str, unit: str, thickness: str = "") -> str:
    """The printed dossier with the lines marked TO FILL IN filled in as its comments say, nothing else touched."""
    for key, value in (("youngs_modulus", "210"), ("poisson", "0.3"), ("density", "7850")):
        draft, count = re.subn(rf"^# {key} = $", f"{key} = {value}", draft, flags=re.M)
        assert count == 1, key
    draft, count = re.subn(r'^length_unit = "m"', f'length_unit = "{unit}"', draft, flags=re.M)
    assert count == 1
    if thickness:
        draft, count = re.subn(r"^# (assign = .*thickness = )(\}\])", rf"\g<1>{thickness}\g<2>", draft, flags=re.M)
        assert count == 1
    draft, count = re.subn(r"^solve = 6 ", "solve = 8 ", draft, flags=re.M)
    assert count == 1
    return draft


@pytest.mark.parametrize("name", BOTH)
def test_loads_as_meshio_and_the_files_say(name):
    _, kinds, node_groups, cell_groups = BOTH[name]
    path = mesh_file(name)
    mesh = read_mesh(path)
    assert {kind: sum(len(b) for b in mesh.blocks if b.kind == kind) for kind in kinds} == kinds
    assert sum(kinds.values()) == mesh.n_cells
    assert node_groups <= set(mesh.node_groups)
    assert cell_groups <= set(mesh.cell_groups)
    assert all(len(rows) for groups in (mesh.node_groups, mesh.cell_groups) for rows in groups.values())
    if path.suffix == ".msh":
        covered = np.concatenate([mesh.cell_groups[group] for group in cell_groups])
        assert sorted(covered.tolist()) == list(range(mesh.n_cells)), "these groups part the body"
    assert len(np.unique(mesh.node_ids)) == mesh.n_nodes
    assert len(np.unique(mesh.cell_ids)) == mesh.n_cells
    if path.suffix != ".vtk":
        other = meshio.read(path, file_format="gmsh" if path.suffix == ".msh" else None)
        points = np.zeros((len(other.points), 3))
        points[:, : other.points.shape[1]] = other.points
        np.testing.assert_allclose(mesh.points, points, rtol=1e-12, atol=1e-12)
    for block in mesh.blocks:
        assert (measures(block.kind, mesh.points[block.nodes]) > 0).all(), "no cell is inside out"


def test_volumes_are_those_of_the_bodies():
    """The beam is 1 × 1 × 5. The cylinder of the file has radius 1 and height 1: its facets hold a little less than
    π. Where tetrahedra and wedges meet no volume is missing: the divergence theorem over the outer skin agrees."""
    from viewer.cells import skin

    for name in SOLIDS:
        mesh = read_mesh(mesh_file(name))
        inside = sum(measures(b.kind, mesh.points[b.nodes]).sum() for b in mesh.blocks)
        if name == "hexbeam":
            assert inside == pytest.approx(5, rel=1e-9)
        if name == "cylinder.med":
            assert 0.85 * np.pi < inside < np.pi
        if all(KINDS[b.kind].family in ("tet", "wedge") for b in mesh.blocks):  # others have warped faces
            outer = skin([(b.kind, b.nodes) for b in mesh.blocks])
            a, b, c = (mesh.points[outer.faces[:, i]] for i in range(3))
            around = np.einsum("ij,ij->i", a, np.cross(b, c)).sum() / 6
            assert around == pytest.approx(inside, rel=2e-3)


@pytest.mark.parametrize("name", BOTH)
def test_from_bare_mesh_to_loop(name, tmp_path):
    """check → dossier → fill in → check → modes → animate, all through the command line."""
    unit, *_ = BOTH[name]
    source = mesh_file(name)
    shutil.copy(source, tmp_path / source.name)
    draft = run("check", tmp_path / source.name)
    thickness = "0.002" if name in SHEETS else ""
    (tmp_path / "dossier.toml").write_text(filled_in(draft, unit, thickness), encoding="utf-8")
    assert "the dossier is sound" in run("check", tmp_path)
    rows = json.loads(run("modes", tmp_path, "--json"))["modes"]
    freq = np.array([row["frequency_hz"] for row in rows])
    assert (freq[:6] == 0).all(), "a free body has six rigid-body modes"
    assert (freq[6:] > 1).all()
    assert all(row["energies_trusted"] for row in rows[6:])
    path = tmp_path / "loop.gif"
    run("animate", tmp_path, 7, "--out", path, "--width", "320")
    with Image.open(path) as loop:
        assert (loop.size, loop.n_frames) == ((320, 240), 40)
        frames = []
        for number in (0, 10, 20):
            loop.seek(number)
            frames.append(np.asarray(loop.convert("RGB"), int))
    for one, two in ((0, 1), (1, 2), (0, 2)):
        assert (np.abs(frames[one] - frames[two]).max(axis=2) > 30).mean() > 0.005, "the body moves"


def test_groups_of_families_are_joined():
    """The MED file parts its cells by families −9 (A, B), −10 (B), −11 (B, C), −12 (C) of 3, 3, 1 and 4 + 2 cells,
    its nodes by families 2 (Side), 3 (Side, Top), 4 (Top) of 8, 8 and 3 nodes: read off the file by meshio."""
    mesh = read_mesh(real_mesh("cylinder.med"))
    assert {name: len(rows) for name, rows in mesh.cell_groups.items()} == {"A": 3, "B": 7, "C": 7}
    assert len(mesh.node_groups["Side"]) == 16
    assert len(mesh.node_groups["Top"]) == 11


def test_an_implausible_size_is_said_wherever_the_mesh_is_used(tmp_path):
    """288 units long: taken as metres that is implausible, and every command says so."""
    source = real_mesh("hch_strct.4.meshb")
    shutil.copy(source, tmp_path / source.name)
    draft = run("check", tmp_path / source.name)
    assert "implausible" in draft
    (tmp_path / "dossier.toml").write_text(filled_in(draft, "m"), encoding="utf-8")
    assert "implausible" in run("check", tmp_path)
    assert any("implausible" in words for words in json.loads(run("modes", tmp_path, "--json"))["cautions"])
    (tmp_path / "dossier.toml").write_text(filled_in(draft, "mm"), encoding="utf-8")
    assert "implausible" not in run("check", tmp_path)


def test_two_formats_hold_one_mesh():
    """The cylinder exists in a second format, written from the same mesh: same bodies, same volume."""
    first, second = read_mesh(real_mesh("cylinder.med")), read_mesh(real_mesh("cylinder.fem"))
    assert first.n_nodes == second.n_nodes == 33
    volumes = [
        {b.kind: measures(b.kind, m.points[b.nodes]).sum() for b in m.blocks if KINDS[b.kind].dim == 3}
        for m in (first, second)
    ]
    assert volumes[0] == pytest.approx(volumes[1], rel=1e-6)


def test_fields_of_a_result_file_do_not_stop_its_mesh():
    """One cell, two node groups, and fields whose components are named in lists."""
    mesh = read_mesh(real_mesh("box.med"))
    assert (mesh.n_nodes, mesh.n_cells, mesh.blocks[0].kind) == (8, 1, "hex8")
    assert {name: len(rows) for name, rows in mesh.node_groups.items()} == {"Left": 4, "Right": 4}

"""Energies of given modes whose material nobody states: shares that hold for one uniform material, and are said to.

The truth is the same body solved with steel, whose energies the tests of mechanics check. In a body of one isotropic
material the shares of strain energy do not depend on Young's modulus or density (linear elasticity: U is
proportional to E at a fixed shape), only on Poisson's ratio, which is 0.3 in both.
"""

from __future__ import annotations

import csv
import json
import sys
from functools import cache

import numpy as np
import pytest
from typer.testing import CliRunner

import viewer
from tests.integration.models import STEEL, block_with_plate, bracket, channel, npz_by_hand, without_rotations
from tests.meshes import box_mesh, plate_mesh
from viewer.cells import skin
from viewer.cli import app
from viewer.errors import InputError, ModelError
from viewer.export.rows import group_rows, mode_caption, mode_rows
from viewer.loaders import write_interchange
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import RELATIVE, best_formulation, energies
from viewer.model.design import Assignment, Design, Material, Physics
from viewer.model.mesh import CellBlock, Mesh
from viewer.model.modes import ArrayShapes, ModeSet
from viewer.scene.compose import pair_picture, single_picture
from viewer.workspace import better_formulation, study

SHELLS = (Assignment("*", thickness=0.002),)


@cache
def solved(name: str):
    design = {"bracket": lambda: bracket("hex8"), "channel": channel, "mixed": block_with_plate}[name]()
    modes = solve(design, 3)
    return design, without_rotations(modes), energies(design, modes)


def bare(name: str, assignments=()) -> Design:
    return Design("bare", solved(name)[0].mesh, Physics(assignments=tuple(assignments)))


def shares(energy: np.ndarray) -> np.ndarray:
    return energy / energy.sum(axis=1, keepdims=True)


def run(*arguments: object):
    return CliRunner().invoke(app, [str(a) for a in arguments])


def good(*arguments: object) -> str:
    result = run(*arguments)
    assert result.exit_code == 0, result.output + str(result.exception)
    return result.stdout


# --- figures


@pytest.mark.parametrize(
    ("name", "assignments", "bound"),
    [
        ("bracket", (), 1e-9),
        ("channel", SHELLS, 0.01),  # rotations are recovered from translations
        ("mixed", (Assignment("quad4", thickness=0.003),), 0.01),
    ],
)
def test_shares_are_those_of_the_real_material(name, assignments, bound):
    _, modes, truth = solved(name)
    found = viewer.energies(bare(name, assignments), modes)
    assert found.relative
    assert np.abs(found.strain - shares(truth.strain)).sum(axis=1).max() < bound
    for j in range(3):
        volumes = found.volumes / found.volumes.sum()
        np.testing.assert_allclose(found.density(j) * volumes, found.strain[j], atol=1e-12)
    np.testing.assert_allclose(found.kinetic, shares(truth.kinetic), atol=1e-6)


def test_nothing_absolute_is_told():
    _, modes, _ = solved("bracket")
    found = viewer.energies(bare("bracket"), modes)
    np.testing.assert_allclose(found.total_strain, 1)
    facts = found.to_dict(0)
    assert [facts[key] for key in ("strain_energy", "kinetic_energy", "closure", "residual", "trusted")] == [None] * 5
    assert facts["energy_note"] == RELATIVE
    assert found.sentence(0).endswith(f"energies are {RELATIVE}.")
    told = study(bare("bracket"), modes.with_(normalisation="unknown"))
    assert told.modal_mass(0) is None
    assert told.figures is None
    assert "add materials and assign them for closure" in told.cautions[0]
    with pytest.raises(ModelError, match="material"):
        best_formulation(bare("bracket"), modes)


def test_rigid_body_modes_stay_plain():
    design, _, _ = solved("bracket")
    free = solve(Design("free", design.mesh, Physics({"steel": STEEL}, (Assignment("*", "steel"),))), 8)
    told = study(bare("bracket"), without_rotations(free))
    assert [told.has_strain(i) for i in range(8)] == [False] * 6 + [True] * 2
    assert single_picture(told, 1).energy_top is None
    assert told.energies.sentence(0).endswith("a rigid-body mode.")
    assert mode_rows(told)[0]["strain_energy_most_in"] is None


@pytest.mark.parametrize("kind", ["quad4", "tri3"])
def test_sheets_without_thickness_are_refused(kind):
    mesh = plate_mesh(kind, (4, 2), (0.2, 0.1))
    design = Design("sheet", mesh, Physics({"steel": STEEL}, (Assignment("*", "steel", 0.001),)))
    modes = solve(design, 8)
    told = study(Design("sheet", mesh), modes)
    assert told.energies is None
    assert "need a thickness, since the ratio of bending to membrane depends on it" in told.no_energies
    picture = single_picture(told, 7)  # still drawn, without colours
    assert picture.energy_top is None
    half = Design("sheet", mesh, Physics(assignments=(Assignment("all", thickness=0.001),)))
    assert study(half, modes).relative


@pytest.mark.parametrize(
    ("blocks", "words"),
    [
        ((), "has no cells that could hold energy"),
        ((CellBlock("vertex1", np.arange(4)[:, None], np.arange(1, 5)),), "has no cells that could hold energy"),
        ((CellBlock("line2", np.array([[0, 1], [1, 2], [2, 3]]), np.arange(1, 4)),), "of beams need a section"),
    ],
)
def test_geometry_of_a_hammer_test_is_refused(blocks, words):
    mesh = Mesh(np.array([[0.0, 0, 0], [1, 0, 0], [2, 0, 0.1], [3, 0, 0]]), blocks, np.arange(1, 5))
    shapes = ArrayShapes(np.random.default_rng(2).normal(size=(2, 4, 3)))
    told = study(Design("points", mesh), ModeSet(mesh.node_ids, np.array([5.0, 9.0]), shapes, origin="measured"))
    assert told.energies is None
    assert words in told.no_energies


def test_faces_that_only_name_places_need_no_thickness():
    _, modes, _ = solved("bracket")
    mesh = solved("bracket")[0].mesh
    triangles = skin([(block.kind, block.nodes) for block in mesh.blocks]).faces[:5]
    more = mesh.with_(blocks=(*mesh.blocks, CellBlock("tri3", triangles, 9000 + np.arange(5))))
    assert study(Design("named faces", more), modes).relative


def test_part_of_the_materials_is_not_none_of_them():
    """Where some cells have a material the others' is missing, not assumed."""
    design, modes, _ = solved("mixed")
    some = design.with_(physics=Physics({"steel": STEEL}, (Assignment("hex8", "steel"),)))
    told = study(some, modes)
    assert told.energies is None
    assert "no material" in told.no_energies


# --- pictures and tables


def test_picture_and_tables_say_so():
    _, modes, _ = solved("bracket")
    told = study(bare("bracket"), modes)
    picture = viewer.animate(bare("bracket"), modes, 1).picture
    assert picture.energy_top is not None
    assert picture.energy_caution == RELATIVE
    assert any(RELATIVE in words for words in (*picture.note.drawing, *picture.note.condition))
    rows = mode_rows(told)
    assert {row["energy_note"] for row in rows} == {RELATIVE}
    assert {(row["closure"], row["energies_trusted"], row["springs_strain_percent"]) for row in rows} == {(None,) * 3}
    assert RELATIVE in mode_caption(rows[0])
    assert all(row["energy_note"] == RELATIVE for row in group_rows(told))


def test_energies_left_out_are_not_formed(monkeypatch):
    _, modes, _ = solved("bracket")
    module = sys.modules["viewer.workspace.study"]  # the package's own "study" is the function
    monkeypatch.setattr(module, "relative_energies", lambda *_: pytest.fail("formed all the same"))
    picture = viewer.animate(bare("bracket"), modes, 1, energy=False).picture
    assert picture.energy_top is None
    assert picture.energy_caution == ""


def test_compared_with_a_body_of_known_material():
    design, modes, _ = solved("bracket")
    known, assumed = study(design, modes), study(bare("bracket"), modes)
    picture = pair_picture(known, 1, assumed, 1)
    assert picture.energy_caution == f"{RELATIVE}: bare"
    np.testing.assert_allclose(picture.bodies[0].density, picture.bodies[1].density, atol=1e-9)


def test_wrong_material_keeps_its_picture_and_is_marked():
    """Aluminium's modulus on steel's frequencies: shares hold, closure √(70/205) is told, joules are marked."""
    design, modes, truth = solved("bracket")
    soft = Material("steel", 70e9, 0.3, 7850.0)
    wrong = design.with_(physics=Physics({"steel": soft}, (Assignment("*", "steel"),), design.physics.supports))
    told = study(wrong, modes)
    found = told.energies
    assert found is not None
    assert not found.relative
    assert not found.trusted.any()
    assert np.abs(shares(found.strain) - shares(truth.strain)).sum(axis=1).max() < 1e-9
    facts = found.to_dict(0)
    assert facts["closure"] is not None
    assert facts["closure"] < 0.95
    assert facts["energy_note"].startswith("not trusted")
    assert mode_rows(told)[0]["energies_trusted"] is False
    picture = single_picture(told, 1)
    assert picture.energy_top is not None
    assert picture.energy_caution == "energies not trusted"


# --- the better formulation


@pytest.fixture
def full_bricks(tmp_path):
    """Modes of fully integrated bricks, as another program might make them, and a dossier that uses the default."""
    mesh = box_mesh("hex8", (8, 2, 1), (0.4, 0.06, 0.02))
    physics = Physics({"steel": STEEL}, (Assignment("*", "steel", formulation="hex8-full"),))
    modes = solve(Design("plate", mesh, physics), 9)
    path = write_interchange(tmp_path / "plate.npz", mesh, without_rotations(modes))
    (tmp_path / "dossier.toml").write_text(
        'title = "plate"\n[materials.steel]\nyoungs_modulus = 205e9\npoisson = 0.3\ndensity = 7850\n'
        f'[[designs]]\nname = "plate"\nmesh = "{path.name}"\nmodes = "{path.name}"\n'
        'assign = [{target = "*", material = "steel"}]\n'
    )
    return tmp_path / "dossier.toml"


def test_better_formulation_is_named_and_works(full_bricks):
    told = good("check", full_bricks)
    assert "plate: hex8-full closes better with these modes: off by 0.00% (median)" in told
    assert "with hex8-incompatible" in told
    assert """write formulation = "hex8-full" in the assignment to '*'""" in told
    (better,) = json.loads(good("modes", full_bricks, "--json"))["better_formulations"]
    assert better["formulations"] == {"hex8": "hex8-full"}
    assert better["closure_error"] < 1e-6 < 0.05 < better["used_closure_error"]
    text = full_bricks.read_text()
    full_bricks.write_text(text.replace('material = "steel"}', 'material = "steel", formulation = "hex8-full"}'))
    assert "closes better" not in good("check", full_bricks)
    printed = json.loads(good("modes", full_bricks, "--json"))
    assert printed["better_formulations"] == []
    assert all(row["energies_trusted"] for row in printed["modes"][6:])


def test_assignments_of_several_kinds_are_told_apart():
    bricks = box_mesh("hex8", (8, 2, 1), (0.4, 0.06, 0.02))
    (block,) = bricks.blocks
    coat = CellBlock("quad4", block.nodes[:, 4:], 1000 + np.arange(len(block)))
    coated = Design(
        "coated",
        bricks.with_(blocks=(block, coat)),
        Physics(
            {"steel": STEEL},
            (Assignment("*", "steel", 1e-4), Assignment("hex8", "steel", formulation="hex8-full")),
        ),
    )
    given = without_rotations(solve(coated, 8))
    loose = coated.with_(physics=Physics({"steel": STEEL}, (Assignment("*", "steel", 1e-4),)))
    found = better_formulation(study(loose, given))
    assert found is not None
    assert found.names == {"hex8": "hex8-full"}
    assert 'in an assignment of hex8 cells alone (target = "hex8")' in found.sentence


# --- the draft of check


@pytest.mark.parametrize("apart", [False, True], ids=["in the mesh file", "in a file of their own"])
def test_draft_for_a_mesh_with_modes_works_at_once(apart, tmp_path):
    design, modes, _ = solved("bracket")
    folder = tmp_path / "a part"
    folder.mkdir()
    mesh = write_interchange(folder / 'angle "1".vtu', design.mesh, *(() if apart else (modes,)))
    given = [npz_by_hand(folder / "the modes.npz", design.mesh, modes)] if apart else []
    dossier = folder / "dossier.toml"
    dossier.write_text(good("check", mesh, *given), encoding="utf-8")
    assert "the dossier is sound" in good("check", dossier)
    picture = folder / "mode.png"
    good("animate", dossier, 2, "--out", picture, "--width", 320, "--no-cache")
    assert picture.stat().st_size > 0
    out = tmp_path / "review"
    printed = good("review", dossier, "--out", out, "--count", 1, "--width", 320, "--no-cache")
    assert RELATIVE in printed
    assert RELATIVE in (out / "index.html").read_text(encoding="utf-8")
    summary = json.loads((out / "summary.json").read_text(encoding="utf-8"))
    assert any(RELATIVE in words for words in summary["cautions"])
    with (out / "baseline_modes.csv").open(encoding="utf-8") as stream:
        assert {row["energy_note"] for row in csv.DictReader(stream)} == {RELATIVE}


def test_draft_for_a_sheet_with_modes_needs_only_its_thickness(tmp_path):
    design, modes, _ = solved("channel")
    mesh = write_interchange(tmp_path / "channel.vtu", design.mesh, modes)
    dossier = tmp_path / "dossier.toml"
    text = good("check", mesh)
    dossier.write_text(text, encoding="utf-8")
    assert "need a thickness" in good("check", dossier)
    good("animate", dossier, 1, "--out", tmp_path / "plain.png", "--width", 320)
    line = '# assign = [{target = "*", material = "material", thickness = }]'
    assert line in text
    dossier.write_text(text.replace(line, 'assign = [{target = "*", thickness = 0.002}]'), encoding="utf-8")
    assert RELATIVE in good("check", dossier)
    good("animate", dossier, 1, "--out", tmp_path / "coloured.png", "--width", 320)


@pytest.mark.parametrize("name", ["bracket", "channel"])
def test_draft_for_a_bare_mesh_works_once_filled_in(name, tmp_path):
    mesh = write_interchange(tmp_path / "part.vtu", solved(name)[0].mesh)
    dossier = tmp_path / "dossier.toml"
    text = good("check", mesh)
    dossier.write_text(text, encoding="utf-8")
    unfilled = run("check", dossier)
    assert unfilled.exit_code == 1
    assert "Traceback" not in unfilled.output
    marked = {
        "# youngs_modulus = ": "youngs_modulus = 205",
        "# poisson = ": "poisson = 0.3",
        "# density = ": "density = 7850",
        "# supports": "supports",
        "# assign": "assign",
        "thickness = }": "thickness = 0.002}",
    }
    for mark, filled in marked.items():
        text = text.replace(mark, filled)
    dossier.write_text(text.replace("solve = 6", "solve = 2"), encoding="utf-8")
    assert "the dossier is sound" in good("check", dossier)
    good("animate", dossier, 1, "--out", tmp_path / "mode.png", "--width", 320, "--no-cache")
    out = tmp_path / "review"
    good("review", dossier, "--out", out, "--width", 320, "--no-cache")
    rows = json.loads((out / "summary.json").read_text(encoding="utf-8"))["designs"]["baseline"]["modes"]
    assert [row["energies_trusted"] for row in rows] == [True, True]


def test_thickness_without_material_is_for_given_modes_only(tmp_path):
    head = 'title = "a"\n[[designs]]\nname = "a"\nmesh = "a.vtu"\n'
    for text, place in (
        (head + "assign = [{thickness = 2}]\n", "assign 1 says no material"),
        (
            head + 'modes = "m.vtu"\nassign = [{material = "steel"}, {target = "x", thickness = 2}]\n'
            "[materials.steel]\nyoungs_modulus = 2e11\npoisson = 0.3\ndensity = 7850\n",
            "assign 2 says no material",
        ),
    ):
        path = tmp_path / "dossier.toml"
        path.write_text(text)
        with pytest.raises(InputError, match=place):
            viewer.open_dossier(path)

"""Beams, directional material, layers, offsets, links and ties in a dossier: in SI, one clear message when wrong."""

from __future__ import annotations

import numpy as np
import pytest

from tests.meshes import plate_mesh
from viewer.errors import DossierError
from viewer.loaders import read_dossier
from viewer.model.design import Design, Directional, Ply, Section
from viewer.workspace.keys import design_key

TEXT = """
title = "frame"

[units]
length = "mm"
modulus = "GPa"

[materials.steel]
youngs_modulus = 210
poisson = 0.3
density = 7850

[materials.ply]
e1 = 140
e2 = 10
nu12 = 0.3
g12 = 5
g13 = 5
g23 = 3.5
density = 1600

[[designs]]
name = "frame"
mesh = "frame.vtu"
assign = [
    {target = "*", material = "steel", thickness = 2, offset = 1.5},
    {target = "tube", material = "steel", section = {shape = "tube", diameter = 30, wall = 2}},
    {target = "rib", material = "steel", section = {SECTION}, orientation = [0, 0, 2], OFFSETS},
    {target = "skin", layers = [
        {material = "ply", thickness = 0.2, angle = 45}, {material = "steel", thickness = 1},
    ], direction = [0, 3, 4]},
]
links = [
    {name = "bracket", from = {near = [0, 0, 500]}, to = {group = "pad"}},
    {from = {nodes = [3]}, to = {nodes = [4]}},
]
ties = [{name = "seam", nodes = {group = "edge"}, surface = {box = [[0, 0, 0], [1, 1, 1]]}, reach = 2}]
""".replace("SECTION", "area = 300, iy = 1e4, iz = 2e4, torsion = 900, shear_up = 0.5").replace(
    "OFFSETS", "offset = -5, offset_across = 4"
)


@pytest.fixture
def dossier(tmp_path):
    (tmp_path / "frame.vtu").write_text("not read here")
    path = tmp_path / "dossier.toml"

    def write(text: str = TEXT):
        path.write_text(text, encoding="utf-8")
        return path

    return write


def test_everything_comes_out_in_si(dossier):
    physics = read_dossier(dossier()).plans[0].physics
    sheet, tube, rib, skin = physics.assignments
    assert (sheet.thickness, sheet.offset) == pytest.approx((2e-3, 1.5e-3))
    assert tube.section == Section("tube", diameter=pytest.approx(0.03), wall=pytest.approx(0.002))
    assert rib.section.shape == "given"
    assert (rib.section.area, rib.section.iy, rib.section.iz) == pytest.approx((3e-4, 1e-8, 2e-8))
    assert (rib.section.torsion, rib.section.shear_up, rib.section.shear_across) == (pytest.approx(9e-10), 0.5, None)
    assert (rib.orientation, rib.offset, rib.offset_across) == ((0, 0, 1), pytest.approx(-5e-3), pytest.approx(4e-3))
    assert skin.direction == pytest.approx((0, 0.6, 0.8))
    assert skin.plies == (Ply("ply", pytest.approx(2e-4), 45.0), Ply("steel", pytest.approx(1e-3), 0.0))
    assert physics.materials["ply"].directional == Directional(140e9, 10e9, 0.3, 5e9, 5e9, 3.5e9)
    assert physics.materials["ply"].youngs_modulus == 140e9
    assert [link.name for link in physics.links] == ["bracket", "link 2"]
    np.testing.assert_allclose(physics.links[0].first.near, [0, 0, 0.5])
    assert physics.links[0].second.group == "pad"
    assert physics.ties[0].reach == pytest.approx(2e-3)
    np.testing.assert_allclose(physics.ties[0].surface.box[1], 1e-3)


def test_what_solids_need_of_directional_material(dossier):
    more = "g23 = 3.5\ne3 = 9\nnu13 = 0.25\nnu23 = 0.4\n"
    physics = read_dossier(dossier(TEXT.replace("g23 = 3.5\n", more))).plans[0].physics
    assert physics.materials["ply"].directional == Directional(140e9, 10e9, 0.3, 5e9, 5e9, 3.5e9, 9e9, 0.25, 0.4)


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ("youngs_modulus = 210\n", "", ["materials, steel", "'youngs_modulus' is missing"]),
        ("g23 = 3.5\n", "", ["materials, ply", "'g23' is missing", "'e1', 'e2'"]),
        ("g23 = 3.5\n", "g23 = 3.5\npoisson = 0.3\n", ["materials, ply", "mixes two kinds"]),
        ("g23 = 3.5\n", "g23 = 3.5\ne3 = 10\n", ["materials, ply", "'nu13' is missing (and 1 more)", "'nu23'"]),
        ('material = "steel", section', "section", ["assign 2", "says no material"]),
        ("layers = [", 'material = "steel", layers = [', ["assign 4", "layers alone"]),
        ('{material = "ply"', '{material = "plie"', ["assign 4, layers", "no material named 'plie'"]),
        ("wall = 2", "wal = 2", ["assign 2, section", "unknown key 'wal'", "did you mean 'wall'"]),
        ('shape = "tube"', 'shape = "pipe"', ["section, shape", "rectangle"]),
        ("orientation = [0, 0, 2]", "orientation = [0, 0, 0]", ["assign 3, orientation", "no length"]),
        ("from = {near = [0, 0, 500]}, ", "", ['links 1 ("bracket")', "'from' is missing"]),
        ("to = {group", "tow = {group", ['links 1 ("bracket")', "unknown key 'tow'", "one of: name, from, to"]),
        ("nodes = {group", "node = {group", ['ties 1 ("seam")', "unknown key 'node'", "did you mean 'nodes'"]),
        ("from = {nodes = [3]}", "from = {}", ["links 2, from", "says no place"]),
        ("reach = 2", "reach = -2", ["reach", "greater than 0"]),
        ('{name = "bracket",', '{name = "link 2",', ["'link 2' is given twice"]),
    ],
)
def test_mistakes_are_named(dossier, old, new, words):
    assert old in TEXT
    with pytest.raises(DossierError) as caught:
        read_dossier(dossier(TEXT.replace(old, new, 1)))
    for word in words:
        assert word in str(caught.value)


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("offset = 1.5", "offset = 1.6"),
        ("wall = 2", "wall = 2.1"),
        ("angle = 45", "angle = 46"),
        ("g23 = 3.5", "g23 = 3.6"),
        ("direction = [0, 3, 4]", "direction = [0, 3, 3]"),
        ("reach = 2", "reach = 3"),
        ("near = [0, 0, 500]", "nodes = [9]"),
    ],
)
def test_each_of_them_enters_the_key_of_a_solution(dossier, old, new):
    mesh = plate_mesh("quad4", (1, 1), (1, 1))
    keys = {
        design_key(Design("d", mesh, read_dossier(dossier(text)).plans[0].physics))
        for text in (TEXT, TEXT.replace(old, new, 1), TEXT)
    }
    assert len(keys) == 2

"""Struts and clearances in a dossier: in SI, one clear message when wrong, part of a solution's key."""

from __future__ import annotations

import numpy as np
import pytest

from tests.meshes import plate_mesh
from viewer.errors import DossierError
from viewer.loaders import read_dossier
from viewer.model.design import Design
from viewer.workspace.keys import design_key

TEXT = """
title = "braced"

[units]
length = "mm"
stiffness = "N/mm"
mass = "g"

[materials.steel]
youngs_modulus = 2.1e11
poisson = 0.3
density = 7850

[[designs]]
name = "plain"
mesh = "plate.vtu"
assign = [{target = "*", material = "steel", thickness = 2}]

[[designs]]
name = "braced"
mesh = "plate.vtu"
assign = [{target = "*", material = "steel", thickness = 2}]
struts = [
    {name = "brace", group = "left", to = {box = [[0, 0, 0], [5, 5, 5]]}, stiffness = 2000, mass = 150},
    {nodes = [3, 4], to = {nodes = [7, 8]}, stiffness = 10},
]

[[clearances]]
name = "belt"
box = [[-50, 0, 200], [50, 80, 900]]
designs = ["braced"]

[[clearances]]
box = [[0, 0, 0], [1, 1, 1]]
"""


@pytest.fixture
def dossier(tmp_path):
    (tmp_path / "plate.vtu").write_text("not read here")
    path = tmp_path / "dossier.toml"

    def write(text: str = TEXT):
        path.write_text(text, encoding="utf-8")
        return path

    return write


def test_struts_and_clearances_come_out_in_si(dossier):
    plain, braced = read_dossier(dossier()).plans
    brace, second = braced.physics.struts
    assert (brace.name, brace.where.group, brace.stiffness) == ("brace", "left", 2e6)
    assert brace.mass == pytest.approx(0.15)
    np.testing.assert_allclose(brace.other.box, [[0, 0, 0], [5e-3] * 3])
    assert (second.name, second.other.nodes.tolist(), second.mass) == ("strut 2", [7, 8], 0.0)
    assert not plain.physics.struts
    assert [each.name for each in braced.clearances] == ["belt", "clearance 2"]
    assert [each.name for each in plain.clearances] == ["clearance 2"]
    np.testing.assert_allclose(braced.clearances[0].box, [[-0.05, 0, 0.2], [0.05, 0.08, 0.9]])


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        (", stiffness = 10}", "}", ["struts 2", "'stiffness' is missing"]),
        ("stiffness = 10}", "stiffness = 0}", ["struts 2", "greater than 0"]),
        ("to = {nodes = [7, 8]}, ", "", ["struts 2", "'to' is missing"]),
        ('name = "brace"', 'name = "strut 2"', ["'strut 2' is given twice"]),
        ("nodes = [3, 4], to", "to", ["struts 2", "says no place"]),
        ("[50, 80, 900]]", "[50, 80]]", ["clearances 1", "box"]),
        ("[50, 80, 900]]", "[50, 80, 100]]", ["clearances 1, box", "lower corner"]),
        ('designs = ["braced"]', 'designs = ["brased"]', ["clearances 1", "designs", "did you mean 'braced'"]),
    ],
)
def test_mistakes_are_named(dossier, old, new, words):
    assert old in TEXT
    with pytest.raises(DossierError) as caught:
        read_dossier(dossier(TEXT.replace(old, new, 1)))
    for word in words:
        assert word in str(caught.value)


def test_struts_enter_the_key_of_a_solution_and_clearances_do_not(dossier):
    mesh = plate_mesh("quad4", (1, 1), (1, 1))
    key = lambda text: design_key(Design("d", mesh, read_dossier(dossier(text)).plans[1].physics))  # noqa: E731
    changed = {key(TEXT.replace(old, new)) for old, new in (("= 10}", "= 11}"), ("mass = 150", "mass = 151"))}
    assert len({key(TEXT), *changed}) == 3
    assert key(TEXT.replace("[1, 1, 1]", "[1, 1, 2]")) == key(TEXT)

"""Hammer tests in the dossier: what [[tests]] says in SI, what is wrong in it, what is written back into it."""

import difflib

import numpy as np
import pytest

from tests.loaders.test_hammer_tests import tables
from viewer.errors import DossierError
from viewer.loaders import read_dossier, read_planned_test, write_test_changes
from viewer.model.mesh import Mesh
from viewer.model.testset import Correction, Placement

HEAD = """
title = "Boom"
[units]
length = "mm"
[[designs]]
name = "baseline"
mesh = "boom.vtu"
modes = "boom.vtu"
[[designs]]
name = "modified"
mesh = "boom.vtu"
modes = "boom.vtu"
"""
FULL = """
# the tests
[[tests]]                          # of last spring
name = "hammer"                    # struck by hand
file = ["run_1.unv", "run_2.unv"]
length_unit = "in"
design = "modified"
landmarks = [{point = "1", near = [10, 20, 30]}, {point = "9", node = 7}]
placement = {rotation = [[0, -1, 0], [1, 0, 0], [0, 0, 1]], shift = [1000, 0, 5], scale = 1}
corrections = [
    {kind = "flip", point = "12", axis = "x"},   # seen in every mode
    {kind = "swap axes", point = "3", axis = "x", other_axis = "z"},
    {kind = "move", point = "7", other = "9"},
    {kind = "move", point = "8", position = [1, 2, 3]},
    {kind = "leave out", point = "5"},
]

# the second one
[[tests]]
name = "shaker"
file = "run_1.unv"

# these two belong together
[[pairs]]
first = {design = "baseline", mode = 1}
second = {design = "modified", mode = 1}
"""
CORRECTIONS = (
    Correction("flip", "12", "x"),
    Correction("swap axes", "3", "x", "z"),
    Correction("move", "7", other="9"),
    Correction("move", "8", position=(0.001, 0.002, 0.003)),
    Correction("leave out", "5"),
)


@pytest.fixture
def written(tmp_path):
    for name in ("boom.vtu", "run_1.unv", "run_2.unv"):
        (tmp_path / name).write_text("read later")

    def write(tests: str):
        path = tmp_path / "dossier.toml"
        path.write_text(HEAD + tests, encoding="utf-8")
        return path

    return write


def test_everything_is_read_in_si(written):
    path = written(FULL)
    dossier = read_dossier(path)
    plan = dossier.test("hammer")
    assert [plan.name, plan.design, plan.length_unit] == ["hammer", "modified", 0.0254]
    assert plan.files == (path.parent / "run_1.unv", path.parent / "run_2.unv")
    np.testing.assert_allclose(plan.landmarks[0].near, [0.01, 0.02, 0.03])
    assert plan.landmarks[1].node == 7
    np.testing.assert_allclose(plan.placement.points([[1.0, 0, 0]]), [[1.0, 1.0, 0.005]])
    assert plan.corrections == CORRECTIONS
    assert dossier.test("shaker").design == "baseline" and dossier.test("shaker").length_unit is None
    with pytest.raises(DossierError, match=r"no test named 'x'.*hammer, shaker"):
        dossier.test("x")


def test_a_landmark_knows_its_place_on_the_mesh(written):
    mesh = Mesh(np.arange(9.0).reshape(3, 3), (), np.array([5, 7, 9]))
    near, node = read_dossier(written(FULL)).test("hammer").landmarks
    np.testing.assert_allclose(near.place(mesh), [0.01, 0.02, 0.03])
    np.testing.assert_array_equal(node.place(mesh), [3, 4, 5])
    with pytest.raises(DossierError, match=r"point 9.*node 7"):
        node.place(mesh.with_(node_ids=np.array([1, 2, 3])))


def test_a_rotation_with_few_digits_is_made_exact(written):
    text = "placement = {rotation = [[0.866, -0.5, 0], [0.5, 0.866, 0], [0, 0, 1]], shift = [0, 0, 0]}"
    rotation = read_dossier(written(f'[[tests]]\nname = "a"\nfile = "run_1.unv"\n{text}')).tests[0].placement.rotation
    np.testing.assert_allclose(rotation @ rotation.T, np.eye(3), atol=1e-15)
    np.testing.assert_allclose(rotation[1, 0], np.sin(np.radians(30)), atol=1e-4)


@pytest.mark.parametrize(
    ("line", "words"),
    [
        ('file = "none.unv"', ['tests 1 ("a"), file', "no such file", "none.unv"]),
        ('file = ["run_1.unv", "run_1.unv"]', ['tests 1 ("a"), file', "given twice"]),
        ("file = []", ['tests 1 ("a"), file', "wrong value"]),
        ("file = 3", ['tests 1 ("a"), file', "found: 3"]),
        ('design = "third"', ['tests 1 ("a"), design', "baseline, modified"]),
        ('length_unit = "mile"', ['tests 1 ("a"), length_unit', "'mile'"]),
        ("length_unit = 0", ['tests 1 ("a"), length_unit', "found: 0"]),
        ('unit = "mm"', ["unknown key 'unit'", "length_unit"]),
        ('landmarks = [{point = "1"}]', ["landmarks 1", "near = [x, y, z] or node = ID"]),
        ('landmarks = [{point = "1", near = [0, 0, 0], node = 3}]', ["landmarks 1", "either near"]),
        ('landmarks = [{point = "1", node = 1}, {point = "1", node = 2}]', ["landmarks", "'1' is given twice"]),
        ("placement = {shift = [0, 0, 0]}", ["placement", "'rotation' is missing"]),
        (
            "placement = {rotation = [[1, 0, 0], [0, 1, 0], [0, 0, 2]], shift = [0, 0, 0]}",
            ["placement, rotation", "is no rotation", "right-handed"],
        ),
        (
            "placement = {rotation = [[1, 0, 0], [0, 1, 0], [0, 0, -1]], shift = [0, 0, 0]}",
            ["placement, rotation", "is a mirror image", "sign of one row"],
        ),
        ('corrections = [{kind = "turn", point = "1"}]', ["corrections 1, kind", "'flip'"]),
        ('corrections = [{kind = "flip"}]', ["corrections 1", "'point' is missing"]),
        ('corrections = [{kind = "flip", point = "1", axis = "+x"}]', ["corrections 1, axis", "'+x'"]),
        ('corrections = [{kind = "flip", point = "1", other = "2"}]', ["corrections 1", "says other", "only axis"]),
        ('corrections = [{kind = "swap axes", point = "1", axis = "x"}]', ["corrections 1", "says no other_axis"]),
        (
            'corrections = [{kind = "swap axes", point = "1", axis = "x", other_axis = "x"}]',
            ["corrections 1", "with itself"],
        ),
        ('corrections = [{kind = "move", point = "1"}]', ["corrections 1", "other =", "position ="]),
        ('corrections = [{kind = "move", point = "1", other = "1"}]', ["corrections 1", "to itself"]),
        (
            'corrections = [{kind = "move", point = "1", other = "2", position = [0, 0, 0]}]',
            ["corrections 1", "either other"],
        ),
    ],
)  # fmt: skip
def test_what_is_wrong_is_said_where(written, line, words):
    file = "" if line.startswith("file") else 'file = "run_1.unv"\n'
    path = written(f'[[tests]]\nname = "a"\n{file}{line}\n')
    with pytest.raises(DossierError) as caught:
        read_dossier(path)
    for word in [str(path), *words]:
        assert word in str(caught.value)


def test_two_tests_of_one_name(written):
    with pytest.raises(DossierError, match="tests: 'a' is given twice"):
        read_dossier(written('[[tests]]\nname = "a"\nfile = "run_1.unv"\n' * 2))


@pytest.mark.parametrize(
    ("line", "words"),
    [
        ('landmarks = [{point = "3", node = 1}]', "landmarks 1: the test has no point '3'; expected: one of: 1, 2"),
        ('corrections = [{kind = "flip", point = "x"}]', "corrections 1: the test has no point 'x'"),
        ('corrections = [{kind = "move", point = "1", other = "9"}]', "corrections 1: the test has no point '9'"),
    ],
)
def test_points_that_the_dossier_names_must_be_in_the_test(written, tmp_path, line, words):
    tables(tmp_path, "arm")
    path = written('[[tests]]\nname = "a"\nfile = "arm_points.csv"\nlength_unit = "mm"\n')
    assert read_planned_test(read_dossier(path), "a").name == "a"
    path.write_text(path.read_text("utf-8") + line, "utf-8")
    with pytest.raises(DossierError) as caught:
        read_planned_test(read_dossier(path), "a")
    assert f'{path}, tests "a", {words}' in str(caught.value)


def test_corrections_and_a_placement_are_written_and_all_else_stays(written):
    path = written(FULL)
    before = path.read_text(encoding="utf-8")
    placement = Placement(np.eye(3), [0.03, 0, 0.0001])
    write_test_changes(path, "shaker", corrections=CORRECTIONS, placement=placement)
    plan = read_dossier(path).test("shaker")
    assert plan.corrections == CORRECTIONS
    np.testing.assert_array_equal(plan.placement.rotation, np.eye(3))
    np.testing.assert_allclose(plan.placement.shift, placement.shift, rtol=1e-12)
    after = path.read_text(encoding="utf-8")
    lost = [line for line in difflib.ndiff(before.splitlines(), after.splitlines()) if line.startswith("- ")]
    assert not lost
    assert after.index("shift = [30.0, 0.0, 0.1]") < after.index("# these two belong together")


def test_corrections_that_stay_keep_their_comments(written):
    path = written(FULL)
    more = (*CORRECTIONS, Correction("leave out", "2", "y"))
    write_test_changes(path, "hammer", corrections=more)
    assert read_dossier(path).test("hammer").corrections == more
    assert '{kind = "flip", point = "12", axis = "x"},   # seen in every mode\n' in path.read_text(encoding="utf-8")
    write_test_changes(path, "hammer", corrections=more[1:])
    assert read_dossier(path).test("hammer").corrections == more[1:]
    write_test_changes(path, "hammer", corrections=())
    plan = read_dossier(path).test("hammer")
    assert plan.corrections == () and plan.placement is not None
    text = path.read_text(encoding="utf-8")
    assert "corrections" not in text and "# the second one\n[[tests]]" in text and "# struck by hand" in text


def test_nothing_is_written_when_nothing_changes_or_no_test_has_the_name(written):
    path = written(FULL)
    before = path.read_bytes()
    write_test_changes(path, "hammer", corrections=CORRECTIONS)
    assert path.read_bytes() == before
    with pytest.raises(DossierError, match=r"no test named 'other'.*hammer, shaker"):
        write_test_changes(path, "other", corrections=())
    assert path.read_bytes() == before
    path = written("")
    with pytest.raises(DossierError, match="a test, none is declared"):
        write_test_changes(path, "hammer", corrections=())

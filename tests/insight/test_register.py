"""Test points laid onto meshes: named points, geometry alone, symmetry, mixed-up units, what channels see."""

from __future__ import annotations

import re

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from tests.checks.reference import row
from tests.meshes import box_mesh, line_mesh, plate_mesh
from tests.sentences import unfounded
from viewer.errors import InputError, RefusedError
from viewer.insight.near_surface import NearSurface
from viewer.insight.placement_words import placement_line
from viewer.insight.register import register
from viewer.insight.registration import GEOMETRY, NAMED, STATED
from viewer.insight.similarity import similarity
from viewer.model.mesh import CellBlock, Mesh
from viewer.model.testset import Placement, TestSet


def bracket(unit: float = 1.0) -> Mesh:
    """A base plate with two unlike uprights: no turn brings it onto itself."""
    whole = box_mesh("hex8", (12, 8, 6), (0.12 * unit, 0.08 * unit, 0.06 * unit))
    x, y, z = (whole.points[whole.blocks[0].nodes].mean(axis=1) / unit).T
    kept = (x < 0.02) | ((z < 0.01) & (y < 0.06)) | ((x > 0.09) & (y < 0.03) & (z < 0.04))
    nodes = whole.blocks[0].nodes[kept]
    return whole.with_(blocks=(CellBlock("hex8", nodes, np.arange(len(nodes))),), cell_groups={}, node_groups={})


def points_test(points, directions=None, name="hammer", lines=()) -> TestSet:
    """A test of one mode with one channel a point, along z unless ``directions`` (p, 3) say otherwise."""
    points = np.asarray(points, float)
    count = len(points)
    along = np.tile([0.0, 0.0, 1.0], (count, 1)) if directions is None else directions
    return TestSet(
        name,
        tuple(str(n + 1) for n in range(count)),
        points,
        lines,
        np.arange(count),
        along,
        [100.0],
        np.ones((1, count)),
    )


def strewn(mesh: Mesh, count: int, random) -> np.ndarray:
    """(count, 3) random places on the outside of ``mesh``."""
    places, _ = NearSurface(mesh).strewn(20_000)
    return places[random.choice(len(places), count, replace=False)]


def blind(mesh: Mesh, seed: int, count: int = 15, noise: float = 0.005, unit: float = 1.0):
    """A test at random places of the mesh with noisy coordinates, turned and moved at will, in units of its own; and
    the true places."""
    random = np.random.default_rng(seed)
    true = strewn(mesh, count, random)
    turn = Rotation.random(rng=random).as_matrix()
    seen = true + noise * mesh.diagonal * random.normal(size=true.shape)
    return points_test((seen - random.normal(size=3) * mesh.diagonal) @ turn * unit), true


def error(found, true, mesh) -> float:
    """Root mean square distance of the placed points' true positions from where they belong, by the mesh's size."""
    return float(np.sqrt(np.mean(np.sum((found - true) ** 2, axis=1))) / mesh.diagonal)


# ------------------------------------------------------------------------------------------------ the similarity fit


def _numbers(text: str) -> list[float]:
    """The numbers of a row that names its quantities, in order."""
    return [float(n) for n in re.findall(r"-?\d+\.?\d*", text)]


def test_similarity_of_three_points_as_published():
    check = row("K01")  # Umeyama 1991
    numbers = _numbers(check.text)
    source, target = np.array([[0, 0], [1, 0], [0, 2]]), np.array([[0, 0], [-1, 0], [0, 2]])
    found = similarity(source, target, scaled=True)
    got = [*found.rotation.ravel(), found.scale, *found.shift, found.error]
    np.testing.assert_allclose(got, numbers, rtol=check.tolerances[0] * 10)  # the row gives seven digits
    assert np.linalg.det(found.rotation) == pytest.approx(1.0)


def test_rotation_about_the_space_diagonal_as_published():
    check = row("K03")  # Kabsch 1976
    turn = np.array(_numbers(check.text)).reshape(3, 3)
    source = np.random.default_rng(1).normal(size=(5, 3))
    found = similarity(source, source @ turn.T + (1, 2, 3))
    np.testing.assert_allclose(found.rotation, turn, atol=1e-6)
    np.testing.assert_allclose(found.shift, (1, 2, 3), atol=1e-5)
    assert found.scale == 1.0 and found.error < 1e-10


def test_a_mirror_image_is_never_the_answer_unless_asked_for():
    source = np.random.default_rng(2).normal(size=(6, 3))
    target = source * (1, 1, -1)
    assert np.linalg.det(similarity(source, target).rotation) == pytest.approx(1.0)
    assert similarity(source, target).error > 0.01
    assert similarity(source, target, mirrored=True).error < 1e-20


# ------------------------------------------------------------------------------------------------------ named points


@pytest.mark.parametrize(
    ("noise", "median", "most"),
    [
        (0.005 / np.sqrt(3), 0.004, 0.005),  # every point half a per cent of the size away from where it was stated
        (0.005, 0.005, 0.009),  # every coordinate
    ],
)
def test_four_named_points_place_a_noisy_test(noise, median, most):
    """15 points, 25 seeds. All 23 measurements (12 coordinates of pairs, 11 distances to the surface) of scatter s
    cannot place better than s √(18/23): 0.26 and 0.44 per cent of the size."""
    mesh, errors = bracket(), []
    for seed in range(25):
        test, true = blind(mesh, seed, noise=noise)
        found = register(test, mesh, landmarks=[(str(n + 1), true[n]) for n in spread(true, 4)])
        assert found.how == NAMED and found.settled and not found.alternatives
        exact, _ = blind(mesh, seed, noise=0.0)
        errors.append(error(found.placement.points(exact.points), true, mesh))
    assert np.median(errors) <= median
    assert max(errors) <= most


def spread(points, count: int) -> list[int]:
    """Rows of points far from one another."""
    rows = [int(np.linalg.norm(points - points.mean(axis=0), axis=1).argmax())]
    while len(rows) < count:
        rows.append(int(np.linalg.norm(points[:, None] - points[rows], axis=2).min(axis=1).argmax()))
    return rows


def test_exact_named_points_place_exactly():
    mesh = bracket()
    test, true = blind(mesh, 3, noise=0.0)
    found = register(test, mesh, landmarks=[(str(n + 1), true[n]) for n in (0, 4, 8, 12)])
    assert error(found.points, true, mesh) < 1e-6
    assert found.rms < 1e-7 and not found.far and found.used.all()
    assert not unfounded(found.sentence, found.to_dict()), found.sentence


@pytest.mark.parametrize(
    ("labels", "words"),
    [
        (("1", "2"), "1 more"),
        (("1",), "2 more"),
        (("1", "2", "2"), "twice"),
        (("1", "2", "99"), "'99'"),
    ],
)
def test_landmarks_that_do_not_suffice(labels, words):
    mesh = bracket()
    test, true = blind(mesh, 0)
    with pytest.raises(InputError, match=words):
        register(test, mesh, landmarks=[(label, true[min(int(label), 15) - 1]) for label in labels])


def test_landmarks_on_a_line_are_refused():
    mesh = box_mesh("hex8", (4, 2, 2), (0.4, 0.1, 0.1))
    test = points_test([(0, 0, 0), (0.2, 0, 0), (0.4, 0, 0), (0, 0.1, 0)])
    with pytest.raises(InputError, match="lie on a line"):
        register(test, mesh, landmarks=[(str(n), test.points[n - 1]) for n in (1, 2, 3)])


def test_left_handed_axes_are_told():
    mesh = bracket()
    test, true = blind(mesh, 0, noise=0.0)
    mirrored = test.with_(points=test.points * (1, 1, -1))
    with pytest.raises(InputError, match="mirror image"):
        register(mirrored, mesh, landmarks=[(str(n + 1), true[n]) for n in range(6)])


def test_a_landmark_at_the_wrong_place_is_named():
    mesh = bracket()
    test, true = blind(mesh, 0)
    places = [(str(n + 1), true[n]) for n in range(6)]
    places[2] = ("3", true[2] + 0.6 * mesh.diagonal)
    with pytest.raises(InputError, match="point '3'"):
        register(test, mesh, landmarks=places)


# ---------------------------------------------------------------------------------------------------------- geometry


def test_blind_registration_of_fifteen_noisy_points():
    """Turned, moved, half a per cent of noise in every coordinate. Right: the best of those listed puts the points
    within a twentieth of the size; whatever is taken without a question is right."""
    mesh, first, settled, silent = bracket(), 0, 0, 0
    for seed in range(100):
        test, true = blind(mesh, seed)
        found = register(test, mesh)
        exact, _ = blind(mesh, seed, noise=0.0)
        good = error(found.placement.points(exact.points), true, mesh) < 0.05
        first += good
        settled += good and not found.alternatives
        silent += found.settled and not good
    assert first >= 95, first
    assert settled >= 88, settled
    assert silent == 0


def test_millimetres_read_as_metres_are_proposed_not_applied():
    mesh, right = bracket(), 0
    for seed in range(10):
        test, true = blind(mesh, seed, unit=1000.0)
        found = register(test, mesh)
        assert found.unit_slip is not None and found.unit_slip.factor == pytest.approx(0.001)
        assert found.unit_slip.unit(1.0) == "mm" and not found.settled and not found.used.any()
        assert "1 000 times too large" in found.sentence.replace("\u202f", " ")
        assert not unfounded(found.sentence, found.to_dict()), found.sentence
        right += error(found.points, true, mesh) < 0.05
        with pytest.raises(RefusedError, match="millimetres read as metres"):
            found.require()
    assert right >= 9


@pytest.mark.parametrize(("unit", "factor"), [(39.3701, 0.0254), (0.0254, 39.3701), (10.0, 0.1), (0.001, 1000.0)])
def test_other_units_mixed_up(unit, factor):
    mesh = bracket()
    test, true = blind(mesh, 4, unit=unit, noise=0.002)
    found = register(test, mesh)
    assert found.unit_slip is not None and found.unit_slip.factor == pytest.approx(factor, rel=1e-4)
    assert error(found.points, true, mesh) < 0.05


def test_a_unit_slip_of_named_points():
    mesh = bracket()
    test, true = blind(mesh, 4, unit=1000.0)
    found = register(test, mesh, landmarks=[(str(n + 1), true[n]) for n in range(5)])
    assert found.unit_slip is not None and found.unit_slip.factor == 0.001
    assert error(found.points, true, mesh) < 0.01 and not found.used.any()


def test_a_test_of_something_else_does_not_fit():
    test = points_test(np.random.default_rng(0).normal(size=(15, 3)) * 0.7)
    with pytest.raises(InputError, match="does not fit the mesh"):
        register(test, bracket())


def test_points_of_another_part_of_that_size_are_refused():
    """Places on a sphere are on no bracket of its size."""
    points = np.random.default_rng(3).normal(size=(20, 3))
    points *= 0.075 / np.linalg.norm(points, axis=1, keepdims=True)
    with pytest.raises(InputError, match="do not lie on the mesh, however it is turned"):
        register(points_test(points), bracket())


def test_a_disc_can_turn():
    """A round plate: its axis is found, what turns about it is not."""
    square = plate_mesh("quad4", (16, 16), (2.0, 2.0))
    x, y = (square.points[:, :2] - 1).T
    reach, round_ = np.maximum(np.abs(x), np.abs(y)), np.hypot(x, y)
    scale = 0.1 * np.divide(reach, round_, out=np.zeros_like(reach), where=round_ > 0)
    mesh = square.with_(points=np.stack([x * scale, y * scale, 0 * x], axis=1))
    moved = strewn(mesh, 30, np.random.default_rng(4)) + np.array([1.0, 2.0, 3.0])
    found = register(points_test(moved), mesh)
    assert not found.settled
    assert any("turned about the part's thinnest direction (z)" in words for words in found.free), found.free
    assert not unfounded(found.sentence, found.to_dict()), found.sentence


def test_too_few_points_for_the_geometry():
    with pytest.raises(RefusedError, match="cannot be placed by its geometry"):
        register(points_test(np.eye(3)), bracket())


# ---------------------------------------------------------------------------------------------------------- symmetry


def grid_on_plate(count: int = 5) -> np.ndarray:
    x, y = np.meshgrid(np.linspace(0, 0.3, count), np.linspace(0, 0.3, count))
    return np.stack([x.ravel(), y.ravel(), 0 * x.ravel()], axis=1)


def test_every_placement_of_a_square_plate_is_listed():
    """The rotation group of the square in space has eight elements: points that tell none apart fit in all."""
    mesh = plate_mesh("quad4", (12, 12), (0.3, 0.3))
    random = np.random.default_rng(5)
    edge = random.random(8) * 0.3
    points = np.concatenate(
        [np.stack([edge, np.repeat([0, 0.3], 4), 0 * edge], 1), np.stack([np.repeat([0, 0.3], 4), edge, 0 * edge], 1)]
    )
    test = points_test(points @ Rotation.random(rng=random).as_matrix() + 1.0)
    found = register(test, mesh)
    assert len(found.alternatives) == 7 and not found.free
    true = {_key(turn) for turn in _square_group()}
    first = found.placement.rotation
    listed = {_key(a.placement.rotation @ first.T) for a in found.alternatives} | {_key(np.eye(3))}
    assert listed == true
    turns = sorted(round(a.facts["turn_deg"]) for a in found.alternatives)
    assert turns == [90, 90, 180, 180, 180, 180, 180]
    assert any("turned 90° about the part's thinnest direction (z)" in a.words for a in found.alternatives)
    assert not found.settled and not found.used.any()
    assert not unfounded(found.sentence, found.to_dict()), found.sentence
    with pytest.raises(RefusedError, match="8 placements that fit equally well") as refused:
        found.require()
    assert refused.value.do.count("placement = {rotation") == 8


def _square_group():
    quarter = [Rotation.from_rotvec([0, 0, a]).as_matrix() for a in np.arange(4) * np.pi / 2]
    return quarter + [turn @ np.diag([1, -1, -1]) for turn in quarter]


def _key(turn) -> tuple:
    return tuple(np.round(turn, 1).ravel() + 0.0)


def test_a_brick_of_three_lengths_fits_in_four_ways():
    mesh = box_mesh("hex8", (8, 5, 3), (0.4, 0.25, 0.12))
    random = np.random.default_rng(7)
    test = points_test(strewn(mesh, 40, random) @ Rotation.random(rng=random).as_matrix())
    found = register(test, mesh)
    assert len(found.alternatives) == 3
    assert {round(a.facts["turn_deg"]) for a in found.alternatives} == {180}
    words = " ".join(a.words for a in found.alternatives)
    assert "(x)" in words and "about y" in words and "z" in words


def test_points_inside_a_plate_can_slide():
    mesh = plate_mesh("quad4", (12, 8), (0.3, 0.2))
    inner = 0.05 + grid_on_plate(4)[:, :2] * (0.6, 0.3)
    found = register(points_test(np.pad(inner, ((0, 0), (0, 1)))), mesh)
    assert found.free and not found.settled
    assert any("moved along" in words for words in found.free)
    with pytest.raises(RefusedError, match="can be"):
        found.require()


def test_a_listed_line_settles_it():
    mesh = plate_mesh("quad4", (12, 12), (0.3, 0.3))
    test = points_test(grid_on_plate())
    found = register(test, mesh)
    assert not found.settled
    chosen = found.alternatives[2].placement
    again = register(test, mesh, placement=chosen)
    assert again.how == STATED and again.settled and again.used.all()
    assert again.rms < 1e-6
    assert placement_line(chosen, 0.001).startswith("placement = {rotation = [[")


# ------------------------------------------------------------------------------------------- mapping and what is seen


def test_channels_see_a_linear_field_exactly():
    """Shape functions carry linear fields exactly: x ↦ A x + b at the placed points, along the turned directions."""
    mesh = bracket()
    random = np.random.default_rng(11)
    directions = random.normal(size=(15, 3))
    directions /= np.linalg.norm(directions, axis=1, keepdims=True)
    turn = Rotation.random(rng=random)
    true = strewn(mesh, 15, random)
    test = points_test(turn.inv().apply(true), turn.inv().apply(directions))
    found = register(test, mesh, placement=Placement(turn.as_matrix(), np.zeros(3)))
    matrix, shift = random.normal(size=(3, 3)), random.normal(size=3)
    expected = np.sum((true @ matrix.T + shift) * directions, axis=1)
    np.testing.assert_allclose(found.seen(mesh.points @ matrix.T + shift), expected, atol=1e-9)
    assert found.sensing.shape == (15, 3 * mesh.n_nodes)


def test_points_off_the_part_are_named_and_left_out():
    mesh = bracket()
    test, true = blind(mesh, 9, noise=0.002)
    astray = test.points.copy()
    astray[6] += 0.3 * mesh.diagonal
    named = [(str(n + 1), true[n]) for n in (0, 3, 9, 12)]
    found = register(test.with_(points=astray), mesh, landmarks=named)
    assert found.far == ("7",)
    assert found.used.tolist() == [n != 6 for n in range(15)]
    assert "point 7 is more than" in found.sentence
    assert not unfounded(found.sentence, found.to_dict()), found.sentence
    assert error(np.delete(found.points, 6, 0), np.delete(true, 6, 0), mesh) < 0.01


def test_angle_to_the_surface():
    mesh = plate_mesh("quad4", (4, 4), (0.3, 0.3))
    slant = np.array([0, np.sin(np.radians(30)), np.cos(np.radians(30))])
    test = points_test(grid_on_plate(3), np.array([[0, 0, 1.0]] * 4 + [[1.0, 0, 0]] * 4 + [slant]))
    found = register(test, mesh, placement=Placement(np.eye(3), np.zeros(3)))
    np.testing.assert_allclose(found.normal_angles_deg, [0] * 4 + [90] * 4 + [30], atol=1e-6)


def test_points_on_lines_have_no_angle():
    mesh = line_mesh([(0, 0, 0), (0.5, 0, 0), (0.5, 0.3, 0)])
    test = points_test([(0.1, 0, 0), (0.4, 0, 0), (0.5, 0.2, 0)])
    found = register(test, mesh, placement=Placement(np.eye(3), np.zeros(3)))
    assert np.isnan(found.normal_angles_deg).all() and found.used.all()
    assert found.to_dict()["channel_list"][0]["normal_angle_deg"] is None


def test_geometry_alone_says_so():
    mesh = bracket()
    test, _ = blind(mesh, 1, noise=0.001)
    found = register(test, mesh)
    assert found.how == GEOMETRY and found.settled
    assert "by their shape alone" in found.sentence
    assert not unfounded(found.sentence, found.to_dict()), found.sentence

"""What two meshes share: places, weights, lumped masses, and regions that only one of them has."""

from __future__ import annotations

import numpy as np
import pytest

from tests.integration.models import kept
from tests.mechanics.models import CLAMP, design, lone_nodes
from tests.meshes import box_mesh, plate_mesh
from tests.sentences import unfounded
from viewer.errors import RefusedError
from viewer.insight.common_support import common_support
from viewer.model.design import Design, LumpedMass, Physics, Selector


def sheet(name, kind, counts, keep=None, distort=0.0, **physics):
    mesh = plate_mesh(kind, counts, (0.4, 0.2), distort=distort)
    return design(mesh if keep is None else kept(mesh, keep), thickness=0.002, **physics).with_(name=name)


def linear(points):
    """A field that shape functions carry without error."""
    return points @ np.array([[1.0, 2, 0.5], [-1, 0.3, 4], [2, 1, 1]]) + np.array([0.2, 0, -1])


@pytest.mark.parametrize("swap", [False, True])
def test_a_linear_field_is_carried_exactly(swap):
    coarse = design(box_mesh("hex8", (4, 3, 2), (0.4, 0.3, 0.2), distort=0.2))
    fine = design(box_mesh("tet10", (5, 4, 3), (0.4, 0.3, 0.2), distort=0.2))
    one, two = (fine, coarse) if swap else (coarse, fine)
    support = common_support(one, two)
    assert len(support.weights) == coarse.mesh.n_nodes  # the nodes of the mesh with fewer of them
    mine, theirs = (
        support.values_of_first(linear(one.mesh.points)),
        support.values_of_second(linear(two.mesh.points)),
    )
    assert mine == pytest.approx(theirs, abs=1e-9)
    assert support.weights.sum() == pytest.approx(8000 * 0.4 * 0.3 * 0.2, rel=1e-6)  # kg, all of the block
    assert not support.regions and "only" not in support.sentence
    assert not unfounded(support.sentence, support.to_dict())


def test_the_same_cells_share_every_node():
    support = common_support(sheet("a", "quad4", (8, 4)), sheet("b", "quad4", (8, 4)))
    assert not support.distances.any()
    assert support.sentence == "Shapes are compared at 45 places that both designs share."


def test_a_region_that_only_one_design_has_is_left_out_with_its_share():
    """The last 0.1 m of 0.4 m are cut off the second design, a window of 0.1 m × 0.1 m off the first."""
    window = lambda x, y, z: ~((x > 0.1) & (x < 0.2) & (y > 0.05) & (y < 0.15))  # noqa: E731
    first = sheet("windowed", "quad4", (32, 16), window)
    second = sheet("short", "tri3", (40, 20), lambda x, y, z: x < 0.3)
    support = common_support(first, second)
    (end,) = [r for r in support.regions if r.design == "windowed"]
    (pane,) = [r for r in support.regions if r.design == "short"]
    assert end.mass_share == pytest.approx(0.1 * 0.2 / (0.4 * 0.2 - 0.01), rel=0.15)  # cells at its edge are shared
    assert pane.mass_share == pytest.approx(0.01 / (0.3 * 0.2), rel=0.3)
    assert "is in windowed only" in support.sentence and "is in short only" in support.sentence
    assert not unfounded(support.sentence, support.to_dict())
    moved = support.values_of_second(linear(second.mesh.points))
    assert support.values_of_first(linear(first.mesh.points)) == pytest.approx(moved, abs=0.01 * abs(moved).max())


def test_a_region_has_the_name_of_its_group():
    mesh = plate_mesh("quad4", (16, 8), (0.4, 0.2))
    far = np.nonzero(mesh.points[mesh.blocks[0].nodes].mean(axis=1)[:, 0] > 0.29)[0]
    first = design(mesh.with_(cell_groups={"end": far}), thickness=0.002).with_(name="long")
    support = common_support(first, sheet("short", "tri3", (40, 20), lambda x, y, z: x < 0.3))
    assert [r.place for r in support.regions] == ["end"]


def test_meshes_at_different_places_share_nothing():
    away = sheet("b", "tri3", (9, 5))
    away = away.with_(mesh=away.mesh.with_(points=away.mesh.points + np.array([0, 0, 5])))
    with pytest.raises(RefusedError, match="share no common support"):
        common_support(sheet("a", "quad4", (8, 4)), away)


def test_points_without_cells_are_looked_up_by_distance():
    wire = Design("wire", lone_nodes(5), Physics())
    beside = Design("beside", lone_nodes(4), Physics())
    support = common_support(wire, beside)
    assert len(support.weights) == 4 and not support.distances.any()


def test_lumped_masses_of_one_name_count_at_their_place():
    mass = LumpedMass("head", Selector(group="x1"), 5.0)
    one = sheet("a", "quad4", (8, 4), supports=(CLAMP,), masses=(mass,))
    two = sheet("b", "tri3", (9, 5), supports=(CLAMP,), masses=(mass, LumpedMass("tail", Selector(group="x1"), 1.0)))
    support = common_support(one, two)
    assert support.to_dict()["shared_lumped_masses"] == ["head"]
    rigid = np.ones((one.mesh.n_nodes, 3))
    sheet_mass = 8000 * 0.4 * 0.2 * 0.002
    assert (support.values_of_first(rigid) ** 2).sum() == pytest.approx(3 * (sheet_mass + 5), rel=1e-6)

"""Whether points tell modes apart, and which more would: on a clamped sheet measured at too few places."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from tests.mechanics.models import CLAMP, design
from tests.meshes import box_mesh, line_mesh, plate_mesh
from tests.sentences import unfounded
from viewer.errors import InputError
from viewer.insight.correlate import auto_mac
from viewer.insight.sensor_choice import APART, ENOUGH, SensorChoice, extra_points, judge_points
from viewer.mechanics.eigen import solve
from viewer.model.modes import ArrayShapes, ModeSet

MESH = plate_mesh("quad4", (16, 6), (1, 0.3))


@cache
def modes():
    return solve(design(MESH, thickness=0.005, supports=(CLAMP,)), 6)


def at(nodes, direction=(0, 0, 1)):
    return np.array([modes().shape(i)[nodes] @ np.asarray(direction, float) for i in range(6)])


def sound(found: SensorChoice) -> SensorChoice:
    assert not unfounded(found.sentence, found.to_dict()), found.sentence
    return found


TIP = MESH.node_groups["x1"][:3]


def test_points_crowded_at_the_tip_do_not_tell_bending_modes_apart():
    found = sound(judge_points(at(TIP)))
    facts = found.to_dict()
    assert not facts["told_apart"] and "look alike" in found.sentence and "cannot be told apart" in found.sentence
    assert facts["worst_auto_mac"] == pytest.approx(max(auto_mac(at(TIP))[np.triu_indices(6, 1)]))


def test_points_everywhere_do():
    everywhere = np.nonzero(MESH.points[:, 0] > 0)[0][::5]
    found = sound(judge_points(at(everywhere)))
    assert found.to_dict()["enough"] and "can be told apart: the most alike" in found.sentence
    assert sound(extra_points(MESH, modes(), at(everywhere))).new == ()


def test_a_few_more_points_tell_the_modes_apart():
    found = sound(extra_points(MESH, modes(), at(TIP), count=8))
    assert found.to_dict()["worst_auto_mac"] > 0.9 and found.to_dict()["worst_auto_mac_after"] <= ENOUGH
    assert 1 <= len(found.new) <= 8
    for channel in found.new:  # normal to the sheet, at a node of it
        assert np.abs(channel.direction) == pytest.approx([0, 0, 1])
        assert channel.position == pytest.approx(MESH.points[MESH.node_rows([channel.node])[0]])
    again = np.concatenate([at(TIP), at(MESH.node_rows([c.node for c in found.new]))], axis=1)
    assert found.after == pytest.approx(auto_mac(again))
    assert found.rows[0].keys() == {"point", "node", "x", "y", "z", "direction", "dx", "dy", "dz", "worst_auto_mac"}
    assert found.rows[-1]["worst_auto_mac"] == pytest.approx(found.to_dict()["worst_auto_mac_after"])


def test_the_first_point_is_the_best_of_all_by_trying_each():
    found = extra_points(MESH, modes(), at(TIP), count=1)
    beside = np.triu_indices(6, 1)
    sums = [
        (auto_mac(np.concatenate([at(TIP), at([node])], axis=1))[beside] ** 8).sum() for node in range(MESH.n_nodes)
    ]
    assert found.new[0].node == MESH.node_ids[int(np.argmin(sums))]


def test_better_than_points_taken_at_random():
    chosen = extra_points(MESH, modes(), at(TIP), count=4)
    random, beside, worst = np.random.default_rng(1), np.triu_indices(6, 1), []
    for _ in range(300):
        nodes = random.choice(MESH.n_nodes, len(chosen.new), replace=False)
        worst.append(auto_mac(np.concatenate([at(TIP), at(nodes)], axis=1))[beside].max())
    assert chosen.after[beside].max() <= np.quantile(worst, 0.02)


def test_new_points_keep_off_the_old_ones_and_off_one_another():
    found = extra_points(
        MESH, modes(), at(TIP), count=8, points=MESH.points[TIP], along=np.tile([0, 0, -1.0], (3, 1))
    )
    places = np.array([*MESH.points[TIP], *(c.position for c in found.new)])
    apart = np.linalg.norm(places[:, None] - places, axis=2) + np.eye(len(places))
    assert apart[3:].min() >= APART * MESH.diagonal


def test_without_any_channel_it_is_a_plan():
    found = extra_points(MESH, modes(), np.zeros((6, 0)), count=10, numbers=[1, 2, 3, 4])
    assert found.numbers == (1, 2, 3, 4) and found.to_dict()["worst_auto_mac_after"] <= ENOUGH
    sound(found)


def test_directions_along_axes_and_on_solids():
    block = box_mesh("hex8", (8, 2, 2), (1, 0.1, 0.12))
    moved = solve(design(block, supports=(CLAMP,)), 4)
    along = extra_points(block, moved, np.zeros((4, 0)), directions="axes", count=6)
    assert {tuple(np.abs(c.direction)) for c in along.new} <= {(1, 0, 0), (0, 1, 0), (0, 0, 1)}
    normal = extra_points(block, moved, np.zeros((4, 0)), count=6)
    for channel in normal.new:  # outward, and on no edge
        outward = (channel.position - [0.5, 0.05, 0.06]) @ channel.direction
        assert outward > 0 and np.abs(channel.direction).max() == pytest.approx(1)
    sound(along)


def test_complex_factors_and_the_order_of_channels_change_no_choice():
    factors = np.exp(1j * np.arange(6))[:, None]
    turned = ModeSet(
        modes().node_ids,
        modes().freq_hz,
        ArrayShapes(np.array([modes().shape(i) for i in range(6)]) * factors[:, :, None]),
    )
    one = extra_points(MESH, modes(), at(TIP))
    two = extra_points(MESH, turned, (at(TIP) * factors)[:, ::-1])
    assert [c.node for c in one.new] == [c.node for c in two.new]


def test_what_cannot_be_asked():
    beam = line_mesh([[0, 0, 0], [1, 0, 0], [2, 0, 0]])
    still = ModeSet(beam.node_ids, np.array([1.0, 2.0]), ArrayShapes(np.ones((2, 3, 3))))
    with pytest.raises(InputError, match="no surface"):
        extra_points(beam, still, np.zeros((2, 0)))
    with pytest.raises(InputError, match="'normal' or 'axes'"):
        extra_points(MESH, modes(), at(TIP), directions="up")
    with pytest.raises(InputError, match="do not fit the modes"):
        extra_points(MESH, modes(), at(TIP)[:3])
    with pytest.raises(InputError, match="has no mode 9"):
        extra_points(MESH, modes(), at(TIP), numbers=[1, 9])
    assert "only one mode" in judge_points(at(TIP)[:1]).sentence
    stuck = sound(extra_points(beam, still, np.ones((2, 1)), directions="axes"))
    assert stuck.new == () and "no further point would change that" in stuck.sentence

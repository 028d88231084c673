"""Whether the points of a test are enough to tell the modes apart, and which few more would help most.

Two modes are told apart by their MAC at the channels (auto-MAC). More channels are chosen one at a time among the
nodes of the outer surface, each the one that brings the most alike pairs down furthest. (In the manner of Carne T.G.,
Dohrmann C.R., A modal test design strategy for model correlation, IMAC 13 (1995): the smallest worst entry beside the
diagonal; from memory.)
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from viewer.errors import InputError
from viewer.insight.correlate import auto_mac
from viewer.insight.hammer_pairing import ALIKE
from viewer.insight.hammer_words import numbers as mode_numbers
from viewer.jobs import SILENT, Progress
from viewer.model.arrays import Array, frozen
from viewer.model.mesh import Mesh
from viewer.model.modes import ModeSet
from viewer.model.testset import direction_words

ENOUGH = 0.25  # auto-MAC of different modes below which no further point is asked for (common practice, no source)
APART = 0.02  # of the mesh's diagonal: a new channel nearer to another one of its direction tells nothing new
_FLAT = 0.9  # mean of the unit normals around a node, below which it sits on an edge and no hammer hits it squarely
_SHARPNESS = 8  # power of the auto-MAC in the sum to be made small: large powers look at the worst pairs
_CHUNK = 1 << 14  # candidates at a time


@dataclass(frozen=True, eq=False)
class NewChannel:
    """One more channel: ``node`` id, ``position`` (3,) m, unit ``direction`` (3,), and the worst auto-MAC with it and
    those before it."""

    node: int
    position: Array
    direction: Array
    worst: float

    def to_dict(self, number: int) -> dict[str, Any]:
        return {
            "point": f"new {number}",
            "node": self.node,
            **dict(zip("xyz", self.position.tolist(), strict=True)),
            "direction": direction_words(self.direction),
            **dict(zip(("dx", "dy", "dz"), self.direction.tolist(), strict=True)),
            "worst_auto_mac": self.worst,
        }


@dataclass(frozen=True, eq=False)
class SensorChoice:
    """A finding about the points of a test.

    numbers  (k,) of the modes looked at; before, after (k, k) auto-MAC at the channels there are, and with the new
    channels  how many there are; new: those proposed, best first; asked: how many might have been
    """

    numbers: tuple[int, ...]
    channels: int
    before: Array
    after: Array
    new: tuple[NewChannel, ...] = ()
    asked: int = 0

    def __post_init__(self) -> None:
        object.__setattr__(self, "before", frozen(self.before, float))
        object.__setattr__(self, "after", frozen(self.after, float))

    @property
    def rows(self) -> list[dict[str, Any]]:
        """The new channels for a table: point, node, x, y, z (m), direction, dx, dy, dz, worst_auto_mac."""
        return [channel.to_dict(i) for i, channel in enumerate(self.new, start=1)]

    @property
    def sentence(self) -> str:
        return _sentence(self.to_dict())

    def to_dict(self) -> dict[str, Any]:
        worst, pair = _worst(self.before, self.numbers)
        left, pair_left = _worst(self.after, self.numbers)
        return {
            "modes": list(self.numbers),
            "mode_count": len(self.numbers),
            "channels": self.channels,
            "worst_auto_mac": worst,
            "worst_pair": pair,
            "alike_limit": ALIKE,
            "enough_limit": ENOUGH,
            "told_apart": worst is None or worst <= ALIKE,
            "enough": worst is None or worst <= ENOUGH,
            "new_channels": self.rows,
            "new_count": len(self.new),
            "asked": self.asked,
            "worst_auto_mac_after": left,
            "worst_pair_after": pair_left,
            "auto_mac_before": self.before.tolist(),
            "auto_mac_after": self.after.tolist(),
        }


def judge_points(analysis: Array, numbers: Sequence[int] = ()) -> SensorChoice:
    """How well the channels tell the modes apart, ``analysis`` (k, c) their motion there; ``numbers`` (k,) of the
    modes, 1 to k when empty."""
    seen = np.atleast_2d(analysis)
    matrix = auto_mac(seen)
    return SensorChoice(tuple(numbers) or tuple(range(1, len(seen) + 1)), seen.shape[1], matrix, matrix)


def extra_points(
    mesh: Mesh,
    modes: ModeSet,
    analysis: Array,
    *,
    count: int = 5,
    directions: str = "normal",
    numbers: Sequence[int] = (),
    points: Array | None = None,
    along: Array | None = None,
    progress: Progress = SILENT,
) -> SensorChoice:
    """The up to ``count`` further channels that tell the modes apart best; fewer once no auto-MAC exceeds ``ENOUGH``
    or nothing helps.

    analysis    (k, c) motion of all modes of the set at the channels there are (c may be 0)
    directions  "normal" to the outer surface (where a hammer hits), "axes": x, y and z of the mesh
    numbers     of the modes to tell apart, all when empty
    points, along  (c, 3) places in the mesh and directions of the channels there are; new ones keep off them
    Raises ``InputError`` when arrays do not fit or the mesh has no surface to be normal to.
    """
    rows = [modes.index_of(n, modes.source or "the model") for n in numbers] or list(range(modes.count))
    analysis = np.atleast_2d(analysis)
    if len(analysis) != modes.count:
        raise InputError(
            "shapes at the channels do not fit the modes", found=str(len(analysis)), expected=str(modes.count)
        )
    nodes, ways = _candidates(mesh, directions)
    shapes = np.stack([np.einsum("na,na->n", modes.shape(i)[nodes], ways) for i in rows])
    seen = analysis[rows]
    free = np.ones(len(nodes), bool)
    if points is not None and along is not None:
        for place, way in zip(points, along, strict=True):
            free &= ~_near(mesh, nodes, ways, place, way)
    new: list[NewChannel] = []
    picked = seen
    for step in range(count):
        progress.tick("choosing points", step, count)
        matrix = auto_mac(picked)
        worst, _ = _worst(matrix, rows)
        if not free.any() or (worst is not None and worst <= ENOUGH and picked.shape[1]) or len(rows) < 2:
            break
        gain = _after(picked, shapes, progress)
        gain[~free] = np.inf
        best = int(np.argmin(gain))
        if not gain[best] < _summed(matrix) * (1 - 1e-9) and picked.shape[1]:
            break
        picked = np.concatenate([picked, shapes[:, [best]]], axis=1)
        left, _ = _worst(auto_mac(picked), rows)
        place = mesh.points[nodes[best]]
        new.append(NewChannel(int(mesh.node_ids[nodes[best]]), place, ways[best], float(left or 0.0)))
        free &= ~_near(mesh, nodes, ways, place, ways[best])
    chosen = tuple(i + 1 for i in rows)
    return SensorChoice(chosen, seen.shape[1], auto_mac(seen), auto_mac(picked), tuple(new), count)


def _candidates(mesh: Mesh, directions: str) -> tuple[Array, Array]:
    """Rows of nodes (n,) on the outside and directions (n, 3): a node comes once for each."""
    if directions == "axes":
        nodes = mesh.skin.nodes
        return np.repeat(nodes, 3), np.tile(np.eye(3), (len(nodes), 1))
    if directions != "normal":
        raise InputError(f"directions '{directions}' of new points", expected="'normal' or 'axes'")
    faces = mesh.skin.faces
    if not len(faces):
        raise InputError("the mesh has no surface that points could look across", do="ask for directions along axes")
    corners = mesh.points[faces]
    across = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    area = np.linalg.norm(across, axis=1)
    summed, around = np.zeros((mesh.n_nodes, 3)), np.zeros(mesh.n_nodes)
    for corner in faces.T:
        np.add.at(summed, corner, across)
        np.add.at(around, corner, area)
    length = np.linalg.norm(summed, axis=1)
    nodes = np.nonzero((around > 0) & (length > _FLAT * around))[0]
    return nodes, summed[nodes] / length[nodes, None]


def _near(mesh: Mesh, nodes: Array, ways: Array, place: Array, way: Array) -> Array:
    """(n,) candidates that sit at the place and look along the direction, within 30° either way."""
    close = np.linalg.norm(mesh.points[nodes] - place, axis=1) < APART * mesh.diagonal
    return close & (np.abs(ways @ way) > np.cos(np.radians(30)))


def _after(seen: Array, shapes: Array, progress: Progress) -> Array:
    """(n,) what is to be made small, with each of the candidates ``shapes`` (k, n) added to ``seen`` (k, c)."""
    one, two = np.triu_indices(len(seen), 1)
    cross = (seen.conj() @ seen.T)[one, two]
    size = np.vecdot(seen, seen).real
    out = np.empty(shapes.shape[1])
    for start in range(0, shapes.shape[1], _CHUNK):
        progress.tick("choosing points")
        part = slice(start, start + _CHUNK)
        values = shapes[:, part].T
        products = np.abs(cross + values[:, one].conj() * values[:, two]) ** 2
        lengths = size + np.abs(values) ** 2
        whole = lengths[:, one] * lengths[:, two]
        macs = np.divide(products, whole, out=np.ones(products.shape), where=whole > 0)
        out[part] = (macs**_SHARPNESS).sum(axis=1)
    return out


def _summed(matrix: Array) -> float:
    return float((matrix[np.triu_indices(len(matrix), 1)] ** _SHARPNESS).sum())


def _worst(matrix: Array, numbers: Sequence[int]) -> tuple[float | None, list[int]]:
    """The largest entry beside the diagonal and the two modes it belongs to."""
    if len(matrix) < 2:
        return None, []
    beside = np.where(np.eye(len(matrix), dtype=bool), -1.0, matrix)
    i, j = divmod(int(np.argmax(beside)), len(beside))
    return float(beside[i, j]), sorted((int(numbers[i]), int(numbers[j])))


def _sentence(facts: dict[str, Any]) -> str:
    if facts["worst_auto_mac"] is None:
        return "There is only one mode, so that there is nothing to tell apart."
    words = f"At the {facts['channels']} channels of the test the {facts['mode_count']} modes can be told apart"
    if facts["enough"]:
        return (
            f"{words}: the most alike, {mode_numbers(facts['worst_pair'])}, agree to {facts['worst_auto_mac']:.0%}."
        )
    if facts["told_apart"]:
        words += f", with some risk: {mode_numbers(facts['worst_pair'])} agree to {facts['worst_auto_mac']:.0%}"
    else:
        words = (
            f"At the {facts['channels']} channels of the test {mode_numbers(facts['worst_pair'])} look alike "
            f"(they agree to {facts['worst_auto_mac']:.0%}) and cannot be told apart"
        )
    if not facts["asked"]:
        return words + "."
    if not facts["new_count"]:
        return words + "; no further point would change that."
    more, first = facts["new_count"], facts["new_channels"][0]
    what = "one more channel" if more == 1 else f"{more} more channels"
    return (
        f"{words}; {what} would bring the largest agreement down to "
        f"{facts['worst_auto_mac_after']:.0%}, the first at node {first['node']} along {first['direction']}."
    )

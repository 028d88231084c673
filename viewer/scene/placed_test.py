"""A test in the mesh's axes, as pictures need it: points, channels, measured motion, words for what was put right."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from viewer.cells.locate import Places, interpolation, nearest
from viewer.errors import InputError
from viewer.insight.corrections import correction_words
from viewer.model.arrays import Array, frozen
from viewer.model.mesh import Mesh
from viewer.model.testset import Correction, Placement, TestSet
from viewer.scene.picture import TestCall, TraceMark

FULL_RANK = 1e-6  # singular values of a point's directions below this share of the largest say nothing
SMALL = 0.1  # share of the largest channel below which a channel's phase is mostly noise and is not told


@dataclass(frozen=True, eq=False)
class PlacedTest:
    """A test with its placement; ``used`` (c,) bool: the channels that comparisons use; ``places`` of the mesh that
    the points lie in or nearest to, when they are known."""

    test: TestSet
    placement: Placement
    used: Array
    places: Places | None = None

    def __post_init__(self) -> None:
        object.__setattr__(self, "used", frozen(self.used, bool, shape=(self.test.n_channels,)))

    @cached_property
    def points(self) -> Array:
        """(p, 3) m."""
        return self.placement.points(self.test.points)

    @cached_property
    def directions(self) -> Array:
        """(c, 3) unit vectors."""
        return self.placement.directions(self.test.directions)

    def index_of(self, test_mode: int) -> int:
        """Index of test mode ``test_mode`` (from 1); ``InputError`` for one that is not there."""
        if not 1 <= test_mode <= self.test.count:
            raise InputError(f"test '{self.test.name}' has no mode {test_mode}", expected=f"1 to {self.test.count}")
        return test_mode - 1

    def motion(self, test_mode: int) -> Array:
        """(p, 3) measured motion of test mode ``test_mode`` (from 1) in units of its shape, as ``TestSet.motion``."""
        return self.test.motion(self.index_of(test_mode)) @ self.placement.rotation.T

    def phase_scatter_deg(self, test_mode: int) -> float:
        """Largest angle, degrees, by which a channel with at least a tenth of the largest motion leaves the common
        line of all used channels in the complex plane."""
        values = self.test.shapes[self.index_of(test_mode), self.used]
        if not len(values) or not np.iscomplexobj(values):
            return 0.0
        turned = values * steadiest(values)
        told = np.abs(turned) >= SMALL * np.abs(turned).max(initial=0.0)
        return float(np.degrees(np.arctan2(np.abs(turned.imag), np.abs(turned.real))[told].max(initial=0.0)))

    @cached_property
    def partly(self) -> Array:
        """(p,) bool: points measured along fewer than three independent directions, but along one at least."""
        ranks = [
            np.linalg.matrix_rank(self.directions[rows], tol=FULL_RANK) if len(rows) else 3
            for rows in (self.test.channels_of(point) for point in range(len(self.test.labels)))
        ]
        return np.array(ranks) < 3

    def completed(self, motion: Array, mesh: Mesh, shape: Array) -> Array:
        """(p, 3) ``motion`` with the directions that nobody measured filled in from ``shape`` (n_nodes, 3) of
        ``mesh``, at the place of the mesh nearest to each point; both in the same units."""
        if not mesh.n_cells:
            return motion
        blocks = [(block.kind, block.nodes) for block in mesh.blocks]
        found = nearest(blocks, mesh.points, self.points) if self.places is None else self.places
        carried = np.zeros((len(self.points), 3), np.result_type(shape, motion))
        for rows, nodes, weights in interpolation(blocks, found):
            carried[rows] = np.einsum("kn,knd->kd", weights, shape[nodes])
        out = np.array(motion, carried.dtype)
        for point in range(len(out)):
            rows = self.test.channels_of(point)
            if len(rows):
                measured = np.linalg.pinv(self.directions[rows], rcond=FULL_RANK) @ self.directions[rows]
                out[point] += carried[point] - measured @ carried[point]
            else:
                out[point] = carried[point]
        return out

    def mark(self, name: str, motion: Array, freq_hz: float | None = None, **changes) -> TraceMark:
        """The test as a mark, with ticks along its channels; ``changes`` are further fields of ``TraceMark``."""
        said = {"sensor": self.test.sensor, "ticks": self.directions, **changes}
        return TraceMark(name, self.test.labels, self.points, self.test.lines, motion, freq_hz, **said)

    def tags(self, labels: Sequence[str] | str) -> tuple[TestCall, ...]:
        """Bare labels of the points named; "all" of them. ``InputError`` for a point that is not there."""
        names = self.test.labels if labels == "all" else (labels,) if isinstance(labels, str) else tuple(labels)
        return tuple(TestCall(self.row(label), (label,)) for label in names)

    def row(self, label: str) -> int:
        """Row of the point ``label``; ``InputError`` for a point that is not there."""
        if label not in self.test.labels:
            raise InputError(
                f"test '{self.test.name}' has no point '{label}'", expected=", ".join(self.test.labels[:20])
            )
        return self.test.row(label)

    @property
    def corrections_said(self) -> tuple[str, ...]:
        """What scale notes say about corrections."""
        return corrections_said(self.test)


def place(
    test: TestSet, placement: Placement | None = None, used: Array | None = None, places: Places | None = None
) -> PlacedTest:
    """A test in a mesh's axes; no placement: its axes are the mesh's. ``used`` (c,) bool, None: all channels."""
    still = Placement(np.eye(3), np.zeros(3))
    return PlacedTest(test, placement or still, np.ones(test.n_channels, bool) if used is None else used, places)


def steadiest(values: Array) -> complex:
    """Unit complex factor that turns the common line of complex ``values`` (c,) onto the real axis."""
    total = complex((values * values).sum())
    return complex(np.exp(-0.5j * np.angle(total))) if abs(total) > 0 else 1.0 + 0.0j


# ---- words for corrections


def question(test: TestSet, correction: Correction) -> str:
    """What is asked about a correction proposed: "point 12, +X: sign flipped?"."""
    return f"{_words(test, correction)}?"


def corrections_said(test: TestSet) -> tuple[str, ...]:
    """What scale notes say about what was put right: "1 corrected: point 12, +X: sign flipped"."""
    if not test.corrections:
        return ()
    listed = "; ".join(_words(test, correction) for correction in test.corrections)
    return (f"{len(test.corrections)} corrected: {listed}",)


def _words(test: TestSet, correction: Correction) -> str:
    try:
        return correction_words(correction, test)
    except InputError:  # the channel has been left out since: its sign is no longer known
        return correction_words(correction)

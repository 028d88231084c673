"""A clamped plate with a hammer test of known truth, in axes of its own: for tests of pictures."""

from __future__ import annotations

from functools import cache

import numpy as np

from tests.mechanics.models import CLAMP, design
from tests.meshes import plate_mesh
from viewer.mechanics.eigen import solve
from viewer.model.testset import Placement, TestSet
from viewer.scene.placed_test import PlacedTest, place
from viewer.workspace.study import Study, study

# the test's axes: x_mesh = turned · x_test + shift, a quarter turn about z and a shift
PLACEMENT = Placement([[0.0, 1, 0], [-1, 0, 0], [0, 0, 1]], (0.02, 0.3, -0.1))
FACTOR = 0.4 * np.exp(2.1j)  # of the measured shapes: a shape has no size and no phase of its own
AT = [(i, j) for i in (4, 8, 12, 16) for j in (0, 3, 6)]  # points, by column and row of the plate's nodes
LINES = [(k, k + 3) for k in range(9)]


@cache
def plate() -> Study:
    part = design(plate_mesh("quad4", (16, 6), (0.3, 0.1)), thickness=0.002, supports=(CLAMP,))
    return study(part, solve(part, 4))


@cache
def rows() -> tuple[int, ...]:
    """Mesh rows of the points."""
    points = plate().design.mesh.points
    at = [(0.3 * i / 16, 0.1 * j / 6, 0.0) for i, j in AT]
    return tuple(int(np.argmin(np.linalg.norm(points - place, axis=1))) for place in at)


def hammered(scatter_deg: float = 0.0, **changes) -> TestSet:
    """All modes of the plate, measured along z at every point but the first and along x at every other one; channels
    by turns ``scatter_deg`` ahead of and behind the mode's own phase."""
    count = len(AT)
    sensor = np.array([*range(1, count), *range(0, count, 2)])
    mesh_axes = np.array([[0, 0, 1.0]] * (count - 1) + [[1.0, 0, 0]] * ((count + 1) // 2))
    moved = np.array([plate().modes.shape(k)[np.array(rows())] for k in range(plate().count)])
    shapes = np.einsum("mcd,cd->mc", moved[:, sensor], mesh_axes)
    ahead = np.where(np.arange(len(sensor)) % 2 == 0, 1, -1)
    measured = FACTOR * shapes * np.exp(1j * np.radians(scatter_deg) * ahead)
    said = {
        "name": "hammer",
        "labels": tuple(str(k + 1) for k in range(count)),
        "points": (plate().design.mesh.points[list(rows())] - PLACEMENT.shift) @ PLACEMENT.rotation,
        "lines": LINES,
        "sensor": sensor,
        "directions": mesh_axes @ PLACEMENT.rotation,
        "freq_hz": 1.02 * plate().modes.freq_hz,
        "shapes": measured,
        **changes,
    }
    return TestSet(**said)


def placed(scatter_deg: float = 0.0, **changes) -> PlacedTest:
    return place(hammered(scatter_deg, **changes), PLACEMENT)


def analysis(mode: int) -> np.ndarray:
    """(c,) motion of a mode of the plate along the channels."""
    test = hammered()
    return np.einsum(
        "cd,cd->c",
        plate().modes.shape(mode - 1)[np.array(rows())[test.sensor]],
        PLACEMENT.directions(test.directions),
    )

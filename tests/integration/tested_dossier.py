"""A dossier of one folded channel and a hammer test of it, invented, with faults that are known."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from scipy.spatial.transform import Rotation

from tests.integration.models import channel_mesh
from tests.meshes import plate_mesh
from viewer.insight.register import register
from viewer.loaders import write_interchange, write_test
from viewer.model.mesh import Mesh
from viewer.model.modes import ModeSet
from viewer.model.testset import Placement, TestSet
from viewer.workspace import Workspace

MEASURED = 4
FLIPPED = "5"  # the point whose channel along z has the wrong sign
NOISE = 0.01  # of a mode's largest reading
WORKSHOP = Placement(Rotation.from_euler("zx", [90, 90], degrees=True).as_matrix(), np.array([0.1, -0.05, 0.3]))

_TEXT = """title = "tested channel"

[units]
length = "mm"
modulus = "GPa"

[materials.steel]
youngs_modulus = 205
poisson = 0.3
density = 7850

[[designs]]
name = "channel"
mesh = "channel.vtu"
solve = 4
assign = [{target = "*", material = "steel", thickness = 1.5}]
supports = [{name = "root", group = "root"}]
"""
_TEST = """
[[tests]]
name = "hammer"
file = "hammer.unv"
"""
_LANDMARKS = """landmarks = [
    {{point = "1", near = {0}}},
    {{point = "7", near = {1}}},
    {{point = "13", near = {2}}},
    {{point = "18", near = {3}}},
]
"""


def write_tested(folder: Path, *, landmarks: bool = True) -> Path:
    """The channel, and a test of 18 points across its web and flanges: three directions each, point 5 flipped."""
    folder.mkdir(parents=True, exist_ok=True)
    mesh, groups = channel_mesh(17, 0.4)
    mesh = mesh.with_(node_groups=groups)
    write_interchange(folder / "channel.vtu", mesh)
    path = folder / "dossier.toml"
    path.write_text(_TEXT, encoding="utf-8")
    modes = Workspace(cache=None).open(path).modes("channel", 2 * MEASURED)
    true = np.array([[x, y, z] for x in np.linspace(0.08, 0.4, 6) for y, z in ((0, 0.04), (0.03, 0), (0.06, 0.03))])
    write_test(folder / "hammer.unv", readings(mesh, modes, true))
    near = [(1000 * true[int(n) - 1]).round(3).tolist() for n in ("1", "7", "13", "18")]
    named = _LANDMARKS.format(*near) if landmarks else ""
    path.write_text(_TEXT + _TEST + named, encoding="utf-8")
    return path


def readings(
    mesh: Mesh, modes: ModeSet, true: np.ndarray, *, measured: int = MEASURED, flip: str = FLIPPED
) -> TestSet:
    """What three channels at each of the places ``true`` (p, 3) would read, in the workshop's axes, with noise."""
    random = np.random.default_rng(8)
    count = len(true)
    plain = TestSet(
        "hammer",
        tuple(str(n + 1) for n in range(count)),
        (true - WORKSHOP.shift) @ WORKSHOP.rotation,
        [[n, n + 3] for n in range(count - 3)],
        np.repeat(np.arange(count), 3),
        np.tile(np.eye(3), (count, 1)),
        modes.freq_hz[:measured] * 0.97,
        np.zeros((measured, 3 * count)),
        np.full(measured, 0.01),
    )
    placed = register(plain, mesh, placement=WORKSHOP)
    shapes = np.array([placed.seen(modes.shape(i)) for i in range(measured)])
    shapes /= np.abs(shapes).max(axis=1, keepdims=True)
    shapes += NOISE * random.normal(size=shapes.shape)
    if flip:
        shapes[:, 3 * (int(flip) - 1) + 2] *= -1
    return plain.with_(shapes=shapes)


def write_square(folder: Path) -> Path:
    """A square plate and a test on its grid points, which fit in eight ways."""
    folder.mkdir(parents=True, exist_ok=True)
    mesh = plate_mesh("quad4", (6, 6), (0.3, 0.3))
    write_interchange(folder / "channel.vtu", mesh.with_(node_groups={"root": mesh.node_groups["x0"]}))
    path = folder / "dossier.toml"
    path.write_text(_TEXT, encoding="utf-8")
    modes = Workspace(cache=None).open(path).modes("channel", 8)
    x, y = np.meshgrid([0, 0.1, 0.2, 0.3], [0, 0.1, 0.2, 0.3])
    true = np.stack([x.ravel(), y.ravel(), 0 * x.ravel()], axis=1)
    test = readings(mesh, modes, true, flip="")
    along_z = np.flatnonzero(np.abs(WORKSHOP.directions(test.directions)[:, 2]) > 0.9)
    write_test(folder / "hammer.unv", test.only(along_z))
    path.write_text(_TEXT + _TEST, encoding="utf-8")
    return path

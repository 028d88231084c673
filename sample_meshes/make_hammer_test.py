"""Writes the sample hammer test of the boom: boom/hammer.unv and its twin in tables, boom/hammer_*.csv.

    python sample_meshes/make_hammer_test.py            # rewrites them beside this script
    python sample_meshes/make_hammer_test.py FOLDER     # writes them elsewhere

The test is invented: nothing was ever struck or measured. "The real article" is the baseline design with slightly
other sheets, material and camera, solved; its six lowest modes are seen by 22 sensor points in a workshop's own axes
and millimetres, with noise, phase scatter and damping. Two faults are built in, as they happen: the channel of point
11 has the wrong sign, and what was measured at points 9 and 12 was recorded under each other's label.
"""

from __future__ import annotations

import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from viewer.cells import interpolation, nearest
from viewer.loaders import read_dossier, read_mesh, write_test
from viewer.mechanics.eigen import solve
from viewer.model.design import Design
from viewer.model.testset import Placement, TestSet

Floats = NDArray[np.float64]
HERE = Path(__file__).parent
SEED = 20_250
NOISE, ASTRAY = 0.02, 0.0008  # of a mode's largest motion; m, of marked points
SCATTER = np.radians([3.0, 3.0, 4.0, 3.0, 10.0, 4.0])  # of phases, by mode: the fifth is not nearly real
FLIPPED, EXCHANGED = ("11", "+Z"), ("9", "12")

# The workshop's axes: X across the boom to its right, Y along it, Z up; the origin on the floor beside its root.
WORKSHOP = Placement(np.array([[0.0, 1, 0], [-1, 0, 0], [0, 0, 1]]), np.array([-0.25, 0.4, -1.15]))

# Where sensors were meant to sit, mm in the axes of the drawing (x along the boom, y across, z up), and the
# directions in which they measure, in the workshop's axes: outwards, hence +Z on top, −Z below, −X on the left,
# +X on the right.
POINTS: dict[str, tuple[tuple[float, float, float], tuple[str, ...]]] = {
    "1": ((50, 65, 0), ("+Z",)),
    "2": ((50, -65, 0), ("+Z",)),
    "3": ((185, 80, -50), ("-X",)),
    "4": ((185, -80, -50), ("+X",)),
    "5": ((320, 66, 0), ("-X", "+Z")),
    "6": ((320, -66, 0), ("+Z",)),
    "7": ((420, 80, -60), ("-X",)),
    "8": ((440, 0, 0), ("+Z",)),
    "9": ((560, 0, 0), ("+Z",)),
    "10": ((640, 66, 0), ("-X", "+Z")),
    "11": ((640, -66, 0), ("+Z",)),
    "12": ((820, 0, 0), ("+Z",)),
    "13": ((890, 66, 0), ("-X", "+Y", "+Z")),
    "14": ((890, -66, 0), ("+X", "+Z")),
    "15": ((600, 60, -100), ("-X", "-Z")),
    "16": ((710, -60, -100), ("+X", "+Y", "-Z")),
    "17": ((300, 0, -100), ("-Z",)),
    "18": ((460, 0, -100), ("-Z",)),
    "19": ((810, -80, -75), ("+X",)),
    "20": ((880, -80, -60), ("+X",)),
    "21": ((690, -80, -55), ("+X",)),
    "22": ((900, 0, -50), ("+Y", "+Z")),
}
LINES = (
    "1 5", "5 10", "10 13", "2 6", "6 11", "11 14", "1 2", "5 6", "10 11", "13 14", "13 22", "14 22", "8 9", "9 12",
    "3 7", "4 21", "21 20", "20 19", "15 16", "17 18", "18 15", "5 7", "8 17",
)  # fmt: skip


def real_article(folder: Path) -> Design:
    """The baseline as it came off the press brake: sheets a little thicker, a little softer, a heavier camera."""
    plan = read_dossier(folder / "dossier.toml").plan("baseline")
    design = plan.build(read_mesh(plan.mesh_file, plan.length_unit))
    aluminium = design.physics.materials["aluminium"]
    factors = {"*": 1.06, "camera_seat": 1.02, "score_line": 1.04}
    physics = replace(
        design.physics,
        materials={"aluminium": replace(aluminium, youngs_modulus=aluminium.youngs_modulus * 0.96)},
        assignments=tuple(replace(a, thickness=a.thickness * factors[a.target]) for a in design.physics.assignments),
        masses=tuple(replace(mass, mass=mass.mass * 1.12) for mass in design.physics.masses),
    )
    return replace(design, physics=physics)


def measured(design: Design) -> TestSet:
    """What the test recorded, faults and all."""
    random = np.random.default_rng(SEED)
    modes = solve(design, len(SCATTER))
    meant = np.array([place for place, _ in POINTS.values()]) / 1000
    directions = np.array([_unit(word) for _, words in POINTS.values() for word in words])
    sensor = np.repeat(np.arange(len(POINTS)), [len(words) for _, words in POINTS.values()])
    blocks = [(block.kind, block.nodes) for block in design.mesh.blocks]
    places = nearest(blocks, design.mesh.points, meant)
    motion = np.zeros((modes.count, len(meant), 3))
    for mode in range(modes.count):
        for rows, nodes, weights in interpolation(blocks, places):
            motion[mode, rows] = np.einsum("kn,knj->kj", weights, modes.shape(mode)[nodes])
    along = WORKSHOP.directions(directions)
    shapes = np.einsum("mcj,cj->mc", motion[:, sensor], along).astype(complex)
    shapes /= np.abs(shapes).max(axis=1, keepdims=True)
    shapes *= np.exp(1j * random.normal(size=shapes.shape) * SCATTER[:, None])
    shapes += NOISE * (random.normal(size=shapes.shape) + 1j * random.normal(size=shapes.shape)) / np.sqrt(2)
    labels = tuple(POINTS)
    marked = meant + random.normal(size=meant.shape) * ASTRAY
    marked = (marked - WORKSHOP.shift) @ WORKSHOP.rotation
    test = TestSet(
        "hammer",
        labels,
        np.round(marked * 2000) / 2000,  # a tape is read to half a millimetre
        [[labels.index(a), labels.index(b)] for a, b in (line.split() for line in LINES)],
        sensor,
        directions,
        np.round(modes.freq_hz * (1 + 0.001 * random.normal(size=modes.count)), 2),
        _recorded(shapes, labels, sensor, directions),
        np.round(0.004 + 0.008 * random.random(modes.count), 4),
    )
    return test


def _recorded(shapes: NDArray[np.complex128], labels: tuple[str, ...], sensor: NDArray[np.int64], directions: Floats):
    """The shapes with the two faults in them, to four decimals."""
    shapes = shapes.copy()
    point, word = FLIPPED
    flipped = (sensor == labels.index(point)) & (directions == _unit(word)).all(axis=1)
    shapes[:, flipped] *= -1
    one, other = (np.flatnonzero(sensor == labels.index(label)) for label in EXCHANGED)
    shapes[:, [*one, *other]] = shapes[:, [*other, *one]]
    return np.round(shapes, 4)


def _unit(word: str) -> Floats:
    return float(word[0] + "1") * np.eye(3)["XYZ".index(word[1])]


def main(folder: Path) -> None:
    (HERE / "boom" / "hammer.unv").touch()  # the dossier that is read here names it
    test = measured(real_article(HERE / "boom"))
    (folder / "boom").mkdir(parents=True, exist_ok=True)
    for name in ("hammer.unv", "hammer.csv"):
        write_test(folder / "boom" / name, test, length_unit=0.001)


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else HERE)

"""What passes through a hinge, and what makes several dense places one line: parts built to have the answer.

The moment through a cut of a body in balance is that of all loads on one side of it (statics); of a mode, that of the
inertia forces ω² M φ beyond the cut.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.insight.test_hinges import CLAMP, GROOVE, LENGTH, STEEL, THICK, WIDTH, grooved, middles, sheet, without
from tests.meshes import plate_mesh
from tests.sentences import unfounded
from viewer.insight.hinges import find_hinges
from viewer.insight.hinges.gates import DOUBTFUL, DOUBTFUL_SHARE, confidence
from viewer.insight.hinges.profile import edges_of, profile
from viewer.mechanics.assembly import assemble
from viewer.mechanics.eigen import solve
from viewer.model.design import Assignment, Design, Physics, Selector, Support


def inertia_moment(design, modes, beyond, about):
    """Moment about y through x = ``about`` of the inertia forces of the nodes beyond x = ``beyond``, by mode 1."""
    system = assemble(design)
    vector = system.gather(modes.shape(0), modes.rotations(0))
    force, spin = system.spread(modes.omega(0) ** 2 * (system.M @ vector))
    points = design.mesh.points
    there = points[:, 0] > beyond + 1e-9
    arm = points[there] - [about, WIDTH / 2, 0]
    moment = np.cross(arm, force[there]).sum(axis=0)
    return abs(moment[1] + (0 if spin is None else spin[there, 1].sum()))


def test_stiffness_is_the_moment_of_what_swings_beyond_over_the_fold():
    design = grooved()
    modes = solve(design, 1)
    (hinge,) = find_hinges(design, modes, 1).hinges
    moment = inertia_moment(design, modes, GROOVE[1], hinge.position[0])
    assert hinge.stiffness * hinge.fold_angle == pytest.approx(moment, rel=0.02)


def panel(straps):
    """A clamped frame with a panel that hangs on thinned ``straps`` (intervals of y) along x = 0.1."""
    mesh = plate_mesh("quad4", (60, 30), (LENGTH, WIDTH))
    x, y, _ = middles(mesh).T
    inside = (x > 0.1) & (x < 0.22) & (y > 0.03) & (y < 0.12)
    around = (x > 0.095) & (x < 0.225) & (y > 0.025) & (y < 0.125) & ~inside
    held = np.logical_or.reduce([(x < 0.1) & (y > a) & (y < b) for a, b in straps])
    part = without(mesh, around & ~held)
    x, y, _ = middles(part).T
    thin = np.logical_or.reduce([(x > 0.095) & (x < 0.1) & (y > a) & (y < b) for a, b in straps])
    design = sheet(part, thin)
    held = tuple(Support(edge, Selector(group=edge)) for edge in ("x0", "x1", "y0", "y1"))
    return design.with_(physics=replace(design.physics, supports=held)), thin


def test_a_panel_on_two_straps_has_one_hinge():
    design, thin = panel([(0.03, 0.05), (0.1, 0.12)])
    finding = find_hinges(design, solve(design, 1), 1)
    (hinge,) = finding.hinges
    assert (hinge.kind, hinge.label) == ("line", "strong")
    assert set(hinge.cells) == set(np.nonzero(thin)[0])
    assert hinge.length == pytest.approx(0.09, rel=1e-6)
    assert hinge.position == pytest.approx([0.0975, WIDTH / 2, 0], abs=1e-4)
    assert len(finding.flaps) == 1


def test_two_panels_beside_each_other_are_two():
    mesh = plate_mesh("quad4", (60, 30), (LENGTH, WIDTH))
    x, y, _ = middles(mesh).T
    part = without(mesh, (x > 0.1) & (y > 0.07) & (y < 0.08))  # two tongues
    x, y, _ = middles(part).T
    design = sheet(part, (x > 0.1) & (x < 0.105))
    finding = find_hinges(design, solve(design, 2), 2)
    assert len(finding.hinges) == 2  # they swing against each other: no common side, no common line


def test_edges_where_the_moment_changes_across_the_band():
    centres = (np.arange(60) + 0.5) / 60
    inside = (centres > 0.4) & (centres < 0.6)
    density = np.where(inside, (2.5 - 12.5 * (centres - 0.4)) ** 2 + 1, 0.05)  # 7.2 down to 1
    low, high = np.arange(60) / 60, (np.arange(60) + 1) / 60
    found = edges_of(profile(low, high, density / 60, np.full(60, 1 / 60), (0.0, 1.0)))
    assert found is not None
    assert (found.low, found.high) == (pytest.approx(0.4, abs=0.01), pytest.approx(0.6, abs=0.01))


def shallow(share):
    """A plate with ``share`` of its thickness left in a groove near its root, where it bends most."""
    mesh = plate_mesh("quad4", (60, 15), (LENGTH, WIDTH))
    x = middles(mesh)[:, 0]
    thin = (x > 0.04) & (x < 0.05)
    groups = {"plain": np.nonzero(~thin)[0], "thin": np.nonzero(thin)[0]}
    given = (Assignment("plain", STEEL.name, THICK), Assignment("thin", STEEL.name, share * THICK))
    return Design("shallow", mesh.with_(cell_groups=groups), Physics({STEEL.name: STEEL}, given, (CLAMP,)))


def test_between_a_hinge_and_none_it_is_undecided():
    """The deeper the groove, the surer: spread, then undecided, then a hinge; never back."""
    verdicts, order = [], {"bending is spread": 0, "undecided": 1, "hinges": 2}
    for share in (0.95, 0.82, 0.78, 0.74, 0.7, 0.66, 0.5):
        design = shallow(share)
        finding = find_hinges(design, solve(design, 1), 1)
        verdicts.append(finding.verdict)
        if finding.verdict == "undecided":
            assert not finding.hinges and not finding.flaps
            assert finding.doubtful[0].strain_share >= DOUBTFUL_SHARE
            (line,) = finding.doubtful
            assert line.label == "undecided" and DOUBTFUL <= line.score < 1
            assert finding.to_dict()["doubtful"][0]["confidence"] == line.confidence
            assert "not certain" in finding.sentence and not unfounded(finding.sentence, finding.to_dict())
    steps = [order[verdict] for verdict in verdicts]
    assert steps == sorted(steps) and {0, 1, 2} == set(steps), verdicts


def test_chance_grows_with_the_score_and_is_never_certain():
    chances = [confidence(score) for score in (0.5, DOUBTFUL, 1.0, 1.5, 5.0)]
    assert chances == sorted(chances) and chances[-1] < 1

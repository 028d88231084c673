"""Effective masses of a uniform cantilever (tests/data/checks.csv, topic 9) by beams, shells and solids.

Three meshes each, limits by Richardson's rule against max(row's tolerance, 1e-3), beams against 1e-5. Poisson's ratio
is zero and the body slender, since the rows belong to a beam without shear and rotary inertia. Sources stand in the
rows.
"""

from __future__ import annotations

import numpy as np
import pytest

from tests.checks.reference import richardson, row
from tests.meshes import box_mesh, line_mesh, plate_mesh
from viewer.insight.effective_mass import effective_masses
from viewer.mechanics.eigen import solve
from viewer.model.design import Assignment, Design, Material, Physics, Section, Selector, Support

STEEL = Material("steel", 200e9, 0.0, 8000.0)
LENGTH, DEPTH = 1.0, 0.004
ROOT = Selector(group="x0")
BENDING = 6


def beams(cells: int) -> Design:
    mesh = line_mesh(np.outer(np.linspace(0, LENGTH, cells + 1), [1, 0, 0]))
    section = Section("rectangle", width=0.01, height=DEPTH)
    assigned = Assignment("*", "steel", None, "line2-slender", section, (0, 0, 1))
    within = Support("plane", Selector(nodes=mesh.node_ids), ("uy", "rx", "rz"))
    return Design("beam", mesh, Physics({"steel": STEEL}, (assigned,), (Support("root", ROOT), within)))


def shells(cells: int) -> Design:
    mesh = plate_mesh("quad4", (cells, 1), (LENGTH, 0.01))
    within = Support("plane", Selector(nodes=mesh.node_ids), ("uy", "rx", "rz"))
    assigned = Assignment("*", "steel", DEPTH)
    return Design("strip", mesh, Physics({"steel": STEEL}, (assigned,), (Support("root", ROOT), within)))


def solids(cells: int) -> Design:
    mesh = box_mesh("hex20", (cells, 1, 1), (LENGTH, 0.01, DEPTH))
    within = Support("plane", Selector(nodes=mesh.node_ids), ("uy",))
    return Design(
        "bar", mesh, Physics({"steel": STEEL}, (Assignment("*", "steel"),), (Support("root", ROOT), within))
    )


def shares(design: Design) -> np.ndarray:
    """Effective mass along z over the mass of the whole, of the first six modes."""
    found = effective_masses(design, solve(design, BENDING))
    assert found.whole[2] == pytest.approx(STEEL.density * LENGTH * 0.01 * DEPTH, rel=1e-9)
    return found.values[:, 2] / found.whole[2]


# rate, as observed and settled over these meshes: h⁶ of the cubic beam, whose values at nodes are better than its
# energy; h² of the flat shell and of quadratic solids far longer than thick
BODIES = [
    pytest.param(beams, (8, 16, 32), 6.0, 1e-5, id="beams"),
    pytest.param(shells, (24, 48, 96), 2.0, 1e-3, id="shells"),
    pytest.param(solids, (12, 24, 48), 2.0, 1e-3, id="solids"),
]


@pytest.mark.parametrize(("body", "meshes", "rate", "bound"), BODIES)
def test_cantilever(body, meshes, rate, bound):
    """E08 and E09: the fractions and their running sum."""
    found = richardson(*(shares(body(cells)) for cells in meshes))
    assert (found.error(row("E08").values) <= bound).all()
    assert np.allclose(np.cumsum(found.limit), row("E09").values, rtol=max(bound, row("E09").tolerance), atol=0)
    converging = np.isfinite(found.rate)
    assert converging[1:].all()  # the first is settled on the coarsest mesh of beams
    assert np.abs(found.rate[converging] - rate).max() < 0.4


def test_what_a_clamp_holds_shrinks_with_the_mesh():
    """The rows' limit 1 of all modes together: a beam's clamp carries nothing, a mesh's clamp half its first cell."""
    held = []
    for cells in (8, 16, 32):
        design = beams(cells)
        found = effective_masses(design, solve(design, 2))
        held.append(found.supports[2] / found.whole[2])
    assert held[0] < 1 / 8
    assert np.array(held[:-1]) / held[1:] == pytest.approx([2.0, 2.0], rel=1e-6)

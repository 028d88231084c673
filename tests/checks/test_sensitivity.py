"""Topic 8 of tests/data/checks.csv: derivatives, changes and receptance of two masses between three springs.

The rows' system K = [[2, −1], [−1, 2]], M = I is built as a design of springs and lumped masses and solved.
"""

from __future__ import annotations

import re
from fractions import Fraction

import numpy as np
import pytest

from tests.checks.reference import row
from tests.mechanics.models import design, lone_nodes
from viewer.insight.gain import gain_map
from viewer.mechanics.assembly import assemble
from viewer.mechanics.eigen import solve
from viewer.model.design import LumpedMass, Selector, Spring, Support


def chain(k1=1.0, k2=1.0, k3=1.0):
    """Row S01: K = [[k1 + k2, −k2], [−k2, k2 + k3]], M = I along x."""
    at = [Selector(nodes=[1]), Selector(nodes=[2])]
    return design(
        lone_nodes(2),
        masses=(LumpedMass("first", at[0], 1.0), LumpedMass("second", at[1], 1.0)),
        springs=(
            Spring("ground 1", at[0], None, [k1, 0, 0, 0, 0, 0]),
            Spring("between", *at, [k2, 0, 0, 0, 0, 0]),
            Spring("ground 2", at[1], None, [k3, 0, 0, 0, 0, 0]),
        ),
        supports=(Support("guide", Selector(nodes=[1, 2]), ("uy", "uz")),),
    )


def squares(model):
    """λ = ω² of both modes."""
    return (2 * np.pi * solve(model, 2).freq_hz) ** 2


def along(model):
    """(2, 2) shapes along x as rows, the first component positive."""
    shapes = solve(model, 2).shapes.moved[:, :, 0]
    return shapes * np.sign(shapes[:, :1])


@pytest.fixture(scope="module")
def maps():
    model = chain()
    modes = solve(model, 2)
    return [gain_map(model, modes, number) for number in (1, 2)]


def test_the_design_is_that_of_the_rows():
    system = assemble(chain())
    free = system.restrict(system.K).toarray()
    np.testing.assert_allclose(free, [[2, -1], [-1, 2]])
    np.testing.assert_allclose(system.restrict(system.M).toarray(), np.eye(2))
    assert "K=[[2,-1],[-1,2]], M=I (lambda 1,3)" in row("S01").inputs
    np.testing.assert_allclose(squares(chain()), [1, 3], rtol=1e-12)


@pytest.mark.parametrize(("name", "spring"), [("S01", 0), ("S02", 1)])
def test_springs_s01_s02(maps, name, spring):
    """∂λ/∂k = λ/k ∂ln λ/∂ln k, k = 1."""
    slopes = [square * found.springs[spring].share for square, found in zip(squares(chain()), maps, strict=True)]
    np.testing.assert_allclose(slopes, row(name).values, rtol=row(name).tolerances[0], atol=1e-12)


def test_masses_s03(maps):
    slopes = [square * found.masses[0].per_mass for square, found in zip(squares(chain()), maps, strict=True)]
    np.testing.assert_allclose(slopes, row("S03").values, rtol=row("S03").tolerances[0])
    whole = [-square * found.masses[0].share for square, found in zip(squares(chain()), maps, strict=True)]
    np.testing.assert_allclose(whole, row("S03").values, rtol=row("S03").tolerances[0])  # of 1 kg without inertia


def test_shapes_s04():
    """Change of the shapes with the first ground spring, by solving with a little more and a little less."""
    step = 1e-4
    slopes = (along(chain(1 + step)) - along(chain(1 - step))) / (2 * step)
    expected = np.array([float(number) for number in re.findall(r"-?\d+\.\d+", row("S04").text)]).reshape(2, 2)
    np.testing.assert_allclose(slopes, expected, rtol=row("S04").tolerances[0])


def test_spring_added_s06():
    values = [float(number) for number in re.findall(r"\d\.\d{4,}", row("S06").text)]
    np.testing.assert_allclose(squares(chain(k1=2.0)), values, rtol=row("S06").tolerances[0])


def test_fractions_s09(maps):
    text = [re.findall(r"\d+/\d+|\b0\b", part) for part in row("S09").text.split(",")]
    for found, fractions in zip(maps, text, strict=True):
        shares = [spring.share for spring in found.springs]
        np.testing.assert_allclose(shares, [float(Fraction(f)) for f in fractions], atol=1e-12)
        assert found.stiffness_total == pytest.approx(1, abs=1e-12)
        assert found.mass_total == pytest.approx(-1, abs=1e-12)


def test_receptance_s10():
    """Forces on the first mass: by the assembled matrices, and by the sum over the solved modes."""
    model = chain()
    system, shapes, poles = assemble(model), along(model), squares(model)
    stiffness, mass = system.restrict(system.K).toarray(), system.restrict(system.M).toarray()
    given = [
        [float(number) for number in re.findall(r"H\d1=(-?[\d.]+)", part)] for part in row("S10").text.split("|")
    ]
    forced = [float(number) for number in re.findall(r"w\^2=([\d.]+)", row("S10").inputs)]
    assert forced == [0.5, 2.0]
    for square, expected in zip(forced, given, strict=True):
        answer = np.linalg.solve(stiffness - square * mass, [1.0, 0.0])
        summed = (shapes[:, 0] / (poles - square)) @ shapes
        np.testing.assert_allclose(answer, expected, atol=1e-12)
        np.testing.assert_allclose(summed, expected, atol=1e-12)

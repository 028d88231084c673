"""Imported modes: closure and residual tell matching matrices from others.

The modes come from scikit-fem, an independent library, on the same mesh with its own elements.
"""

from __future__ import annotations

import numpy as np
import pytest

from tests import independent
from tests.mechanics.models import CLAMP, STEEL, design
from tests.meshes import box_mesh
from viewer.errors import RefusedError
from viewer.mechanics import closure
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import CLOSURE_BOUND, RESIDUAL_BOUND, best_formulation, energies
from viewer.model.design import Assignment, Material, Physics, Selector, Support
from viewer.model.modes import ArrayShapes

BAR = box_mesh("hex8", (16, 4, 3), (2.0, 0.3, 0.2))
TRILINEAR = independent.modes(BAR, STEEL, 6, held="x0")
QUADRATIC = independent.modes(BAR, STEEL, 4, degree=2, held="x0")
FREE = independent.modes(BAR, STEEL, 10, degree=2)


def clamped(material=STEEL, **changes):
    return design(BAR, material=material, supports=changes.pop("supports", (CLAMP,)), **changes)


def test_same_formulation_closes_to_rounding():
    found = energies(clamped(formulation="hex8-full"), TRILINEAR)
    np.testing.assert_allclose(found.closure, 1, atol=1e-8)
    assert (found.residual < 1e-10).all()
    assert found.trusted.all()


@pytest.mark.parametrize(("modes", "supports", "elastic"), [(QUADRATIC, (CLAMP,), 0), (FREE, (), 6)])
def test_quadratic_elements_of_another_library_are_trusted(modes, supports, elastic):
    found = energies(clamped(supports=supports), modes)
    assert np.isnan(found.closure[:elastic]).all()
    assert (np.abs(found.closure[elastic:] - 1) < CLOSURE_BOUND).all()
    assert (found.residual[elastic:] < RESIDUAL_BOUND).all()
    assert found.trusted[elastic:].all()
    assert not np.allclose(found.closure[elastic:], 1, atol=1e-4)  # truly another formulation
    assert "are trusted" in found.sentence(elastic)


def test_best_formulation_names_the_one_that_made_the_modes():
    best = best_formulation(clamped(), TRILINEAR)
    assert best.names == {"hex8": "hex8-full"}
    assert best.error < 1e-8
    assert len(best.tried) > 1
    assert best.tried[1][1] > 0.01
    assert best.sentence.startswith("hex8-full closes best")
    assert best_formulation(clamped(), QUADRATIC).names == {"hex8": "hex8-incompatible"}
    with pytest.raises(RefusedError, match="elastic"):
        best_formulation(
            clamped(supports=()), FREE.with_(freq_hz=FREE.freq_hz[:2], shapes=ArrayShapes(FREE.shapes.moved[:2]))
        )


@pytest.mark.parametrize(
    ("material", "ratio"),
    [
        (Material("half as stiff", 100e9, 0.3, 8000), np.sqrt(0.5)),
        (Material("aluminium density", 200e9, 0.3, 2700), np.sqrt(8000 / 2700)),
        (Material("tonnes and millimetres", 200e9, 0.3, 8e-9), np.sqrt(1e12)),
    ],
)
def test_wrong_material_shows_in_closure(material, ratio):
    found = energies(clamped(material, formulation="hex8-full"), TRILINEAR)
    np.testing.assert_allclose(found.closure, ratio, rtol=1e-8)
    assert not found.trusted.any()
    assert "NOT to be trusted" in found.sentence(0)


@pytest.mark.parametrize(
    "supports",
    [(), (CLAMP, Support("tip", Selector(group="x1"))), (CLAMP, Support("side", Selector(group="y0"), ("uy",)))],
)
def test_modes_of_another_support_close_but_leave_a_residual(supports):
    """Energies know nothing of supports: closure is 1 to rounding, only the residual tells."""
    found = energies(clamped(formulation="hex8-full", supports=supports), TRILINEAR)
    np.testing.assert_allclose(found.closure, 1, atol=1e-8)
    bends_sideways = found.residual > RESIDUAL_BOUND
    assert bends_sideways.sum() >= 3  # a side held in uy leaves the bending about y as it is
    assert (found.trusted == ~bends_sideways).all()
    if len(supports) != 2 or supports[1].name == "tip":
        assert bends_sideways.all()


def shuffled():
    order = np.random.default_rng(4).permutation(BAR.n_nodes)
    return TRILINEAR.with_(shapes=ArrayShapes(TRILINEAR.shapes.moved[:, order]))


def mixed():
    """Sums of two modes whose frequencies differ by more than half."""
    moved, other = TRILINEAR.shapes.moved, [2, 2, 1, 1, 1, 0]
    ratio = TRILINEAR.freq_hz[other] / TRILINEAR.freq_hz
    assert (np.maximum(ratio, 1 / ratio) > 1.5).all()
    return TRILINEAR.with_(shapes=ArrayShapes(moved + moved[other]))


@pytest.mark.parametrize("spoil", [shuffled, mixed])
def test_wrong_shapes_that_close_by_accident_leave_a_residual(spoil):
    """The frequency is set to the one at which the wrong shape closes exactly."""
    model = clamped(formulation="hex8-full")
    wrong = spoil()
    found = energies(model, wrong.with_(freq_hz=wrong.freq_hz * energies(model, wrong).closure))
    np.testing.assert_allclose(found.closure, 1, atol=1e-8)
    assert (found.residual > RESIDUAL_BOUND).all()
    assert not found.trusted.any()


def test_right_shapes_at_the_frequencies_of_others():
    reversed_order = TRILINEAR.with_(shapes=ArrayShapes(TRILINEAR.shapes.moved[::-1]))
    found = energies(clamped(formulation="hex8-full"), reversed_order)
    assert not found.trusted.any()


def in_two_halves(stiff, heavy):
    """The outer half with other stiffness and density factors, the whole scaled so that mode 1 closes."""
    outer = np.nonzero(BAR.points[BAR.blocks[0].nodes].mean(axis=1)[:, 0] > 1.0)[0]

    def model(scale):
        return clamped().with_(
            mesh=BAR.with_(cell_groups={"outer": outer}),
            physics=Physics(
                materials={
                    "in": Material("in", 200e9 * scale, 0.3, 8000),
                    "out": Material("out", 200e9 * scale * stiff, 0.3, 8000 * heavy),
                },
                assignments=(Assignment("*", "in", None, "hex8-full"), Assignment("outer", "out", None, "hex8-full")),
                supports=(CLAMP,),
            ),
        )

    scale = float(energies(model(1.0), TRILINEAR, [0]).closure[0]) ** -2
    return model(scale), outer


@pytest.mark.parametrize(("stiff", "heavy"), [(0.2, 1.0), (8.0, 1.0)])
def test_wrong_distribution_of_material_that_closes_leaves_a_residual(stiff, heavy):
    found = energies(in_two_halves(stiff, heavy)[0], TRILINEAR, [0])
    assert found.closure[0] == pytest.approx(1, abs=1e-8)
    assert found.residual[0] > RESIDUAL_BOUND
    assert not found.trusted[0]


def test_residual_sits_where_the_model_is_wrong():
    centres = BAR.points[BAR.blocks[0].nodes].mean(axis=1)[:, 0]
    soft = np.nonzero((centres > 0.5) & (centres < 0.75))[0]
    model = clamped().with_(
        mesh=BAR.with_(cell_groups={"soft": soft}),
        physics=Physics(
            materials={"steel": STEEL, "soft": Material("soft", 20e9, 0.3, 8000)},
            assignments=(Assignment("*", "steel", None, "hex8-full"), Assignment("soft", "soft", None, "hex8-full")),
            supports=(CLAMP,),
        ),
    )
    found = energies(model, TRILINEAR)
    np.testing.assert_allclose(found.residual_cells.sum(axis=1), found.residual, rtol=1e-9)
    slabs = [found.residual_cells[:, (centres // 0.25) == i].sum(axis=1) for i in range(8)]
    assert (np.argmax(slabs, axis=0)[:4] == 2).all()  # of eight equal slabs the soft one holds most


def test_size_of_the_shape_does_not_matter():
    model = clamped()
    small = QUADRATIC.with_(shapes=ArrayShapes(1e-6 * QUADRATIC.shapes.moved))
    np.testing.assert_allclose(energies(model, small).residual, energies(model, QUADRATIC).residual, rtol=1e-6)


def test_iterated_residual_is_a_lower_bound_close_to_the_exact_one(monkeypatch):
    exact = energies(clamped(), QUADRATIC).residual
    monkeypatch.setattr(closure, "FACTOR_LIMIT", 10)
    iterated = energies(clamped(), QUADRATIC).residual
    assert (iterated <= exact * (1 + 1e-9)).all()
    np.testing.assert_allclose(iterated, exact, rtol=0.05)


def test_computed_modes_of_another_design_are_checked_like_imported_ones():
    modes = solve(clamped(), 4)
    found = energies(clamped(Material("soft", 50e9, 0.3, 8000)), modes)
    assert not found.trusted.any()
    assert np.isfinite(found.residual).all()
    assert np.isnan(energies(clamped(), modes).residual).all()

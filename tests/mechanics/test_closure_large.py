"""Residuals of models too large to factorise: products by lean matrices against the assembled ones, the search
against the factorised figure, and what is said where it falls short or is cancelled."""

from __future__ import annotations

import gc
import weakref
from dataclasses import replace

import numpy as np
import pytest
import scipy.sparse as sp

from tests import independent
from tests.mechanics.models import CLAMP, STEEL, design
from tests.mechanics.test_followers import joined, moved
from tests.meshes import box_mesh, plate_mesh
from viewer.errors import Cancelled
from viewer.jobs import Progress
from viewer.mechanics import closure, descent, energy
from viewer.mechanics.assembly import assemble_layout, lay_out
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies
from viewer.mechanics.lean import LeanMatrices, room
from viewer.model.design import LumpedMass, Selector, Spring, Support, Tie
from viewer.model.mesh import CellBlock
from viewer.model.modes import ArrayShapes

END = Selector(group="x1")
PARTS = {
    "masses": (LumpedMass("camera", END, 7.0, np.array([1.1, 0.4, 0.2]), np.eye(3)),),
    "springs": (Spring("foot", END, stiffness=np.array([1e7, 2e7, 3e7, 0, 0, 0])),),
}
TIED = {
    "supports": (Support("root", Selector(group="0x0")),),
    "ties": (Tie("glue", Selector(group="1x0"), Selector(group="0x1")),),
}
HALVES = joined(
    box_mesh("hex8", (4, 3, 2), (0.5, 0.3, 0.2)), moved(box_mesh("hex8", (5, 4, 3), (0.5, 0.3, 0.2)), (0.5, 0, 0))
)


def roof():
    """A row of two bricks, one drawn together to a wedge along an edge: two pairs of its nodes are one each."""
    mesh = box_mesh("hex8", (2, 1, 1), (2.0, 1.0, 1.0))
    nodes = mesh.blocks[0].nodes.copy()
    nodes[0, 7], nodes[0, 4] = nodes[0, 6], nodes[0, 5]
    return mesh.with_(blocks=(CellBlock("hex8", nodes, mesh.blocks[0].ids),))


MODELS = {
    "hex8": design(box_mesh("hex8", (4, 3, 2), (1.0, 0.8, 0.4), 0.2), supports=(CLAMP,), **PARTS),
    "tet10": design(box_mesh("tet10", (2, 2, 1), (1.0, 0.8, 0.4)), supports=(CLAMP,), **PARTS),
    "hex20": design(box_mesh("hex20", (2, 2, 1), (1.0, 0.8, 0.4))),
    "collapsed": design(roof(), formulation="hex8-full"),
    "shell": design(plate_mesh("quad4", (6, 4), (1.0, 0.8)), thickness=0.01, supports=(CLAMP,), **PARTS),
    "tied": design(HALVES, **TIED),
}


@pytest.mark.parametrize("name", MODELS)
def test_lean_matrices_are_the_assembled_ones(name):
    system = assemble_layout(lay_out(MODELS[name]))
    lean = LeanMatrices(lay_out(MODELS[name]))
    columns = np.random.default_rng(1).standard_normal((system.n_dof, 3))
    basis = sp.random_array((system.n_dof, 9), density=0.2, format="csr", rng=np.random.default_rng(2))
    both = zip((system.K, system.M), (lean.stiffness, lean.mass), lean.onto(basis), lean.blocks(), strict=True)
    for matrix, times, onto, blocks in both:
        for ours, theirs in (
            (times(columns), matrix @ columns),
            (onto.toarray(), (basis.T @ matrix @ basis).toarray()),
            (blocks, [matrix[3 * i : 3 * i + 3][:, 3 * i : 3 * i + 3].toarray() for i in range(len(blocks))]),
        ):
            np.testing.assert_allclose(ours, theirs, rtol=0, atol=1e-12 * np.abs(theirs).max())


def test_room_is_that_of_the_arrays():
    for kind, counts in (("hex8", (14, 14, 14)), ("tet10", (8, 8, 8))):
        layout = lay_out(design(box_mesh(kind, counts, (1.0, 1.0, 1.0))))
        held = LeanMatrices(layout)
        arrays = held.n_pairs * 8 * 10
        assert arrays == pytest.approx(room(layout), rel=0.3)


def imported(mesh, changed, **physics):
    """Modes of another design of the mesh: ``changed`` are its arguments."""
    count = 3 if "supports" in physics else 9  # six of a free body are rigid
    return solve(design(mesh, **{**physics, **changed}), count).with_(origin="imported")


def mixed(modes):
    """Sums of two modes each."""
    add = lambda values: None if values is None else values + values[::-1]  # noqa: E731
    return modes.with_(
        shapes=ArrayShapes(modes.shapes.moved + 0.3 * modes.shapes.moved[::-1], add(modes.shapes.turned))
    )


CUBE = box_mesh("hex8", (7, 7, 7), (1.0, 1.0, 1.0), 0.1)
BAR = box_mesh("hex8", (40, 4, 3), (2.0, 0.1, 0.08))
SHEET = plate_mesh("quad4", (12, 9), (1.0, 0.8))
CASES = {
    "cube": (CUBE, {"supports": (CLAMP,), **PARTS}, {"formulation": "hex8-full"}),
    "free cube": (CUBE, {}, {"formulation": "hex8-full"}),
    "bar": (BAR, {"supports": (CLAMP,)}, {"formulation": "hex8-full"}),
    "tied": (HALVES, TIED, {"formulation": "hex8-full"}),
    "sheet": (SHEET, {"supports": (CLAMP,), "thickness": 0.02}, {"masses": PARTS["masses"]}),
}


@pytest.mark.parametrize("name", CASES)
@pytest.mark.parametrize("spoil", [lambda modes: modes, mixed])
def test_search_comes_near_the_factorised_figure_from_below(name, spoil, monkeypatch):
    mesh, physics, changed = CASES[name]
    model, modes = design(mesh, **physics), spoil(imported(mesh, changed, **physics))
    exact = energies(model, modes)
    monkeypatch.setattr(closure, "FACTOR_LIMIT", 10)
    monkeypatch.setattr(descent, "_ZONES", 3)  # of 100 nodes and more, as in large models
    found = energies(model, modes)
    known = np.isfinite(exact.residual)
    assert known.any()
    short = (exact.residual - found.residual)[known]
    assert (short >= -1e-9 * exact.residual[known]).all()
    assert (short <= np.maximum(0.04 * exact.residual[known], 2e-4)).all()
    np.testing.assert_allclose(found.residual_cells, exact.residual_cells, atol=0.05 * np.nanmax(exact.residual))
    assert (found.trusted == exact.trusted).all()


def test_complex_shapes_are_searched_in_both_parts(monkeypatch):
    model = design(BAR, supports=(CLAMP,))
    modes = imported(BAR, {"formulation": "hex8-full"}, supports=(CLAMP,))
    turned = modes.with_(shapes=ArrayShapes(modes.shapes.moved * (1 + 1j) + 0.5j * modes.shapes.moved[::-1]))
    exact = energies(model, turned).residual
    monkeypatch.setattr(closure, "FACTOR_LIMIT", 10)
    np.testing.assert_allclose(energies(model, turned).residual, exact, rtol=0.04)


def test_another_librarys_modes_are_trusted_by_search(monkeypatch):
    """scikit-fem's quadratic elements on the same mesh, and its modes at the frequency of the next."""
    monkeypatch.setattr(closure, "FACTOR_LIMIT", 10)
    modes = independent.modes(BAR, STEEL, 3, degree=2, held="x0")
    assert energies(design(BAR, supports=(CLAMP,)), modes).trusted.all()
    wrong = modes.with_(shapes=ArrayShapes(modes.shapes.moved + modes.shapes.moved[[1, 2, 0]]))
    assert not energies(design(BAR, supports=(CLAMP,)), wrong).trusted.any()


def test_matrices_are_let_go_at_once(monkeypatch):
    """A circle of references would hold gigabytes until the collector runs."""
    monkeypatch.setattr(closure, "FACTOR_LIMIT", 10)
    alive = []
    made = LeanMatrices.__init__

    def noted(self, *args):
        alive.append(weakref.ref(self))
        made(self, *args)

    monkeypatch.setattr(LeanMatrices, "__init__", noted)
    modes = independent.modes(BAR, STEEL, 3, degree=2, held="x0")
    gc.disable()
    try:
        energies(design(BAR, supports=(CLAMP,)), modes)
        assert [held() for held in alive] == [None]
    finally:
        gc.enable()


def test_what_the_search_leaves_open_is_said_and_not_trusted(monkeypatch):
    model = design(BAR, supports=(CLAMP,))
    modes = independent.modes(BAR, STEEL, 3, degree=2, held="x0")
    monkeypatch.setattr(closure, "FACTOR_LIMIT", 10)
    monkeypatch.setattr(descent, "STEPS", 3)
    found = energies(model, modes)
    assert (found.residual > 0).all()
    assert not found.trusted.any()
    assert sum("the residual of mode" in caution for caution in found.cautions) == 3


def test_models_without_room_are_not_judged(monkeypatch):
    model = design(BAR, supports=(CLAMP,))
    modes = independent.modes(BAR, STEEL, 3, degree=2, held="x0")
    exact = energies(model, modes)
    monkeypatch.setattr(closure, "FACTOR_LIMIT", 10)
    monkeypatch.setattr(closure, "MOST_ROOM", 1000)
    found = energies(model, modes)
    np.testing.assert_array_equal(found.strain, exact.strain)
    np.testing.assert_array_equal(found.closure, exact.closure)
    assert np.isnan(found.residual).all()
    assert np.isnan(found.residual_cells).all()
    assert not found.trusted.any()
    assert any("too large to judge modes 1, 2, 3" in caution for caution in found.cautions)
    assert found.to_dict(0)["residual"] is None
    assert "NOT to be trusted" in found.sentence(0)


def cancelled_at(stage):
    """A progress that is cancelled at the second tick of ``stage``."""
    seen: list[str] = []
    return Progress(lambda name, done, total: seen.append(name), lambda: seen.count(stage) >= 2)


def test_search_can_be_cancelled(monkeypatch):
    monkeypatch.setattr(closure, "FACTOR_LIMIT", 10)
    modes = independent.modes(BAR, STEEL, 3, degree=2, held="x0")
    with pytest.raises(Cancelled):
        energies(design(BAR, supports=(CLAMP,)), modes, progress=cancelled_at("residual"))


def test_factorisation_runs_in_a_process_that_can_be_killed(monkeypatch):
    model = design(BAR, supports=(CLAMP,))
    modes = independent.modes(BAR, STEEL, 3, degree=2, held="x0")
    here = energies(model, modes)
    monkeypatch.setattr(closure, "AT_ONCE", 10)
    there = energies(model, modes)
    np.testing.assert_array_equal(there.residual, here.residual)
    np.testing.assert_array_equal(there.residual_cells, here.residual_cells)
    with pytest.raises(Cancelled):
        energies(model, modes, progress=cancelled_at("residual"))


def test_recovery_of_rotations_runs_in_a_process_that_can_be_killed(monkeypatch):
    model = design(SHEET, thickness=0.02, supports=(CLAMP,))
    modes = solve(model, 3)
    bare = replace(modes, shapes=ArrayShapes(modes.shapes.moved), origin="imported")
    here = energies(model, bare)
    monkeypatch.setattr(energy, "AT_ONCE", 10)
    there = energies(model, bare)
    np.testing.assert_array_equal(there.strain, here.strain)
    assert there.cautions == here.cautions
    with pytest.raises(Cancelled):
        energies(model, bare, progress=cancelled_at("recovering rotations"))

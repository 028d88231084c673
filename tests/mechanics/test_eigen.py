"""The eigen-solution against an independent library, its fixed signs and bases, and its own checks."""

from __future__ import annotations

import numpy as np
import pytest

from tests import independent
from tests.mechanics.models import CLAMP, STEEL, design, lone_nodes
from tests.meshes import box_mesh, plate_mesh
from viewer.errors import Cancelled, ModelError, SolveError
from viewer.jobs import Progress
from viewer.mechanics import eigen, factor
from viewer.mechanics.assembly import assemble
from viewer.mechanics.patch import rigid_fields
from viewer.model.design import LumpedMass, Selector, Spring, Support

BAR = box_mesh("hex8", (8, 3, 3), (2.0, 0.3, 0.3))  # square section: bending modes come in equal pairs
SOLVERS = [
    "superlu",
    pytest.param(
        "pardiso", marks=pytest.mark.skipif(factor._mkl() is None, reason="the extra 'fast' is not installed")
    ),
]


@pytest.mark.parametrize("solver", SOLVERS)
@pytest.mark.parametrize("supports", [(), (CLAMP,)])
def test_frequencies_and_shapes_equal_an_independent_library(solver, supports):
    """scikit-fem's matrices of trilinear hexahedra and SciPy's eigsh, on the same mesh."""
    ours = eigen.solve(design(BAR, formulation="hex8-full", supports=supports), 12, solver=solver)
    theirs = independent.modes(BAR, STEEL, 10, held="x0" if supports else None)
    rigid = 0 if supports else 6
    np.testing.assert_allclose(ours.freq_hz[rigid:10], theirs.freq_hz[rigid:], rtol=1e-7)
    # Of repeated frequencies only the span is determined: each of their shapes lies in the span of ours.
    mine, others = (modes.shapes.moved.reshape(modes.count, -1).T for modes in (ours, theirs))
    spanned = mine @ np.linalg.lstsq(mine, others, rcond=None)[0]
    np.testing.assert_allclose(spanned, others, atol=1e-5 * np.abs(others).max())


@pytest.mark.parametrize("solver", SOLVERS)
def test_modes_are_mass_normal_sorted_and_signed(solver):
    system = assemble(design(BAR, supports=(CLAMP,)))
    modes = eigen.solve_system(system, 8, solver=solver)
    shapes = system.gather(modes.shapes.moved)
    np.testing.assert_allclose(shapes @ system.M @ shapes.T, np.eye(8), atol=1e-9)
    stiffness = shapes @ system.K @ shapes.T
    np.testing.assert_allclose(np.sqrt(np.diag(stiffness)) / (2 * np.pi), modes.freq_hz, rtol=1e-9)
    assert (np.diff(modes.freq_hz) >= -1e-9 * modes.freq_hz[1:]).all()
    assert modes.normalisation == "mass"
    assert modes.origin == "computed"
    for shape in shapes:
        largest = np.abs(shape) >= (1 - 1e-6) * np.abs(shape).max()
        assert shape[largest][0] > 0
    assert not modes.shapes.moved[:, BAR.node_groups["x0"]].any()


@pytest.mark.parametrize("solver", SOLVERS)
def test_rigid_body_modes_are_zero_and_in_fixed_order(solver):
    modes = eigen.solve(design(BAR), 9, solver=solver)
    assert (modes.freq_hz[:6] == 0).all()
    assert modes.freq_hz[6] > 1
    centre = BAR.points.mean(axis=0)
    fields = rigid_fields(BAR.points, centre)
    for index in range(6):
        shape = modes.shape(index)
        expected = fields[:, :, index]
        scale = np.vdot(expected, shape) / np.vdot(expected, expected)
        assert abs(scale) > 0
        np.testing.assert_allclose(shape, scale * expected, atol=1e-8 * np.abs(shape).max())


def test_free_shell_has_six_rigid_body_modes():
    modes = eigen.solve(design(plate_mesh("quad4", (8, 6), (1.0, 0.7)), thickness=0.001), 8)
    assert (modes.freq_hz[:6] == 0).all()
    assert (modes.freq_hz[6:] > 1).all()
    assert modes.rotations(6) is not None


@pytest.mark.parametrize("solver", SOLVERS)
def test_same_input_same_bits(solver):
    model = design(BAR)
    first, second = (eigen.solve(model, 9, solver=solver) for _ in range(2))
    assert first.freq_hz.tobytes() == second.freq_hz.tobytes()
    assert first.shapes.moved.tobytes() == second.shapes.moved.tobytes()


@pytest.mark.skipif(factor._mkl() is None, reason="the extra 'fast' is not installed")
@pytest.mark.parametrize("supports", [(), (CLAMP,)])
def test_both_factorisations_give_the_same_shapes_repeated_ones_too(supports):
    first, second = (eigen.solve(design(BAR, supports=supports), 10, solver=s) for s in ("superlu", "pardiso"))
    np.testing.assert_allclose(first.freq_hz, second.freq_hz, rtol=1e-8)
    assert np.diff(first.freq_hz[6:8])[0] < 1e-6 * first.freq_hz[7] or supports
    np.testing.assert_allclose(first.shapes.moved, second.shapes.moved, atol=1e-5 * np.abs(first.shapes.moved).max())


def test_dense_and_lanczos_agree(monkeypatch):
    model = design(BAR, supports=(CLAMP,))
    sparse = eigen.solve(model, 6)
    monkeypatch.setattr(eigen, "_DENSE", 10_000)
    dense = eigen.solve(model, 6)
    np.testing.assert_allclose(sparse.freq_hz, dense.freq_hz, rtol=1e-9)
    np.testing.assert_allclose(sparse.shapes.moved, dense.shapes.moved, atol=1e-6 * np.abs(dense.shapes.moved).max())


def spring_chain(middle_mass):
    """Ground – k – 1 kg – k – middle – k – 1 kg along x, k = 100 N/m."""
    k = [100.0, 0, 0, 0, 0, 0]
    at = [Selector(nodes=[i]) for i in (1, 2, 3)]
    masses = [LumpedMass("a", at[0], 1.0), LumpedMass("c", at[2], 1.0)]
    if middle_mass:
        masses.append(LumpedMass("b", at[1], middle_mass))
    return design(
        lone_nodes(3),
        masses=tuple(masses),
        springs=(Spring("0", at[0], None, k), Spring("1", at[0], at[1], k), Spring("2", at[1], at[2], k)),
        supports=(Support("guide", Selector(nodes=[1, 2, 3]), ("uy", "uz")),),
    )


def test_direction_without_mass_follows_statically():
    """With a massless middle the two springs act as one of 50 N/m: K = [[150, −50], [−50, 50]], M = 1."""
    modes = eigen.solve(spring_chain(0.0), 3)
    expected = np.sqrt(np.linalg.eigvalsh([[150.0, -50], [-50, 50]])) / (2 * np.pi)
    np.testing.assert_allclose(modes.freq_hz, expected, rtol=1e-10)
    shape = modes.shape(0)[:, 0]
    assert shape[1] == pytest.approx(0.5 * (shape[0] + shape[2]))


@pytest.mark.parametrize("solver", SOLVERS)
def test_direction_without_mass_in_a_large_model(solver):
    """A massless node on soft springs in series at the tip of a bar acts like one spring of half the stiffness."""
    mesh = BAR.with_(
        points=np.vstack([BAR.points, [2.5, 0.15, 0.15]]),
        node_ids=np.append(BAR.node_ids, 900),
    )
    tip, stray = Selector(near=[2.0, 0.1, 0.1]), Selector(nodes=[900])
    k = np.array([0, 4e6, 0, 0, 0, 0])
    series = design(
        mesh,
        supports=(CLAMP, Support("guide", stray, ("ux", "uz"))),
        springs=(Spring("near", tip, stray, k), Spring("far", stray, None, k)),
    )
    single = design(BAR, supports=(CLAMP,), springs=(Spring("both", tip, None, k / 2),))
    np.testing.assert_allclose(
        eigen.solve(series, 5, solver=solver).freq_hz, eigen.solve(single, 5, solver=solver).freq_hz, rtol=1e-8
    )


def test_more_modes_asked_than_there_are():
    assert eigen.solve(spring_chain(2.0), 50).count == 3
    mesh = box_mesh("hex8", (1, 1, 1), (1, 1, 1))
    assert eigen.solve(design(mesh), 1000).count == 24
    assert eigen.solve(design(mesh, supports=(CLAMP,)), 1000).count == 12


def test_soft_suspension_is_not_taken_for_a_rigid_body():
    """A body of 1440 kg on 4 springs of 1 N/m in z: √(4/m)/2π = 8.4 mHz, five decades below its bending."""
    corners = np.array([1, 2, 3, 4])
    mesh = box_mesh("hex8", (8, 3, 3), (2.0, 0.3, 0.3))
    ends = mesh.node_ids[
        np.isin(mesh.points[:, 2], [0.0])
        & np.isin(mesh.points[:, 0], [0.0, 2.0])
        & ((mesh.points[:, 1] == 0) | np.isclose(mesh.points[:, 1], 0.3))
    ]
    assert len(ends) == len(corners)
    modes = eigen.solve(design(mesh, springs=(Spring("s", Selector(nodes=ends), None, [0, 0, 1.0, 0, 0, 0]),)), 7)
    bounce = np.sqrt(4 / 1440) / (2 * np.pi)
    assert (modes.freq_hz[:3] == 0).all()  # sliding along x and y, turning about z
    assert np.abs(modes.freq_hz[3:6] / bounce - 1).min() < 1e-3
    assert (modes.freq_hz[3:6] > 0.5 * bounce).all()


def test_a_wrong_shape_or_a_missing_mode_does_not_pass_the_checks():
    system = assemble(design(BAR, supports=(CLAMP,)))
    stiffness, mass = system.restrict(system.K), system.restrict(system.M)
    problem = eigen._Problem(stiffness, mass, eigen._smooth_fields(system)[system.free], "")
    values, vectors = problem.lowest(8, Progress())
    problem.check(values, vectors, Progress())
    spoilt = vectors.copy()
    spoilt[:, 2] += 1e-3 * vectors[:, 6]
    with pytest.raises(SolveError, match="mode 3 did not converge"):
        problem.check(values, spoilt, Progress())
    kept = [0, 1, 3, 4, 5, 6, 7]
    with pytest.raises(SolveError, match="1 modes below the last"):
        problem.check(values[kept], vectors[:, kept], Progress())


@pytest.mark.parametrize("solver", SOLVERS)
def test_inertia_counts_the_eigenvalues_below_the_shift(solver):
    system = assemble(design(BAR))
    modes = eigen.solve_system(system, 12, solver=solver)
    point = (2 * np.pi) ** 2 * 0.5 * (modes.freq_hz[8] ** 2 + modes.freq_hz[10] ** 2)
    below = int((modes.freq_hz < np.sqrt(point) / (2 * np.pi)).sum())
    counted = factor.factorise(eigen._shifted(system.K, system.M, point), definite=False, solver=solver).negative
    assert counted in (below, None)
    assert counted == below or solver == "superlu"


def test_bad_requests():
    with pytest.raises(ModelError, match="positive"):
        eigen.solve(design(BAR), 0)
    with pytest.raises(ModelError, match="every direction"):
        eigen.solve(design(BAR, supports=(Support("all", Selector(box=[[-1] * 3, [9] * 3])),)), 3)
    with pytest.raises(Cancelled):
        eigen.solve(design(BAR), 3, Progress(stop=lambda: True))

"""Missing rotations: our own modes written with translations only come back with the same energies."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.sparse as sp
from scipy.interpolate import CubicSpline

from tests.meshes import plate_mesh
from viewer.mechanics.assembly import lay_out
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies
from viewer.mechanics.recovery import Rotations, examine, recover, rounding
from viewer.mechanics.sums import cell_energies
from viewer.model.design import Assignment, Design, Material, Physics, Selector, Support
from viewer.model.mesh import Mesh

ALUMINIUM = Material("aluminium", 70e9, 0.33, 2700.0)


def channel(kind: str, thickness: float) -> Design:
    """A folded sheet 0.6 m long: web 60 mm, two flanges of 30 mm, clamped at one end."""
    flat = plate_mesh(kind, (16, 12), (0.6, 0.12))
    x, s, _ = flat.points.T
    folded = np.stack([x, np.clip(s - 0.03, 0, 0.06), np.maximum(0.03 - s, 0) + np.maximum(s - 0.09, 0)], axis=1)
    mesh = Mesh(folded, flat.blocks, flat.node_ids, flat.node_groups)
    return Design(
        "channel",
        mesh,
        Physics(
            {"aluminium": ALUMINIUM},
            (Assignment("*", "aluminium", thickness),),
            (Support("root", Selector(group="x0")),),
        ),
    )


def digits(count: int):
    return np.vectorize(lambda value: float(f"{value:.{count - 1}e}"))


WRITTEN = {
    "double": lambda moved: moved,
    "single": lambda moved: moved.astype(np.float32).astype(float),
    "6 digits of mm": lambda moved: digits(6)(moved * 1e3) * 1e-3,
}


@pytest.mark.parametrize("thickness", [2e-3, 3e-4])
@pytest.mark.parametrize("kind", ["quad4", "tri3"])
def test_energies_survive_the_loss_of_rotations(kind: str, thickness: float):
    design = channel(kind, thickness)
    modes = solve(design, 5)
    whole = energies(design, modes).strain
    moved = np.stack([modes.shape(i) for i in range(modes.count)])
    for name, write in WRITTEN.items():
        found = examine(lay_out(design), write(moved))
        wrong = np.abs(cell_energies(lay_out(design), found.vectors, "stiffness") - whole).sum(axis=1)
        bound = 1e-4 if name == "double" else 0.02  # double: only the neglected rotary inertia is missing
        assert (wrong <= bound * whole.sum(axis=1)).all(), name
        assert len(found.lost) == 0
        assert found.cautions == ()


def test_too_few_digits_are_warned_of_with_an_honest_figure():
    design = channel("quad4", 3e-4)
    modes = solve(design, 5)
    whole = energies(design, modes).strain
    moved = digits(3)(np.stack([modes.shape(i) for i in range(modes.count)]))
    found = examine(lay_out(design), moved)
    wrong = np.abs(cell_energies(lay_out(design), found.vectors, "stiffness") - whole).sum(axis=1) / whole.sum(axis=1)
    assert wrong.max() > 0.02
    assert "too few digits" in found.cautions[0]
    assert (found.error > wrong / 5).all()  # the right order, not the very figure
    assert (found.error < 10 * wrong).all()


def test_complex_shapes_and_held_rotations():
    design = channel("quad4", 1e-3)
    layout = lay_out(design)
    moved = np.random.default_rng(1).normal(size=(2, design.mesh.n_nodes, 3))
    both = recover(layout, moved[:1] + 1j * moved[1:])
    np.testing.assert_allclose(both.real, recover(layout, moved[:1]), rtol=0, atol=1e-9 * np.abs(both).max())
    np.testing.assert_allclose(both.imag, recover(layout, moved[1:]), rtol=0, atol=1e-9 * np.abs(both).max())
    held = np.isin(layout.dof[:, 3:], np.nonzero(layout.held)[0])
    assert held.any()
    assert not both[0, layout.dof[:, 3:][held]].any()


def test_rigid_motion_gives_its_own_rotation():
    design = channel("quad4", 1e-3).with_(
        physics=Physics(
            {"aluminium": ALUMINIUM},
            (Assignment("*", "aluminium", 1e-3),),
        )
    )
    spin = np.array([0.3, -0.2, 0.5])
    vector = recover(lay_out(design), np.cross(spin, design.mesh.points)[None])[0]
    turned = lay_out(design).spread(vector)[1]
    np.testing.assert_allclose(turned, np.broadcast_to(spin, turned.shape), rtol=1e-7)


def beam_line(points: np.ndarray) -> tuple[sp.csr_array, np.ndarray]:
    """A chain of Bernoulli beams (unit E, section 12 × 12 units; textbook matrices) and one loose point inertia."""
    n = len(points)
    stiffness = sp.lil_array((6 * n + 6, 6 * n + 6))
    for i in range(n - 1):
        edge = points[i + 1] - points[i]
        length = np.linalg.norm(edge)
        first = edge / length
        second = np.cross([0.1, 0.2, 0.97], first)
        second /= np.linalg.norm(second)
        turn = np.kron(np.eye(4), np.stack([first, second, np.cross(first, second)]))
        local = np.zeros((12, 12))
        for pair, value in (((0, 6), 144.0 / length), ((3, 9), 2000.0 / length)):
            local[np.ix_(pair, pair)] = value * np.array([[1, -1], [-1, 1]])
        bend = (
            1728.0
            / length**3
            * np.array(
                [
                    [12, 6 * length, -12, 6 * length],
                    [6 * length, 4 * length**2, -6 * length, 2 * length**2],
                    [-12, -6 * length, 12, -6 * length],
                    [6 * length, 2 * length**2, -6 * length, 4 * length**2],
                ]
            )
        )
        for where, sign in (((1, 5, 7, 11), 1.0), ((2, 4, 8, 10), -1.0)):
            flip = np.diag([1, sign, 1, sign])
            local[np.ix_(where, where)] += flip @ bend @ flip
        place = slice(6 * i, 6 * i + 12)
        stiffness[place, place] += turn.T @ local @ turn
    return stiffness.tocsr(), np.arange(6 * n + 6).reshape(-1, 6)


def test_torsion_of_a_straight_beam_and_a_point_inertia_are_named():
    line = np.outer(np.linspace(0, 3, 7), [0.6, 0.64, 0.48])
    stiffness, dof = beam_line(line)
    operator = Rotations(stiffness, dof, np.zeros(stiffness.shape[0], bool))
    assert operator.lost.tolist() == list(range(8))  # seven beam nodes and the inertia
    bent = np.vstack([line, [[2.0, 3.0, 0.0], [2.0, 4.0, 1.5]]])
    stiffness, dof = beam_line(bent)
    operator = Rotations(stiffness, dof, np.zeros(stiffness.shape[0], bool))
    # torsion of the straight part now turns about the bend, where the next member's bending would show it;
    # only the spin of the last member's end about its own axis would not, and that goes through to the bend too
    assert operator.lost.tolist() == [len(bent)]
    clamped = np.zeros(stiffness.shape[0], bool)
    clamped[dof[0]] = True
    assert Rotations(stiffness, dof, clamped).lost.tolist() == [len(bent)]


def test_bending_of_a_straight_beam_is_recovered_beside_its_lost_torsion():
    """Least bending energy through given deflections is the natural cubic spline: SciPy's is the reference."""
    line = np.outer(np.linspace(0, 3, 7), [1.0, 0, 0])
    stiffness, dof = beam_line(line)
    x = line[:, 0]
    spline = CubicSpline(x, np.sin(x), bc_type="natural")
    moved = np.zeros((1, 8, 3))
    moved[0, :7, 2] = np.sin(x)
    vector = Rotations(stiffness, dof, np.zeros(stiffness.shape[0], bool)).complete(moved)[0]
    np.testing.assert_allclose(vector[dof[:7, 4]], -spline(x, 1), rtol=1e-9)
    ends = spline(x, 2)
    energy = 1728 / 6 * 0.5 * (ends[:-1] ** 2 + ends[:-1] * ends[1:] + ends[1:] ** 2).sum()
    assert 0.5 * vector @ (stiffness @ vector) == pytest.approx(energy, rel=1e-9)


@pytest.mark.parametrize(
    ("write", "step"),
    [
        (lambda v: digits(6)(v), lambda v: 0.5 * 10.0 ** (np.floor(np.log10(np.abs(v))) - 5)),
        (lambda v: np.round(v, 6), lambda v: np.full_like(v, 0.5e-6)),
        (lambda v: np.round(v, 4) * 1e-3, lambda v: np.full_like(v, 0.5e-7)),
        (lambda v: v.astype(np.float32).astype(float), lambda v: 0.5 * np.spacing(np.abs(v).astype(np.float32))),
        (lambda v: v, lambda v: 0.5 * np.spacing(np.abs(v))),
    ],
    ids=["6 digits", "6 decimals", "4 decimals of mm", "single", "double"],
)
def test_rounding_is_read_from_the_digits(write, step):
    values = write(np.random.default_rng(2).normal(size=500))
    np.testing.assert_allclose(rounding(values), step(values), rtol=1e-6)

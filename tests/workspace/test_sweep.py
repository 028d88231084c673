"""Sweeps: crossings and veerings of plates against closed forms, names that follow, and going on after a stop."""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest

from tests.checks.reference import row
from tests.mechanics.models import design
from tests.meshes import plate_mesh
from viewer.errors import Cancelled, ModelError
from viewer.jobs import Progress
from viewer.mechanics.eigen import solve
from viewer.model.design import LumpedMass, Selector, Spring, Support
from viewer.model.variation import Variation
from viewer.workspace import Workspace
from viewer.workspace.store import Cache
from viewer.workspace.sweep import sweep

EDGES = ("x0", "x1", "y0", "y1")


def plate(n: int, held: tuple[str, ...], simply: bool):
    """A square plate of side 1 m, thin, bending only."""
    mesh = plate_mesh("quad4", (n, n), (1.0, 1.0))
    flat = Support("flat", Selector(nodes=mesh.node_ids), ("ux", "uy", "rz"))
    along = {"x": ("uz", "rx"), "y": ("uz", "ry")}  # hard support: no rotation in the plane of the edge
    edges = (Support(e, Selector(group=e), along[e[0]] if simply else held) for e in EDGES)
    return design(mesh, thickness=0.001, supports=(flat, *edges))


def swept(model, variation, values, count, **options):
    with ThreadPoolExecutor(1) as executor:
        return sweep(Workspace(cache=None), model, variation, values, count, executor=executor, **options)


def test_the_crossing_of_a_simply_supported_plate():
    """Row V04: modes (3,1) and (1,2) of a plate a × b cross at a/b = √(8/3)."""
    expected = np.sqrt(8 / 3)
    assert "1.6329932" in row("V04").inputs
    found = swept(plate(32, (), simply=True), Variation("scale", "x"), np.linspace(1.56, 1.71, 4), 6)
    crossings = [e for e in found.lineage.encounters if e.kind == "crossing"]
    (crossing,) = [e for e in crossings if abs(e.at - expected) < 0.1]
    # the element's own error moves the place where two frequencies meet: 0.5 % is the stated tolerance
    assert crossing.at == pytest.approx(expected, rel=0.005)
    assert not [e for e in found.lineage.encounters if e.kind == "unresolved"]


def test_the_veering_of_a_clamped_plate_is_unresolved_by_coarse_steps_and_found_by_finer_ones():
    """Modes 5 and 6 of the clamped plate through a/b = 1: (3,1) and (1,3) are coupled (Leissa, NASA SP-160)."""
    model = plate(16, ("uz", "rx", "ry"), simply=False)
    coarse = swept(model, Variation("scale", "x"), np.linspace(0.93, 1.08, 4), 6)
    (passage,) = [e for e in coarse.lineage.encounters if {e.first, e.second} == {5, 6}]
    assert passage.kind == "unresolved"
    assert passage.step is not None and passage.step < 0.01
    fine = swept(model, Variation("scale", "x"), np.linspace(0.93, 1.08, 4), 6, insert=True)
    (passage,) = [e for e in fine.lineage.encounters if {e.first, e.second} == {5, 6}]
    assert passage.kind == "veering"
    assert passage.at == pytest.approx(1.0, abs=0.003)
    square = solve(model, 6).freq_hz
    assert passage.gap_hz == pytest.approx(square[5] - square[4], rel=0.05)


def test_a_step_right_on_the_square_plate():
    """Simply supported, modes (2,1) and (1,2) are equal there and come out in any mixture, yet cross; clamped, 5
    and 6 are coupled: the mixed shapes at that step tell a veering."""
    values = np.linspace(0.9, 1.1, 5)
    free_to_turn = swept(plate(12, (), simply=True), Variation("scale", "x"), values, 4)
    (passage,) = [e for e in free_to_turn.lineage.encounters if {e.first, e.second} == {2, 3}]
    assert (passage.kind, passage.gap_hz) == ("crossing", 0)
    assert passage.at == pytest.approx(1)
    clamped = swept(plate(12, ("uz", "rx", "ry"), simply=False), Variation("scale", "x"), values, 6)
    kinds = {(e.first, e.second): e.kind for e in clamped.lineage.encounters}
    assert kinds == {(2, 3): "crossing", (5, 6): "veering"}


def test_rigid_motions_and_equal_frequencies_meet_nobody():
    free = design(plate_mesh("quad4", (8, 8), (0.3, 0.3)), thickness=0.003)
    found = swept(free, Variation("thickness", "*"), (0.002, 0.003, 0.004), 11)
    assert not found.lineage.encounters
    assert all(all(line.modes) for line in found.lineage.lines)


def sprung():
    mesh = plate_mesh("quad4", (6, 3), (0.3, 0.1))
    return design(
        mesh,
        thickness=0.002,
        supports=(Support("root", Selector(group="x0")),),
        masses=(LumpedMass("head", Selector(group="x1"), 0.2),),
        springs=(Spring("stay", Selector(group="x1"), stiffness=np.array([0, 0, 500.0, 0, 0, 0])),),
    )


@pytest.mark.parametrize(
    ("variation", "values", "power"),
    [
        (Variation("youngs_modulus", "steel"), (100e9, 400e9), None),
        (Variation("density", "steel"), (4000.0, 16000.0), None),
        (Variation("thickness", "*"), (0.001, 0.004), None),
        (Variation("mass", "head"), (0.1, 0.4), None),
        (Variation("spring", "stay"), (0.5, 2.0), None),
    ],
)
def test_what_can_be_swept_moves_the_first_frequency_the_right_way(variation, values, power):
    found = swept(sprung(), variation, values, 2)
    first = found.lineage.lines[0].freq_hz
    assert (first[1] > first[0]) == (variation.what not in ("density", "mass"))


@pytest.mark.parametrize(
    "variation", [Variation("mass", "tail"), Variation("thickness", "lid"), Variation("scale", "w")]
)
def test_what_is_not_there_cannot_be_swept(variation):
    with pytest.raises(ModelError, match="to sweep"):
        variation.apply(sprung(), 1.0)


def test_names_follow_their_modes():
    model = sprung().with_(mode_names={1: "nods", 2: "twists"})
    found = swept(model, Variation("thickness", "*"), (0.002, 0.0021), 3)
    names = {line.modes[1]: line.name for line in found.lineage.lines if line.name}
    assert names == {1: "nods", 2: "twists"}


def test_a_stopped_sweep_goes_on_where_it_was(tmp_path, monkeypatch):
    values, solved = (0.001, 0.002, 0.003, 0.004), []

    def counting(design_, count):
        solved.append(design_)
        return solve(design_, count)

    monkeypatch.setattr("viewer.workspace.sweep.solve", counting)
    stop = Progress(stop=lambda: len(solved) >= 2)
    with ThreadPoolExecutor(1) as executor, pytest.raises(Cancelled):
        sweep(
            Workspace(Cache(tmp_path)),
            sprung(),
            Variation("thickness", "*"),
            values,
            2,
            executor=executor,
            progress=stop,
        )
    before = len(solved)
    kept = len(list(tmp_path.rglob("*.npz")))
    assert 1 <= kept <= before < len(values)
    with ThreadPoolExecutor(1) as executor:
        found = sweep(Workspace(Cache(tmp_path)), sprung(), Variation("thickness", "*"), values, 2, executor=executor)
    assert len(solved) - before == len(values) - kept
    assert len(found.modes) == 4

"""Strut trial: the secular equation, footprints, forbidden boxes, predictions against new solutions."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
import scipy.linalg as sl
import scipy.sparse as sp
import scipy.sparse.linalg as spla

from tests.checks.reference import row
from tests.integration.models import kept
from tests.mechanics.models import CLAMP, design
from tests.meshes import box_mesh, line_mesh, plate_mesh
from tests.sentences import unfounded
from viewer.errors import InputError, ModelError, RefusedError
from viewer.insight.facing_points import candidate_pairs
from viewer.insight.secular import raised
from viewer.insight.strut import strut_trial
from viewer.insight.strut_finding import sentence_of
from viewer.mechanics.assembly import assemble
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies
from viewer.mechanics.factor import factorise
from viewer.model.design import Clearance, Physics, Selector, Strut, Support
from viewer.model.matrices import GivenMatrices, SymmetricMatrix
from viewer.model.mesh import Mesh
from viewer.workspace import Workspace

SAMPLES = Path(__file__).parents[2] / "sample_meshes"


def prongs(kind: str = "hex20") -> Mesh:
    """A small fork along x in one plane: two prongs 20 mm wide, 60 mm apart, on a yoke."""
    mesh = box_mesh(kind, (12, 5, 1), (0.3, 0.1, 0.02))
    return kept(mesh, lambda x, y, z: (x < 0.05) | (np.abs(y - 0.05) > 0.03))


SPREAD = 4  # number of the mode in which the prongs move apart


def with_struts(model, *struts):
    return model.with_(physics=replace(model.physics, struts=struts))


def by_motion(before, after, index: int, mass) -> tuple[int, float]:
    """Index of the mode of ``after`` that is most like mode ``index`` of ``before``, and the share (φᵀMψ)²."""
    force = mass @ before.shape(index).ravel()
    shares = np.array([(after.shape(i).ravel() @ force) ** 2 for i in range(after.count)])
    return int(shares.argmax()), float(shares.max())


def _spreads(mesh: Mesh, shape) -> float:
    """How far the prongs' ends move apart, against the largest motion."""
    end = mesh.points[:, 0] > 0.29
    low, high = shape[end & (mesh.points[:, 1] < 0.03)], shape[end & (mesh.points[:, 1] > 0.07)]
    return float(abs(high[:, 1].mean() - low[:, 1].mean()) / np.abs(shape).max())


# --- the secular equation ---


def test_reference_row_of_a_spring_more():
    poles, vectors = np.linalg.eigh([[2.0, -1.0], [-1.0, 2.0]])
    found = raised(poles, vectors[0], np.array([1.0]))
    np.testing.assert_allclose(found.roots[0], row("S06").values[-2:], rtol=row("S06").tolerances[0])


def test_roots_fulfil_the_equation_and_keep_their_places_between_the_poles():
    random = np.random.default_rng(3)
    poles = np.sort(random.random((40, 6)), axis=1) * 10
    stretch, stiffness = random.normal(size=(40, 6)), 10 ** random.uniform(-2, 2, 40)
    found = raised(poles, stretch, stiffness)
    gaps = poles[:, :, None] - found.roots[:, None, :]
    terms = stiffness[:, None, None] * stretch[:, :, None] ** 2 / gaps
    np.testing.assert_allclose(1 + terms.sum(axis=1), 0, atol=1e-7 * np.abs(terms).max())
    assert (found.roots >= poles - 1e-12).all() and (found.roots[:, :-1] <= poles[:, 1:] + 1e-12).all()
    np.testing.assert_allclose(found.shares.sum(axis=(1,)), 1, rtol=1e-12)


def test_a_rigid_spring_is_a_constraint():
    poles, stretch = np.array([1.0, 4.0, 9.0, 30.0]), np.array([[1.0, -2.0, 0.5, 1.0]])
    found = raised(poles, stretch, np.array([np.inf]))
    allowed = sl.null_space(stretch)
    np.testing.assert_allclose(
        found.roots[0, :3], np.linalg.eigvalsh(allowed.T @ np.diag(poles) @ allowed), rtol=1e-4
    )
    assert found.roots[0, 3] == np.inf and not found.shares[0, :, 3].any()


def test_modes_the_spring_does_not_stretch_stay_and_repeated_ones_part():
    found = raised(np.array([1.0, 1.0, 5.0]), np.array([[0.6, 0.8, 0.0]]), np.array([2.0]))
    np.testing.assert_allclose(found.roots[0], [1.0, 3.0, 5.0], rtol=1e-12)


# --- struts in a model ---


@pytest.fixture(scope="module")
def held():
    mesh = prongs()
    model = design(mesh, supports=(Support("stem", Selector(group="x0"), ("ux", "uy", "uz")),))
    return model, solve(model, 12)


def test_a_strut_is_a_matrix_of_rank_one_between_the_means_of_its_footprints():
    model = design(prongs("hex8"), supports=(Support("stem", Selector(group="x0"), ("ux", "uy", "uz")),))
    points = model.mesh.points
    near = lambda place: model.mesh.node_ids[np.linalg.norm(points - place, axis=1) < 0.022]  # noqa: E731
    first, other = near([0.3, 0.02, 0.01]), near([0.25, 0.08, 0.01])
    strut = Strut("trial", Selector(nodes=first), Selector(nodes=other), 3e6, 0.05)
    plain, system = assemble(model), assemble(with_struts(model, strut))
    rows = [model.mesh.node_rows(ids) for ids in (first, other)]
    line = points[rows[1]].mean(axis=0) - points[rows[0]].mean(axis=0)
    reach = np.zeros((model.mesh.n_nodes, 3))
    reach[rows[1]] += line / np.linalg.norm(line) / len(rows[1])
    reach[rows[0]] -= line / np.linalg.norm(line) / len(rows[0])
    whole = plain.K.toarray() + 3e6 * np.outer(reach.ravel(), reach.ravel())
    np.testing.assert_allclose(system.K.toarray(), whole, atol=1e-6 * np.abs(whole).max())
    assert system.M.sum() - plain.M.sum() == pytest.approx(3 * 0.05, rel=1e-9)
    free, modes = system.free, solve(with_struts(model, strut), 4)
    wanted = sl.eigh(whole[np.ix_(free, free)], system.M.toarray()[np.ix_(free, free)], subset_by_index=[0, 3])[0]
    np.testing.assert_allclose((2 * np.pi * modes.freq_hz) ** 2, wanted, rtol=1e-7)
    found = energies(with_struts(model, strut), modes)
    np.testing.assert_allclose(found.closure, 1, rtol=1e-8)
    assert found.spring_names == ("trial",) and found.springs.max() > 0.01 * found.total_strain.max()


def test_a_strut_strains_in_no_rigid_motion():
    model = design(prongs("hex8"))
    strut = Strut("trial", Selector(box=[[0.2, 0, 0], [0.3, 0.01, 0.02]]), Selector(near=[0.1, 0.1, 0.02]), 1e9)
    assert (solve(with_struts(model, strut), 7).freq_hz[:6] == 0).all()
    assert any("single node" in words for words in assemble(with_struts(model, strut)).cautions)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"stiffness": 0.0}, "no usable stiffness"),
        ({"mass": -1.0}, "no usable mass"),
        ({"other": Selector(group="x0")}, "no length"),
    ],
)
def test_impossible_struts(held, change, words):
    strut = Strut("brace", Selector(group="x0"), Selector(group="x1"), 1e6)
    with pytest.raises(ModelError, match=f"strut 'brace'.*{words}"):
        assemble(with_struts(held[0], replace(strut, **change)))


# --- where struts may stand ---


def test_footprints_are_patches_of_one_side_and_pairs_face_each_other():
    mesh = prongs()
    found = candidate_pairs(mesh)
    inner = [i for i, each in enumerate(found.footprints) if np.allclose(np.abs(each.normal), [0, 1, 0])]
    assert len(found.pairs) > 10 and found.facing.all()
    for each in found.footprints:
        assert len(each.nodes) >= 3
        gap = mesh.points[each.nodes] - each.centre
        assert np.abs(gap @ each.normal).max() < 1e-12  # flat sides, so no footprint goes round an edge
    first, second = found.pairs.T
    assert set(first) | set(second) <= set(range(len(found.footprints)))
    straight = [i in inner and j in inner for i, j in found.pairs]
    assert any(straight)
    middles = np.array([found.footprints[i].centre for i in first]) + 0.5 * found.lines
    inside = (np.abs(middles[:, 1] - 0.05) < 0.03) & (middles[:, 0] > 0.04)
    assert inside.all()  # every strut stands between the prongs


def test_the_part_itself_and_forbidden_boxes_are_in_the_way():
    mesh = prongs()
    box = Clearance("belt", [[0.15, 0.04, -1.0], [1.0, 0.06, 1.0]])
    whole, barred = candidate_pairs(mesh), candidate_pairs(mesh, clearances=[box])
    crossing_box = whole.left_out["passes a forbidden volume"], barred.left_out["passes a forbidden volume"]
    assert crossing_box[0] == 0 and crossing_box[1] > 0
    assert len(whole.pairs) == len(barred.pairs) + crossing_box[1] - (
        whole.left_out["crosses the part"] - barred.left_out["crosses the part"]
    )
    starts = np.array([barred.footprints[i].centre for i in barred.pairs[:, 0]])
    share = (0.05 - starts[:, 1]) / barred.lines[:, 1]
    assert (starts[:, 0] + share * barred.lines[:, 0] < 0.15).all()
    comb = kept(
        box_mesh("hex8", (12, 9, 1), (0.3, 0.18, 0.02)),
        lambda x, y, z: (x < 0.05) | (np.abs(y - 0.09) < 0.01) | (np.abs(y - 0.09) > 0.07),
    )
    found = candidate_pairs(comb)
    assert found.left_out["crosses the part"] > 0
    ends = np.array([[found.footprints[i].centre[1] for i in pair] for pair in found.pairs])
    assert ((ends < 0.09).all(axis=1) | (ends > 0.09).all(axis=1)).all()  # none passes the middle prong


def test_sheets_face_on_either_side_and_beams_have_no_sides():
    sheet = plate_mesh("quad4", (8, 6), (0.4, 0.3))
    folded = sheet.points[:, [0, 1, 2]].copy()
    up = folded[:, 0] > 0.2
    folded[up] = np.stack([np.full(up.sum(), 0.2), folded[up, 1], folded[up, 0] - 0.2], axis=1)
    found = candidate_pairs(sheet.with_(points=folded))
    assert found.facing.any()
    assert not len(candidate_pairs(sheet).pairs)  # a flat sheet is in no place across from itself
    frame = line_mesh([[0, 0, 0.5 * i] for i in range(5)] + [[1, 0, 0.5 * i] for i in range(4, -1, -1)])
    pairs = candidate_pairs(frame)
    assert len(pairs.pairs) and not pairs.facing.any()
    assert (np.abs(pairs.lines[:, 0]) > 0.1).all()  # none along a post


# --- trials ---


@pytest.fixture(scope="module")
def trial(held):
    model, modes = held
    return strut_trial(model, modes, SPREAD, top=3, resolve=2)


def test_predictions_are_those_of_a_new_solution(trial):
    assert len(trial.struts) == 3 and all(each.facing for each in trial.struts)
    for strut in trial.struts[:2]:
        assert strut.resolved is not None and strut.resolved.number == strut.predicted.number
        assert strut.predicted.freq_hz == pytest.approx(strut.resolved.freq_hz, rel=2e-3)
        assert strut.predicted.share == pytest.approx(strut.resolved.share, abs=0.02)
    assert trial.struts[0].resolved.freq_hz > 2 * trial.freq_hz


def test_the_design_with_the_strut_has_the_re_solved_frequency(held, trial):
    model, modes = held
    best = trial.struts[0]
    after = solve(with_struts(model, best.strut("trial", model.mesh)), best.resolved.number + 2)
    index, share = by_motion(modes, after, SPREAD - 1, assemble(model).M)
    assert (index + 1, share) == (best.resolved.number, pytest.approx(best.resolved.share, abs=1e-4))
    assert after.freq_hz[index] == pytest.approx(best.resolved.freq_hz, rel=1e-7)


@pytest.mark.parametrize("stiffness", [1e5, 1e6, 1e7])
def test_modes_left_out_give_way_as_the_residual_says(held, stiffness):
    """Few modes with residual flexibility against a new solution; without it the error is several times larger."""
    model, _ = held
    few = solve(model, 6).with_(origin="imported")  # so that no more of them are solved
    found = strut_trial(model, few, SPREAD, stiffness=stiffness, top=3, resolve=3)
    assert found.model_freq_hz == pytest.approx(found.freq_hz, rel=1e-9)
    for strut in found.struts:
        assert strut.resolved.freq_hz > 1.05 * found.freq_hz
        wrong = abs(strut.predicted.freq_hz / strut.resolved.freq_hz - 1)
        assert wrong < 0.01
        assert wrong < 0.2 * abs(strut.bound.freq_hz / strut.resolved.freq_hz - 1)


def test_a_free_body_is_relieved_by_its_inertia():
    model = design(prongs())
    modes = solve(model, 9)
    assert (modes.freq_hz[:6] == 0).all()
    spread = 7 + int(np.argmax([_spreads(model.mesh, modes.shape(i)) for i in range(6, 9)]))
    found = strut_trial(model, modes, spread, stiffness=2e5, top=3, resolve=3)
    for strut in found.struts:
        assert strut.predicted.freq_hz == pytest.approx(strut.resolved.freq_hz, rel=0.01)
    assert found.struts[0].resolved.freq_hz > 1.1 * found.freq_hz
    with pytest.raises(RefusedError, match="rigid-body mode"):
        strut_trial(model, modes, 2)


def test_without_a_model_the_answer_is_an_upper_bound(held):
    model, modes = held
    given = modes.with_(origin="imported")
    bare = model.with_(physics=Physics())
    bound, full = (strut_trial(each, given, SPREAD, stiffness=1e5, top=3, resolve=1) for each in (bare, model))
    assert not bound.residual and "at most" in bound.sentence and bound.struts[0].resolved is None
    assert bound.struts[0].predicted.freq_hz >= full.struts[0].resolved.freq_hz * (1 - 1e-9)
    rigid = strut_trial(bare, given, SPREAD, top=1)
    assert "a rigid strut" in rigid.sentence and rigid.to_dict()["struts"][0]["stiffness_n_per_m"] is None
    with pytest.raises(RefusedError, match="size of its mode shapes is not known"):
        strut_trial(bare, given.with_(normalisation="unknown"), 1)


def test_given_matrices_are_tried_with_the_stiffness_stated_or_a_rigid_strut(held):
    model, modes = held
    system = assemble(model)
    parts = (SymmetricMatrix(each.data, each.indices, each.indptr) for each in (system.K, system.M))
    given = model.with_(physics=Physics(supports=model.physics.supports, matrices=GivenMatrices(*parts, system.dof)))
    ours, theirs = (strut_trial(each, modes, SPREAD, stiffness=2e5, top=1, resolve=1) for each in (model, given))
    assert theirs.struts[0].resolved.freq_hz == pytest.approx(ours.struts[0].resolved.freq_hz, rel=1e-9)
    rigid = strut_trial(given, modes, SPREAD, top=1, resolve=1).struts[0]
    assert rigid.stiffness == np.inf
    assert rigid.resolved.freq_hz == pytest.approx(rigid.predicted.freq_hz, rel=5e-3)
    assert rigid.predicted == rigid.rigid


def test_shapes_of_any_size_and_complex_ones_give_the_same(held):
    model, modes = held
    scaled = modes.with_(
        shapes=type(modes.shapes)(-3.7j * modes.shapes.moved), normalisation="unknown", origin="imported"
    )
    ours, theirs = (strut_trial(model, each, SPREAD, stiffness=1e5, top=2, resolve=0) for each in (modes, scaled))
    for one, other in zip(ours.struts, theirs.struts, strict=True):
        assert one.predicted.freq_hz == pytest.approx(other.predicted.freq_hz, rel=1e-8)
    assert any("complex" in words for words in theirs.cautions)


def test_sheets_are_stiffened_across_a_corner():
    sheet = plate_mesh("quad4", (8, 6), (0.4, 0.3))
    points = sheet.points.copy()
    up = points[:, 0] > 0.2
    points[up] = np.stack([np.full(up.sum(), 0.2), points[up, 1], points[up, 0] - 0.2], axis=1)
    model = design(sheet.with_(points=points), thickness=0.002, supports=(CLAMP,))
    modes = solve(model, 6)
    found = strut_trial(model, modes, 1, top=3, resolve=1)
    assert found.struts[0].resolved.freq_hz > 1.1 * found.freq_hz
    assert found.struts[0].predicted.freq_hz == pytest.approx(found.struts[0].resolved.freq_hz, rel=0.01)


@pytest.mark.parametrize(
    ("number", "options", "error", "words"),
    [
        (99, {}, InputError, "no mode 99"),
        (1, {"stiffness": -1.0}, InputError, "positive stiffness"),
        (1, {"top": 0}, InputError, "must be positive"),
    ],
)
def test_impossible_questions(held, number, options, error, words):
    with pytest.raises(error, match=words):
        strut_trial(*held, number, **options)


# --- sentences ---


def test_every_number_of_the_sentence_is_a_figure(held, trial):
    model, modes = held
    lone = strut_trial(model, modes, 1, clearances=[Clearance("all", [[-1, -1, -1], [1, 1, 1]])])
    assert not lone.struts and "no two places" in lone.sentence
    softest = strut_trial(model, modes, SPREAD, stiffness=1.0, top=1, resolve=0)
    assert "no strut within the part raises it noticeably" in softest.sentence
    for finding in (trial, lone, softest):
        assert finding.sentence.startswith(f"Mode {finding.mode}: ")
        assert not unfounded(finding.sentence, finding.to_dict())


def test_the_sentence_tells_what_became_of_the_mode(trial):
    facts = trial.to_dict()
    assert "An estimate: joints are softer than this." in sentence_of(facts)
    best = facts["struts"][0]["resolved"]
    best |= {"mode": 6, "share": 0.9, "mixed": False}
    assert "It is then mode 6." in sentence_of(facts)
    assert "is the lowest" in sentence_of(facts | {"mode": 1})
    best |= {"share": 0.6, "rest": {"mode": 2, "frequency_hz": 321.0, "share": 0.3}}
    assert "holds 60% of its former motion, another mode 30%, at 321.0 Hz" in sentence_of(facts)
    best |= {"share": 0.4, "mixed": True}
    assert "No single mode carries its motion on" in sentence_of(facts)


# --- the sample fork ---


def solved_with(stiff, mass, factor, shift: float, b, stiffness: float, motion, count: int) -> tuple[float, float]:
    """Frequency of the mode of K + k b bᵀ most like ``motion``, and its share: Lanczos with the inverse by Sherman
    and Morrison's formula from one factorisation of K + shift M."""
    size, y = len(b), factor.solve(b)
    less = stiffness / (1 + stiffness * (b @ y))
    whole = spla.LinearOperator((size, size), lambda x: stiff @ x + stiffness * b * (b @ x.ravel()), dtype=float)

    def inverse(x):
        z = factor.solve(np.ravel(x))
        return z - less * y * (b @ z)

    values, vectors = spla.eigsh(
        whole,
        count,
        mass,
        sigma=-shift,
        OPinv=spla.LinearOperator((size, size), inverse, dtype=float),
        v0=y,
        tol=1e-9,
    )
    shares = (vectors.T @ (mass @ motion)) ** 2
    return float(np.sqrt(values[shares.argmax()]) / (2 * np.pi)), float(shares.max())


def test_the_best_strut_of_the_fork_is_the_best_of_all_when_each_is_solved():
    """Spreading mode of the sample: the candidates, ends spread over footprints, are all solved again."""
    opened = Workspace(cache=None).open(SAMPLES / "fork")
    model, modes = opened["baseline"], opened.modes("baseline")
    everything = candidate_pairs(model.mesh, count=40)
    chosen = everything.only(np.linspace(0, len(everything.pairs) - 1, 8).astype(int))
    stiffness, index = 3e4, 2
    found = strut_trial(model, modes, index + 1, stiffness=stiffness, candidates=chosen, top=8, resolve=1)
    system = assemble(model)
    stiff, mass, shift = system.restrict(system.K), system.restrict(system.M), 0.5 * modes.omega(0) ** 2
    factor = factorise(sp.csr_array(stiff + shift * mass), definite=True, solver="superlu")
    motion = system.gather(modes.shape(index))[system.free]
    solved = {}
    for (i, j), line in zip(chosen.pairs, chosen.lines, strict=True):
        ends = chosen.footprints[i].nodes, chosen.footprints[j].nodes
        reach = np.zeros((model.mesh.n_nodes, 3))
        reach[ends[1]] += line / np.linalg.norm(line) / len(ends[1])
        reach[ends[0]] -= line / np.linalg.norm(line) / len(ends[0])
        b = system.gather(reach)[system.free]
        solved[ends[0].tobytes() + ends[1].tobytes()] = solved_with(
            stiff, mass, factor, shift, b, stiffness, motion, 5
        )
    whole = {key: freq for key, (freq, share) in solved.items() if share >= 0.5}
    best = found.struts[0].resolved
    assert best.freq_hz > 0.99 * max(whole.values()) > 1.1 * min(whole.values())
    for strut in found.struts:
        again = whole[strut.first.nodes.tobytes() + strut.other.nodes.tobytes()]
        if strut.resolved is not None:
            assert strut.resolved.freq_hz == pytest.approx(again, rel=1e-6)
        if again < 1.3 * found.freq_hz:
            assert strut.predicted.freq_hz == pytest.approx(again, rel=0.05)

"""Strut trial: where a link between two places of the part would raise a mode most, and how far.

Prediction: the secular equation (``secular.py``) over the known modes, with what the modes left out still give way
(``truncation.py``): all pairs are ranked with that flexibility as a static one, in series with the strut; the best
are predicted again with the unknown modes as one mode more. Where a prediction lies near or above the known modes,
more of them are solved first. Without a model there is no such flexibility; the known modes alone are too stiff, and
their answer is called an upper bound. The best few are solved again, with the strut in the design's own matrices, and
the mode is found among the new ones by MAC weighted with mass.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from viewer.errors import InputError, ModelError, RefusedError
from viewer.insight.facing_points import Candidates, candidate_pairs
from viewer.insight.secular import Raised, raised
from viewer.insight.strut_finding import MIXED, Followed, StrutTrial, TrialStrut
from viewer.insight.truncation import Truncation
from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import System, assemble, with_strut
from viewer.mechanics.eigen import solve_system
from viewer.mechanics.energy import shape_vectors
from viewer.mechanics.given_matrices import given_system
from viewer.mechanics.relative import states_no_material
from viewer.mechanics.sums import cell_volumes
from viewer.model.arrays import Array
from viewer.model.design import Clearance, Design, Material
from viewer.model.modes import ModeSet

ROD = 0.01  # diameter of the rod that is tried, in diagonals of the part
RESOLVED = 3  # struts solved again
_FINALISTS = 2  # times ``top``: best pairs, and best pairs in different places, that are predicted more closely
_APART = 3.0  # footprint radii: struts with both ends nearer than this are one suggestion
_WORK = 2e7  # unknowns times right-hand sides of the flexibility of footprints
_REACH = 0.7  # of the highest known frequency: predictions above rest on the modes left out
_MOST_MODES = 60  # solved for in search of the mode


def strut_trial(
    design: Design,
    modes: ModeSet,
    number: int,
    *,
    stiffness: float | None = None,
    clearances: Sequence[Clearance] = (),
    candidates: Candidates | None = None,
    top: int = 10,
    resolve: int = RESOLVED,
    progress: Progress = SILENT,
) -> StrutTrial:
    """The ``top`` struts that raise mode ``number`` (from 1) most; the first ``resolve`` of them solved again.

    stiffness   N/m of every strut; None: a solid rod of the design's own material, as long as the strut and 1 % of
                the diagonal thick, or a rigid strut where no material is stated
    clearances  boxes no strut may pass; candidates: pairs to try instead of those found on the surface
    Raises ``InputError`` for a mode that is not there, ``RefusedError`` for a rigid-body mode, for modes without
    modal mass, and ``ModelError`` as ``assemble`` does for a design whose own modes these are.
    """
    index = _checked(design, modes, number, stiffness, top)
    system, cautions = _system(design, modes, progress)
    known = _known_modes(design, modes, system, progress)
    cautions = [*modes.cautions, *cautions, *known.cautions]  # of the shapes as given
    rod, words = _rod(system, design) if stiffness is None else ({}, "as given")
    if candidates is None:
        usable = None if system is None else system.dof[:, 0] >= 0
        margin = 0.5 * rod.get("diameter_m", 0.0)
        candidates = candidate_pairs(design.mesh, usable, clearances=clearances, margin=margin, progress=progress)
    truncation = None if system is None or not len(candidates.pairs) else Truncation(system, known.poles, progress)
    field = _Field(candidates, known, stiffness, rod)
    struts, weighed = field.best(index, top, truncation, progress)
    if _beyond(struts, known) and truncation is not None:
        if resolve and modes.origin == "computed":
            more = solve_system(truncation.system, min(3 * modes.count, _MOST_MODES), progress)
            known = _known_modes(design, more, truncation.system, progress)
            field = _Field(candidates, known, stiffness, rod)
            struts, weighed = field.best(index, top, truncation.knowing(known.poles), progress)
        else:
            cautions.append("a predicted frequency lies near or above the known modes: it is rough there")
    model_freq = None
    if system is not None and resolve and struts:
        struts, model_freq = _resolved(system, struts, index, known, resolve, modes.origin != "computed", progress)
    return StrutTrial(
        mode=number,
        freq_hz=float(modes.freq_hz[index]),
        model_freq_hz=model_freq,
        struts=tuple(struts),
        candidates=candidates,
        residual=system is not None,
        stiffness_words=words,
        rod=rod,
        weighed=weighed,
        known=len(known.poles),
        cautions=tuple(cautions),
    )


def _beyond(struts: Sequence[TrialStrut], known: _Known) -> bool:
    """Whether a strut raises the mode to where the known modes end, so that more of them are wanted."""
    return any(each.predicted.freq_hz > _REACH * np.sqrt(known.poles.max()) / (2 * np.pi) for each in struts)


def _checked(design: Design, modes: ModeSet, number: int, stiffness: float | None, top: int) -> int:
    modes.index_of(number, design.name)
    if stiffness is not None and not (np.isfinite(stiffness) and stiffness > 0):
        raise InputError("a strut needs a positive stiffness", found=f"{stiffness:g}", expected="N/m above 0")
    if top < 1:
        raise InputError("the number of struts must be positive", found=str(top))
    if not np.array_equal(modes.node_ids, design.mesh.node_ids):
        raise ModelError(f"design '{design.name}': the modes are not given on the nodes of its mesh")
    if not np.isfinite(modes.freq_hz).all():
        raise ModelError(f"design '{design.name}': a mode has no frequency", do="give every mode a frequency in Hz")
    if not modes.freq_hz[number - 1] > 0:
        raise RefusedError(
            f"mode {number} of design '{design.name}' is a rigid-body mode: no strut within the part can raise it",
            do="ask for an elastic mode, or hold the part in a support",
        )
    return number - 1


def _system(design: Design, modes: ModeSet, progress: Progress) -> tuple[System | None, list[str]]:
    """The design's matrices; None with the reason when it has no usable model."""
    if states_no_material(design):
        return None, ["the design states no material: the modes left out are not accounted for"]
    try:
        return (assemble(design, progress) if design.physics.matrices is None else given_system(design)), []
    except ModelError as error:
        if modes.origin == "computed":
            raise
        return None, [f"the design cannot be solved, so that the modes left out are not accounted for: {error}"]


@dataclass(frozen=True, eq=False)
class _Known:
    """The known modes at unit modal mass: eigenvalues (m,), translations (m, n_nodes, 3), vectors (m, n_dof) or None
    without a model."""

    poles: Array
    moved: Array
    vectors: Array | None
    cautions: list[str]


def _known_modes(design: Design, modes: ModeSet, system: System | None, progress: Progress) -> _Known:
    moved, cautions = np.stack([modes.shape(i) for i in range(modes.count)]), []
    turn = np.ones(modes.count, complex)
    if modes.is_complex:
        turn = np.exp(-0.5j * np.angle(np.einsum("kni,kni->k", moved, moved)))
        moved = (moved * turn[:, None, None]).real
        cautions.append("the shapes are complex: their motion at the phase of largest motion is taken")
    vectors, mass = None, np.ones(modes.count)
    if system is not None:
        vectors = shape_vectors(system, modes, np.arange(modes.count), progress)[0]
        if modes.is_complex:
            vectors = (vectors * turn[:, None]).real
        mass = np.einsum("kn,nk->k", vectors, system.M @ vectors.T)
    elif modes.normalisation != "mass":
        raise RefusedError(
            f"design '{design.name}': the size of its mode shapes is not known, so that no strut can be weighed",
            do="give modes at unit modal mass, or materials in the dossier",
        )
    if not (mass > 0).all():
        raise ModelError(f"design '{design.name}': mode {int(np.argmin(mass)) + 1} moves no mass")
    scale = 1 / np.sqrt(mass)
    return _Known(
        (2 * np.pi * modes.freq_hz) ** 2,
        moved * scale[:, None, None],
        None if vectors is None else vectors * scale[:, None],
        cautions,
    )


def _rod(system: System | None, design: Design) -> tuple[dict[str, float], str]:
    """The solid rod that is tried, of the material that fills most of the body."""
    material = _main_material(system, design)
    if material is None:
        return {}, "rigid: the design states no material for a rod"
    diameter = ROD * design.mesh.diagonal
    area = np.pi / 4 * diameter**2
    rod = {
        "diameter_m": diameter,
        "share_of_diagonal": ROD,
        "youngs_modulus_pa": material.youngs_modulus,
        "mass_per_length_kg_per_m": material.density * area,
    }
    return rod, f"a solid rod of {material.name}, 1 % of the part's diagonal thick; its own mass is not counted"


def _main_material(system: System | None, design: Design) -> Material | None:
    if system is None or design.physics.matrices is not None:
        return None
    properties, index = design.properties
    there = index >= 0
    volumes = np.bincount(index[there], cell_volumes(system)[there], len(properties))
    return properties[int(volumes.argmax())].material if len(volumes) else None


class _Field:
    """All candidate pairs against the known modes: stretch a (p, m) of the strut by each mode, stiffness k (p,)."""

    def __init__(self, candidates: Candidates, known: _Known, stiffness: float | None, rod: dict[str, float]) -> None:
        self.candidates, self.known = candidates, known
        footprints, lines = candidates.footprints, candidates.lines
        self.means = np.stack([known.moved[:, each.nodes].mean(axis=1) for each in footprints], axis=1)
        self.ends = np.array([each.centre for each in footprints]).reshape(-1, 3)[candidates.pairs]  # (p, 2, 3) m
        length = np.linalg.norm(lines, axis=1)
        self.directions = lines / length[:, None]
        first, second = candidates.pairs.T
        self.stretch = np.einsum("pi,mpi->pm", self.directions, self.means[:, second] - self.means[:, first])
        if stiffness is not None:
            self.stiffness = np.full(len(lines), stiffness)
        elif rod:
            self.stiffness = rod["youngs_modulus_pa"] * np.pi / 4 * rod["diameter_m"] ** 2 / length
        else:
            self.stiffness = np.full(len(lines), np.inf)

    def best(
        self, index: int, top: int, truncation: Truncation | None, progress: Progress
    ) -> tuple[list[TrialStrut], int]:
        """The ``top`` struts and how many pairs were weighed with residual flexibility."""
        order, weighed = self._ranked(index, top, truncation, progress)
        return self._predicted(order, index, truncation)[:top], weighed

    def _ranked(self, index: int, top: int, truncation: Truncation | None, progress: Progress) -> tuple[Array, int]:
        """Pairs to be predicted more closely, best first, and how many were weighed with residual flexibility."""
        count = len(self.stiffness)
        if not count:
            return np.empty(0, np.int64), 0
        stiffness, rows = self.stiffness, np.arange(count)
        order = self._order(raised(self.known.poles, self.stretch, stiffness), index)
        if truncation is not None:
            chosen = self._affordable(order, truncation)
            residual, rows = self._residual(chosen, truncation, progress)
            with np.errstate(divide="ignore"):
                softened = 1 / (1 / stiffness[rows] + residual)
            order = rows[self._order(raised(self.known.poles, self.stretch[rows], softened), index)]
        best = [*order[: _FINALISTS * top].tolist(), *self._distinct(order, _FINALISTS * top)]
        return np.array(list(dict.fromkeys(best))), 0 if truncation is None else len(rows)

    def _distinct(self, order: Array, count: int) -> list[int]:
        """The first ``count`` of the pairs ``order`` without those that lie near an earlier one at both ends."""
        kept: list[int] = []
        for pair in order.tolist():
            if not self._near(pair, kept).any():
                kept.append(pair)
            if len(kept) == count:
                break
        return kept

    def _near(self, pair: int, others: Sequence[int]) -> Array:
        ends, reach = self.ends, _APART * self.candidates.radius
        gap = lambda other: np.linalg.norm(other - ends[pair], axis=2).max(axis=1)  # noqa: E731
        those = ends[list(others)]
        return (gap(those) < reach) | (gap(those[:, ::-1]) < reach)

    def _order(self, found: Raised, index: int) -> Array:
        """Best first: modes that go on as one before those that do not, then by frequency."""
        which, share = found.followed(index)
        roots = found.roots[np.arange(len(which)), which]
        return np.lexsort((-roots, share < MIXED))

    def _affordable(self, order: Array, truncation: Truncation) -> Array:
        """Footprints of the best pairs, as many as the size of the model allows."""
        most = max(32, int(_WORK / max(truncation.mass.shape[0], 1) / 3))
        return np.sort(np.array(list(dict.fromkeys(self.candidates.pairs[order].ravel().tolist()))[:most]))

    def _residual(self, chosen: Array, truncation: Truncation, progress: Progress) -> tuple[Array, Array]:
        """Residual flexibility, m/N, of the pairs between ``chosen`` footprints, and the rows of these pairs."""
        nodes = [self.candidates.footprints[i].nodes for i in chosen]
        whole = truncation.between_all(nodes, self.means[:, chosen], progress)
        whole = whole.reshape(len(chosen), 3, len(chosen), 3)
        place = np.full(len(self.candidates.footprints), -1)
        place[chosen] = np.arange(len(chosen))
        pairs = place[self.candidates.pairs]
        rows = np.nonzero((pairs >= 0).all(axis=1))[0]
        (i, j), n = pairs[rows].T, self.directions[rows]
        part = lambda a, b: np.einsum("pi,pij,pj->p", n, whole[a, :, b], n)  # noqa: E731
        return np.maximum(part(i, i) + part(j, j) - part(i, j) - part(j, i), 0.0), rows

    def _predicted(self, rows: Array, index: int, truncation: Truncation | None) -> list[TrialStrut]:
        """The struts of the pairs ``rows``, best first, near ones once."""
        if not len(rows):
            return []
        known = self.known.poles
        poles, stretch = np.broadcast_to(known, (len(rows), len(known))), self.stretch[rows]
        if truncation is not None:
            footprints = self.candidates.footprints
            ends = [(footprints[i].nodes, footprints[j].nodes) for i, j in self.candidates.pairs[rows]]
            pole, extra = truncation.of_pairs(ends, self.directions[rows], stretch)
            poles, stretch = np.column_stack([poles, pole]), np.column_stack([stretch, extra])
        answers = [
            raised(poles, stretch, self.stiffness[rows]),
            raised(poles, stretch, np.full(len(rows), np.inf)),
            raised(known, self.stretch[rows], self.stiffness[rows]),
        ]
        order = self._order(answers[0], index)
        place = {int(row): at for at, row in enumerate(rows)}
        out = []
        for row in self._distinct(rows[order], len(rows)):
            i, j = self.candidates.pairs[row]
            at = place[row]
            out.append(
                TrialStrut(
                    self.candidates.footprints[i],
                    self.candidates.footprints[j],
                    float(self.stiffness[row]),
                    bool(self.candidates.facing[row]),
                    *(_followed(each.roots[at], each.shares[at, index]) for each in answers),
                )
            )
        return out


def _followed(roots: Array, shares: Array) -> Followed:
    freq = np.sqrt(np.maximum(roots, 0)) / (2 * np.pi)
    best, *others = np.argsort(-shares, kind="stable")
    rest = others[0] if others else best
    return Followed(
        int(best) + 1,
        float(freq[best]),
        float(shares[best]),
        int(rest) + 1,
        float(freq[rest]),
        float(shares[rest]) if others else 0.0,
        float(freq.min()),
    )


def _resolved(
    system: System,
    struts: list[TrialStrut],
    index: int,
    known: _Known,
    count: int,
    imported: bool,
    progress: Progress,
) -> tuple[list[TrialStrut], float | None]:
    """The first ``count`` struts solved again, best first, then the others; the mode's frequency by the model."""
    assert known.vectors is not None
    force = system.M @ known.vectors[index]
    before = follow(system, force, index + 3, progress).freq_hz if imported else None
    solved = []
    for number, strut in enumerate(struts[:count]):
        progress.tick("solving with struts", number, count)
        solved.append(replace(strut, resolved=resolve_strut(system, strut, force, index, progress)))
    solved.sort(key=_standing)
    return [*solved, *struts[count:]], before


def _standing(strut: TrialStrut) -> tuple[bool, float]:
    found: Any = strut.resolved
    return found.mixed, -found.freq_hz


def resolve_strut(
    system: System, strut: TrialStrut, force: Array, index: int, progress: Progress = SILENT
) -> Followed:
    """Where the motion of mode ``index`` is found in a new solution of ``system`` with the strut.

    force  (n_dof,) M φ of that mode at unit modal mass
    """
    rigid = strut if np.isfinite(strut.stiffness) else replace(strut, stiffness=_rigid_stiffness(system))
    count = max(strut.predicted.number, index + 1) + 3
    return follow(with_strut(system, rigid.strut("trial", system.design.mesh)), force, count, progress)


def follow(system: System, force: Array, count: int, progress: Progress = SILENT) -> Followed:
    """Solve until no mode beyond those found can hold more of the motion than the best one; shares of the motion
    are (φᵀMψ)² at unit modal masses."""
    while True:
        found = solve_system(system, count, progress)
        moved = np.stack([found.shape(i) for i in range(found.count)])
        turned = [values for i in range(found.count) if (values := found.rotations(i)) is not None]
        shares = (system.gather(moved, np.stack(turned) if turned else None) @ force) ** 2
        if shares.max() >= 1 - shares.sum() or found.count < count or count >= _MOST_MODES:
            return _followed((2 * np.pi * found.freq_hz) ** 2, shares)
        count = min(2 * count, _MOST_MODES)


def _rigid_stiffness(system: System) -> float:
    """N/m far above any the part could give way against: the stiffest direction of its matrix."""
    return 1e3 * float(system.K.diagonal().max())

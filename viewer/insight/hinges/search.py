"""The search: from a mode to its hinges and flaps."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from viewer.errors import ModelError, RefusedError
from viewer.insight.hinges.band import Draft, Examiner
from viewer.insight.hinges.candidates import candidates
from viewer.insight.hinges.curve import Line
from viewer.insight.hinges.field import Field, make_field
from viewer.insight.hinges.finding import Hinge, HingeFinding
from viewer.insight.hinges.flaps import find_flaps, regions
from viewer.insight.hinges.gates import DOUBTFUL, confidence, is_joint, label, score, worth_a_doubt
from viewer.insight.hinges.lines import unions
from viewer.insight.hinges.seam import moment_through, seams_of, turn_between
from viewer.insight.places import place_of
from viewer.insight.smoothing import needs_smoothing, noise_estimate, smoothed
from viewer.jobs import SILENT, Progress
from viewer.mechanics.energy import CLOSURE_BOUND, RELATIVE, Energies
from viewer.mechanics.energy import energies as form_energies
from viewer.mechanics.relative import relative_energies, states_no_material
from viewer.model.arrays import Array
from viewer.model.design import Design
from viewer.model.modes import ArrayShapes, ModeSet

_CURVE_POINTS = 17
_ONE_SENSE = 0.5  # share of the squared turn that is the mean turn, from which a band has one stiffness
_SAME = 0.3  # share of the smaller band's energy in common from which two candidates are one


def find_hinges(
    design: Design,
    modes: ModeSet,
    number: int,
    energies: Energies | None = None,
    progress: Progress = SILENT,
) -> HingeFinding:
    """Hinge lines, joints and flaps of mode ``number`` (from 1).

    energies  of any modes that include this one; formed for it alone when None
    Method: dense strain energy proposes bands (``candidates``), each is measured (``band``) and must pass gates.
    Raises ``InputError`` for a mode that is not there, ``ModelError`` as ``energies`` does,
    ``RefusedError`` when no energies can be formed, ``Cancelled``.
    """
    index = modes.index_of(number, design.name)
    freq = float(modes.freq_hz[index])
    given, row = _energies(design, modes, index, energies, progress)
    cleaned, basis, noise, cautions = _without_noise(design, modes, index, float(given.closure[row]), progress)
    if cleaned is not None:
        # the model made this shape smooth, so that its residual says nothing: closure alone is looked at
        modes, index, row = cleaned, 0, 0
        given = (
            relative_energies(design, modes, progress)
            if states_no_material(design)
            else form_energies(design, modes, [0], progress, judged=False)
        )
    cautions = [*modes.cautions, *cautions, *_doubts(given, row, basis)]
    moved, turned = modes.shape(index), modes.rotations(index)
    if np.iscomplexobj(moved):
        phase = np.exp(-0.5j * np.angle((moved**2).sum()))
        moved, turned = (moved * phase).real, None if turned is None else (turned * phase).real
        cautions.append("the shape is complex: rotations are those at the phase of largest motion")
    answer: dict[str, Any] = {"mode": number, "freq_hz": freq, "basis": basis, "noise": noise}
    whole = given.total_strain[row]
    if np.isnan(given.closure[row]) and not given.relative:
        return HingeFinding(verdict="rigid-body mode", cautions=tuple(cautions), **answer)
    if not given.strain[row].sum() > 1e-9 * max(whole, 0.0) or whole <= 0:
        verdict = "rigid-body mode" if whole <= 0 else "does not bend"
        return HingeFinding(verdict=verdict, cautions=tuple(cautions), **answer)
    field = make_field(
        design, moved, turned, given.strain[row] / whole, given.kinetic[row] / given.total_kinetic[row], given.volumes
    )
    drafts = _chosen(field, progress)
    region = regions(field, [draft.cells for draft, _, _ in drafts])
    hinges: list[Hinge] = []
    for draft, worth, gate in drafts:
        seams = seams_of(design.mesh, draft)
        turn = turn_between(design.mesh, seams, bool((field.dim[draft.cells] == 3).any()), moved, turned)
        draft = draft if turn is None else _turned_as(draft, turn)
        stiffness = None
        if not given.relative:
            moment = moment_through(design, draft, seams, moved, turned, given.formulations)
            stiffness = stiffness_of(draft, moment, whole)
        hinges.append(_hinge(field, region, len(hinges) + 1, draft, worth, gate, stiffness))
    where = lambda cells: place_of(design.mesh, cells, given.volumes)  # noqa: E731
    placed = tuple(replace(hinge, place=where(hinge.cells)) for hinge in hinges)
    if any(hinge.label == "undecided" for hinge in placed):
        return HingeFinding(verdict="undecided", doubtful=placed, cautions=tuple(cautions), **answer)
    flaps = (replace(flap, place=where(flap.cells)) for flap in find_flaps(field, placed, region))
    return HingeFinding(
        verdict="hinges" if placed else "bending is spread",
        hinges=placed,
        flaps=tuple(flaps),
        cautions=tuple(cautions),
        **answer,
    )


def _without_noise(
    design: Design, modes: ModeSet, index: int, closure: float, progress: Progress
) -> tuple[ModeSet | None, str, float, list[str]]:
    """The mode without its noise, alone in a set (None where it needs no cleaning), the basis that makes, the share
    of noise, and cautions."""
    if modes.origin == "computed":
        return None, "energies", 0.0, []
    shape = modes.shape(index)
    noise = float(np.nan_to_num(noise_estimate(design, shape.real if np.iscomplexobj(shape) else shape, progress)))
    if not needs_smoothing(noise, closure):
        return None, "energies", noise, []
    try:
        found = smoothed(design, modes, index + 1, progress)
    except (RefusedError, ModelError) as error:
        return None, "energies", noise, [f"the shape holds noise that could not be taken out: {error}"]
    return found.modes, "smoothed", found.noise, [found.caution]


def _energies(design, modes, index, given: Energies | None, progress) -> tuple[Energies, int]:
    """Energies that hold mode ``index`` and the row it is in."""
    if given is not None:
        rows = np.nonzero(np.asarray(given.indices) == index)[0]
        if len(rows):
            return given, int(rows[0])
    if states_no_material(design):
        return relative_energies(design, _one(modes, index), progress), 0
    return form_energies(design, modes, [index], progress, judged=modes.origin != "computed"), 0


def _one(modes: ModeSet, index: int) -> ModeSet:
    turned = modes.rotations(index)
    shapes = ArrayShapes(modes.shape(index)[None], None if turned is None else turned[None])
    return modes.with_(freq_hz=modes.freq_hz[index : index + 1], shapes=shapes, damping=None, cell_energy=None)


def _doubts(given: Energies, row: int, basis: str) -> list[str]:
    if given.relative:
        return [f"energies are {RELATIVE}"]
    words = []
    closes = basis == "smoothed" and abs(given.closure[row] - 1) <= CLOSURE_BOUND
    if not (given.trusted[row] or closes) and np.isfinite(given.closure[row]):
        words.append("the energies are not to be trusted for absolute figures")
    if given.spring_share(row) > 0.05:
        words.append(f"springs hold {given.spring_share(row):.0%} of the strain energy")
    return words


def _chosen(field: Field, progress: Progress) -> list[tuple[Draft, float, str]]:
    """The best of the candidates that pass, no two for one band, the strongest first; if none passes, those in
    doubt."""
    measured: dict[int, Draft] = {}  # the examiner keeps its drafts and gives the same one again
    proposed = candidates(field, progress)
    examine = Examiner(field)
    for i, cells in enumerate(proposed):
        progress.tick("looking at bands", i, len(proposed))
        measured |= {id(draft): draft for draft in examine(cells)}
    for cells in unions(field, list(measured.values())):
        measured |= {id(draft): draft for draft in examine(cells)}
    scored = [(draft, *score(field, draft)) for draft in measured.values()]
    found = [item for item in scored if item[1] >= 1]
    found = found or [item for item in scored if item[1] >= DOUBTFUL and worth_a_doubt(item[0])]
    found.sort(key=lambda item: -_rank(*item[:2]))
    kept: list[tuple[Draft, float, str]] = []
    for item in found:
        if all(_apart(field, item[0], other[0]) for other in kept):
            kept.append(item)
    kept.sort(key=lambda item: -item[1] * item[0].strain)
    return kept


def _rank(draft: Draft, worth: float) -> float:
    """Which of the candidates for one band is taken: much energy, sharp edges, one sense along the line."""
    sharp = min(draft.jump, 5.0) ** 0.5 * min(draft.step, 30.0) ** 0.25
    return float(min(worth, 2.0) * np.sqrt(draft.strain) * draft.even * sharp)


def _apart(field: Field, one: Draft, other: Draft) -> bool:
    common = field.strain[np.intersect1d(one.cells, other.cells, assume_unique=True)].sum()
    if common > _SAME * min(one.strain, other.strain):
        return False
    # A candidate that lies beside a band, within its own width, only sees the band's flank.
    gap = np.linalg.norm(one.position - other.position)
    return bool(gap > max(one.width, other.width))


def _hinge(
    field: Field, region: Array, number: int, draft: Draft, worth: float, gate: str, stiffness: float | None
) -> Hinge:
    curve, joint = draft.frame.curve, is_joint(draft)
    straight = isinstance(curve, Line)
    count = 2 if straight or joint else _CURVE_POINTS
    along = np.linspace(*draft.ends, count)
    axis = curve.foot(along)
    direction = draft.fold / max(np.linalg.norm(draft.fold), 1e-300)
    if joint:  # without a length of its own: a bar along the fold as long as the joint is large
        half = max(draft.width, draft.length) / 2
        axis = draft.position + half * np.array([[-1.0], [1.0]]) * direction
    elif straight:
        axis = axis + (draft.position - curve.foot(curve.along(draft.position[None]))[0])
    position = draft.position if straight else curve.foot(curve.along(draft.position[None]))[0]
    near_a, near_b = (side.cells for side in draft.sides)
    sides, swap = _regions_joined(field, region, draft, near_a, near_b)
    fold, arm = draft.fold, draft.across
    if swap:
        fold, arm, sides = -fold, -arm, sides[::-1]
    arm = arm - (arm @ direction) * direction
    kind = "joint" if joint else curve.kind
    return Hinge(
        number=number,
        kind=kind,
        axis=axis,
        motion=_motion(field, draft, axis),
        position=position,
        direction=direction if fold @ direction >= 0 else -direction,
        length=draft.length,
        width=draft.width,
        fold=fold,
        stiffness=stiffness,
        strain_share=draft.strain,
        volume_share=draft.volume,
        contrast=draft.contrast,
        turn_share=draft.turn_share,
        cells=draft.cells,
        sides=sides,
        arm=arm / max(np.linalg.norm(arm), 1e-300),
        score=worth,
        gate=gate,
        confidence=confidence(worth),
        label=label(worth, draft),
    )


def _turned_as(draft: Draft, turn: Array) -> Draft:
    """The draft with the fold that its seams show. About a line, the sides' rotations carried on to the edges are the
    better measure of size (a seam of a one-sided groove turns less than the full section), the seams of direction. A
    joint's surroundings give way, so that only the seams tell how far it turns itself."""
    if is_joint(draft):
        axis = draft.frame.about[0]
        return replace(draft, fold=turn, bend=abs(float(turn @ axis)), even=1.0)
    if not isinstance(draft.frame.curve, Line) or not np.linalg.norm(turn) > 0:
        return draft
    return replace(draft, fold=turn * np.linalg.norm(draft.fold) / np.linalg.norm(turn))


def stiffness_of(draft: Draft, moment: float | None, whole: float) -> float | None:
    """N·m/rad: the moment that passes through the band over the mean turn of its edges. Where the moment cannot be
    told, or the turn changes its sense along the line, 2U/θ² of the band's cells (``whole`` J of all)."""
    if not draft.bend > 0:
        return None
    if moment is not None and draft.even >= _ONE_SENSE:
        return moment / (draft.bend * float(np.sqrt(draft.even)))
    return 2 * draft.strain * whole / draft.bend**2


def _regions_joined(field, region, draft, near_a, near_b):
    """Cells of the regions on both sides, and whether they must change places for A to be the held or larger one."""
    numbers = [_majority(region[near]) for near in (near_a, near_b)]
    if numbers[0] != numbers[1]:
        sides = tuple(np.nonzero(region == n)[0] if n >= 0 else np.empty(0, np.int64) for n in numbers)
    else:  # the band does not go all the way: what turns about it is its surroundings only
        sides = near_a, near_b
    ground = [draft.sides[i].ground for i in (0, 1)]
    if any(ground):
        return sides, ground[1]
    held = [field.clamped[s].any() for s in sides]
    if held[0] != held[1]:
        return sides, held[1]
    return sides, bool(field.volume[sides[1]].sum() > field.volume[sides[0]].sum())


def _majority(numbers: Array) -> int:
    numbers = numbers[numbers >= 0]
    return int(np.bincount(numbers).argmax()) if len(numbers) else -1


def _motion(field: Field, draft: Draft, axis: Array) -> Array:
    """(k, 3) translation of points on the axis: that of the nearest cell of the band and its rotation."""
    middle = field.middle[draft.cells]
    nearest = draft.cells[np.linalg.norm(axis[:, None] - middle[None], axis=2).argmin(axis=1)]
    return field.shift[nearest] + np.cross(field.turn[nearest], axis - field.middle[nearest])

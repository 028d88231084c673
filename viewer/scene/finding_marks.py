"""From findings to marks: what a picture says about the hinges and flaps of a mode, at the size it draws them."""

from __future__ import annotations

import numpy as np

from viewer.insight.hinges import HingeFinding
from viewer.insight.scale import Scale
from viewer.model.arrays import Array
from viewer.model.mesh import Mesh
from viewer.scene.figures import GAP, digits
from viewer.scene.note_layout import is_true, statistic_words
from viewer.scene.picture import FlapMark, HingeMark

ALWAYS_TOLD = 2  # hinges, from the strongest, whose figures are told even when they are weak
REACH_PERCENTILE = 98  # of the folding side's nodes: one stray corner does not lengthen the fan


def hinge_marks(
    finding: HingeFinding, scale: Scale, turn: complex, mesh: Mesh, chosen: int = 0, *, brief: bool = False
) -> tuple[HingeMark, ...]:
    """Marks of the hinges of ``finding``, whose shape is drawn multiplied by ``turn`` at ``scale``.

    chosen  number of the hinge to set off, 0: none; the others are then named only
    brief   all are named only; weak ones after the first two always are
    """
    facts = finding.with_scale(scale).to_dict()["hinges"]
    found = []
    for hinge, said in zip(finding.hinges, facts, strict=True):
        joint = hinge.kind == "joint"
        sure, number = hinge.label == "strong", hinge.number
        told = number == chosen if chosen > 0 else sure or number <= ALWAYS_TOLD
        doubt = "" if sure else f" ({hinge.label})"
        found.append(
            HingeMark(
                f"{'joint' if joint else 'hinge'} {number}{doubt}",
                _hinge_lines(said, scale) if told and not brief else (),
                hinge.position[None] if joint else hinge.axis,
                turned(hinge.motion.mean(axis=0, keepdims=True) if joint else hinge.motion, turn),
                turned(hinge.fold, turn),
                hinge.arm,
                _reach(mesh, hinge.sides[1], hinge.position, hinge.arm),
                hinge.width,
                hinge.cells,
                number == chosen,
                sure,
            )
        )
    return tuple(found)


def flap_marks(finding: HingeFinding, *, brief: bool = False) -> tuple[FlapMark, ...]:
    """Marks of the flaps of ``finding``; ``brief``: they are named only."""
    said = (
        (flap, () if brief else (f"{_percent(flap.kinetic_share)} of the kinetic energy",)) for flap in finding.flaps
    )
    return tuple(FlapMark(f"flap {flap.number}", lines, flap.cells) for flap, lines in said)


def verdict_words(finding: HingeFinding) -> str:
    """What the note says when there is no hinge to mark: that, too, is an answer."""
    if finding.hinges:
        return ""
    return {
        "bending is spread": "no hinge line: bending is spread",
        "rigid-body mode": "rigid-body mode: nothing folds",
        "does not bend": "no strain energy in the elements: nothing folds",
    }.get(finding.verdict, "may fold, but no line is certain enough to mark")


def turned(values: Array, turn: complex) -> Array:
    """An amplitude times a unit complex factor; a real one stays real, as the shape does."""
    if np.iscomplexobj(values):
        return values * turn
    return -values if complex(turn).real < 0 else values


def _hinge_lines(facts: dict, scale: Scale) -> tuple[str, ...]:
    drawn, real = facts["fold_drawn_deg"], facts["fold_real_deg"]
    if real is None:
        lines = [f"folds {_degrees(drawn)} as drawn"]
    else:
        lines = [f"folds {_degrees(real)} real{statistic_words(scale)}"]
        lines[0] += "" if is_true(scale.magnification) else f", {_degrees(drawn)} drawn"
    if facts["strain_share"] is not None:
        lines.append(f"{_percent(facts['strain_share'])} of the energy")
    return tuple(lines)


def _degrees(angle: float) -> str:
    return f"{digits(angle)}°"


def _percent(share: float) -> str:
    return f"{digits(100 * share, trim=True)}{GAP}%"


def _reach(mesh: Mesh, cells: Array, place: Array, arm: Array) -> float:
    """How far the cells go along ``arm`` from ``place``, m."""
    rows = mesh.nodes_of_cells(np.asarray(cells, np.int64)) if len(cells) else np.empty(0, np.int64)
    if not len(rows):
        return 0.0
    return max(float(np.percentile((mesh.points[rows] - place) @ arm, REACH_PERCENTILE)), 0.0)

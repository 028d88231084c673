"""One mode scored: what the search names against what was built in."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.optimize import linear_sum_assignment

from tests.collection.sheets import Band, Built
from tests.collection.solved import Solved
from tests.collection.truth import Truth, frame
from viewer.insight.hinges import Hinge, HingeFinding, find_hinges
from viewer.model.arrays import Array
from viewer.model.modes import ModeSet

NEAR, TURNED = 0.05, 20.0  # of the diagonal, degrees: a hit
NAN = float("nan")


@dataclass(frozen=True)
class Row:
    """A band in a mode, or a mode without bands (band 0).

    mode     number among the elastic ones; band from 1, kind as built in; level, share, contrast and evenness as
             in ``truth.py``
    found    "" or kind and label of the finding that is nearest to the band and close enough to be meant
    hit      position within 0.05 of the diagonal and, for lines and curves, direction within 20°
    position distance of the position from the true centre line in the plane of the sheet ÷ diagonal (curves: mean
             along the axis, since no arc holds its own centroid)
    direction degrees between direction and true turn; axis degrees between the axis's ends and the true line (lines)
    fold     |fold| ÷ true turn − 1; stiffness k ÷ static solution − 1; NaN where there is no one angle or no k, or
             where the static solution does not settle
    mesh     static solution on the mesh of the modes ÷ settled one − 1: so much is the mesh's, not the search's
    settled  by what share the static solution still changed when the cells were last halved
    free     the mode has no hinge; false: findings off every band in this mode (counted in the mode's first row)
    idle     findings on bands of the part although the mode is free of hinges
    """

    part: str
    density: int
    mode: int
    freq_hz: float
    band: int
    kind: str
    level: str
    share: float
    contrast: float
    evenness: float
    found: str = ""
    hit: bool = False
    position: float = NAN
    direction: float = NAN
    axis: float = NAN
    fold: float = NAN
    stiffness: float = NAN
    free: bool = False
    false: int = 0
    idle: int = 0
    mesh: float = NAN
    settled: float = NAN


def named(finding: HingeFinding) -> tuple[Hinge, ...]:
    """The hinges that the finding's sentence names."""
    return finding.hinges if finding.verdict == "hinges" else ()


def score(solved: Solved, modes: ModeSet | None = None, only: Sequence[int] | None = None) -> list[Row]:
    """Rows of every elastic mode (``only``: those indices among them). ``modes``: other shapes on the same nodes, as
    a bare import without energies."""
    out = []
    for j in range(len(solved.truths)) if only is None else only:
        number = solved.first + j + 1
        if modes is None:
            finding = find_hinges(solved.built.design, solved.modes, number, solved.energies)
        else:
            finding = find_hinges(solved.built.design, modes, number)
        out += score_mode(solved, j, named(finding))
    return out


def score_mode(solved: Solved, j: int, hinges: Sequence[Hinge]) -> list[Row]:
    """Rows of elastic mode ``j`` (from 0) given what the search named."""
    built, truths = solved.built, solved.truths[j]
    bands = built.sheet.bands
    free = all(t.level == "none" for t in truths)
    gaps = np.array([[gap(built, band, h) for h in hinges] for band in bands]).reshape(len(bands), len(hinges))
    on = [bool((gaps[:, k] <= NEAR).any()) for k in range(len(hinges))]
    # A finding stands for one band only: two lines merged into one are not both found.
    taken = dict(zip(*linear_sum_assignment(np.where(gaps <= NEAR, gaps, 1e3)), strict=True))
    base = {
        "part": solved.part.name,
        "density": solved.density,
        "mode": j + 1,
        "freq_hz": float(solved.modes.freq_hz[solved.first + j]),
        "free": free,
    }
    counts = {"false": on.count(False), "idle": on.count(True) if free else 0}
    if not truths:
        return [Row(**base, band=0, kind="", level="none", share=NAN, contrast=NAN, evenness=NAN, **counts)]
    rows = []
    for i, t in enumerate(truths):
        facts = {
            "band": i + 1,
            "kind": bands[i].kind,
            "level": t.level,
            "share": t.share,
            "contrast": t.contrast,
            "evenness": t.evenness,
        }
        if t.level == "strong" and bands[i].cut is not None:
            facts |= {"mesh": solved.own_stiffness[i] / solved.stiffness[i] - 1, "settled": solved.change[i]}
        best = hinges[taken[i]] if i in taken and gaps[i, taken[i]] <= NEAR else None
        errors = {} if best is None else compare(built, bands[i], t, best, solved.stiffness[i])
        rows.append(Row(**base, **facts, **errors, **(counts if i == 0 else {})))
    return rows


def compare(built: Built, band: Band, t: Truth, hinge: Hinge, stiffness: float) -> dict:
    """How far a finding is off the band it is taken for."""
    size = float(np.linalg.norm(t.turn))
    direction = angle(hinge.direction, t.turn)
    line = built.line(band)
    out = {
        "found": f"{hinge.kind} {hinge.label}",
        "position": gap(built, band, hinge),
        "direction": direction,
        "hit": band.kind == "joint" or direction <= TURNED,
    }
    if band.kind == "line":
        out["axis"] = angle(hinge.axis[-1] - hinge.axis[0], line[-1] - line[0])
    if t.one_angle and size > 0:
        out["fold"] = hinge.fold_angle / size - 1
        if hinge.stiffness is not None and t.aligned >= 0.9:
            out["stiffness"] = hinge.stiffness / stiffness - 1
    return out


def gap(built: Built, band: Band, hinge: Hinge) -> float:
    """Distance of a finding from the true line in the plane of the sheet ÷ diagonal of the part."""
    if band.kind == "joint":
        centre = built.line(band, 3)[1]
        return in_plane(built, band, hinge.position, centre) / built.mesh.diagonal
    points = _resampled(hinge.axis) if band.kind == "curve" else hinge.position[None]
    return float(np.mean([to_line(built, band, point) for point in points])) / built.mesh.diagonal


def _resampled(axis: Array, count: int = 33) -> Array:
    """Points evenly along a polyline: a chord of an arc does not lie on it."""
    marks = np.concatenate([[0], np.cumsum(np.linalg.norm(np.diff(axis, axis=0), axis=1))])
    at = np.linspace(0, marks[-1], count)
    return np.stack([np.interp(at, marks, axis[:, i]) for i in range(3)], axis=1)


def to_line(built: Built, band: Band, point: Array) -> float:
    """m, in the plane of the sheet, from the true line (a fine polyline)."""
    line = built.line(band, 257)
    start, step = line[:-1], np.diff(line, axis=0)
    along = np.clip(np.einsum("ki,ki->k", point - start, step) / np.einsum("ki,ki->k", step, step), 0, 1)
    feet = start + along[:, None] * step
    foot = feet[np.argmin(np.linalg.norm(point - feet, axis=1))]
    return in_plane(built, band, point, foot)


def in_plane(built: Built, band: Band, point: Array, foot: Array) -> float:
    """m between two points without what is along the sheet's normal at ``foot``, a point of the band's line."""
    along = np.linspace(*band.ends, 33)
    _, normals = frame(built, band, sum(band.sides) / 2, along)
    normal = normals[np.argmin(np.linalg.norm(built.line(band) - foot, axis=1))]
    away = point - foot
    return float(np.linalg.norm(away - (away @ normal) * normal))


def angle(first: Array, second: Array) -> float:
    """Degrees between two lines, whatever their senses."""
    sizes = np.linalg.norm(first) * np.linalg.norm(second)
    if not sizes > 0:
        return NAN
    crossed = np.linalg.norm(np.cross(first, second))
    return float(np.degrees(np.arctan2(crossed, abs(np.real(np.dot(first, second))))))

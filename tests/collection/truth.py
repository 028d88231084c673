"""What the right answer is, from what was built in and the solved mode, never from the search that is scored.

A *hinge* is a built-in band (a thinned line, a row of ligaments, a neck) that works as one in the mode. Energy tells:

share      of the strain energy of the whole in the cells of the band
contrast   energy density of the band over that of the rest: the smaller of two figures, one for all that is in no
           band, one for its surroundings only (within one length of the line, of a joint three), lest a large idle
           plate make any root of a small tongue look like a hinge

strong     share ≥ 15 %, contrast ≥ 8 and band no wider than 0.1 of its length. A joint is as wide as long: only
           share and contrast are asked.
none       share < 2 % and contrast < 2 (the larger of the two figures): the band does not work
between    anything else: the search may name it or not, neither counts

A mode is *free of hinges* when none of the part's bands works in it, or the part has no band; whatever the search
names there off the bands is false. Energy crowding at a clamp or where ribs end, stiff folds, thin halves of a
stepped plate, and holes of a plate perforated all over are no bands. Naming a band that works little is never false
(how often it happens is counted).

Energy alone does not say that two regions turn about the line. Further figures of every strong band:

turn       (3,) rotation of edge B (higher s or t) less that of edge A per unit of the shape, by weighted fit to the
           nodes of the band's two true edges (each node weighs as the length it stands for)
evenness   (∫θ)² / (L ∫θ²) with θ the turn about the line from place to place: 1 when all of it turns by one angle,
           0 when halves fold in opposite senses, in which case there is no *one* angle or stiffness
aligned    |turn about the line| / |turn|: below 0.9 the band twists or shears rather than folds

A strong band *folds* when evenness ≥ 0.5 and aligned ≥ 0.9; others are counted apart ("strong by energy only").
Angle and stiffness are compared where evenness ≥ 0.8.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tests.collection.sheets import Band, Built
from viewer.model.arrays import Array

STRONG_SHARE, STRONG_CONTRAST, STRONG_WIDTH = 0.15, 8.0, 0.1
NONE_SHARE, NONE_CONTRAST = 0.02, 2.0
FOLDS_EVENNESS, FOLDS_ALIGNED, ONE_ANGLE = 0.5, 0.9, 0.8


@dataclass(frozen=True, eq=False)
class Truth:
    """One band in one mode; ``level`` is "strong", "energy only", "between" or "none"."""

    band: int
    level: str
    share: float
    contrast: float
    turn: Array
    evenness: float
    aligned: float

    @property
    def one_angle(self) -> bool:
        return self.evenness >= ONE_ANGLE


def length_of(line: Array) -> float:
    return float(np.linalg.norm(np.diff(line, axis=0), axis=1).sum())


def truths(
    built: Built, strain: Array, whole: float, volumes: Array, moved: Array, turned: Array | None
) -> list[Truth]:
    """What each band does in a mode: ``strain`` (n_cells,) and ``whole`` J, ``volumes`` (n_cells,) m³, shape and
    rotations (n_nodes, 3)."""
    bands = built.sheet.bands
    members = [built.cells(band.box) for band in bands]
    rest = ~np.any(members, axis=0) if bands else np.ones(len(strain), bool)
    centres = _centres(built)
    out = []
    for i, (band, cells) in enumerate(zip(bands, members, strict=True)):
        line = built.line(band)
        length = length_of(line)
        width = band.sides[1] - band.sides[0]
        reach = (3 if band.kind == "joint" else 1) * length
        near = rest & (_distance(centres, line) <= reach + width / 2)
        density = strain[cells].sum() / volumes[cells].sum()
        contrasts = [density / max(strain[r].sum() / volumes[r].sum(), 1e-300) for r in (rest, near) if r.any()]
        share = float(strain[cells].sum() / whole)
        turn, evenness, aligned = fold(built, band, moved, turned)
        narrow = band.kind == "joint" or width <= STRONG_WIDTH * length
        if narrow and share >= STRONG_SHARE and min(contrasts) >= STRONG_CONTRAST:
            folds = evenness >= FOLDS_EVENNESS and aligned >= FOLDS_ALIGNED
            level = "strong" if folds or band.kind == "joint" else "energy only"
        elif share < NONE_SHARE and max(contrasts) < NONE_CONTRAST:
            level = "none"
        else:
            level = "between"
        out.append(Truth(i, level, share, float(min(contrasts)), turn, evenness, aligned))
    return out


def fold(built: Built, band: Band, moved: Array, turned: Array | None) -> tuple[Array, float, float]:
    """Turn (3,), evenness and aligned of a band under a motion of the nodes."""
    local, means, weights = [], [], None
    for side in band.sides:
        rows, along, weight = edge(built, band, side)
        places, first = np.unique(np.round(along, 9), return_inverse=True)
        tangent, normal = frame(built, band, side, places)
        spins = _spins(built, rows, first, tangent, normal, moved, turned)
        each = np.bincount(first, weight)
        # A curved edge that bends out of its plane passes for a turned one in a fit to all of its nodes.
        fitted = built.solid and band.kind != "curve"
        means.append(_rigid_turn(built, rows, weight, moved) if fitted else each @ spins / each.sum())
        local.append((places, np.einsum("ki,ki->k", spins, tangent)))
        weights = each if weights is None else weights
    turn = means[1] - means[0]
    common = local[0][0]
    theta = np.interp(common, *local[1]) - local[0][1]
    evenness = (weights @ theta) ** 2 / max(weights.sum() * (weights @ theta**2), 1e-300)
    tangent = _mean_tangent(built, band)
    size = np.linalg.norm(turn)
    return turn, float(evenness), float(abs(turn @ tangent) / size) if size else 0.0


def edge(built: Built, band: Band, side: float) -> tuple[Array, Array, Array]:
    """Node rows on one edge of the band, their coordinate along it, and the length each stands for, m."""
    across, (low, high) = band.across, band.ends
    where, slack = built.where, 1e-7 * (band.sides[1] - band.sides[0])
    along = where[:, 1 - across]
    on = (np.abs(where[:, across] - side) < slack) & (along > low - slack) & (along < high + slack)
    if built.sheet.blades:
        on[np.setdiff1d(*(built.mesh.nodes_of_cells(np.nonzero(c)[0]) for c in (built.rib, ~built.rib)))] = False
    rows = np.nonzero(on)[0]
    places, index, count = np.unique(np.round(along[rows], 9), return_inverse=True, return_counts=True)
    middle = np.concatenate([places[:1], (places[1:] + places[:-1]) / 2, places[-1:]])
    return rows, along[rows], (np.diff(middle) / count)[index]


def frame(built: Built, band: Band, side: float, along: Array) -> tuple[Array, Array]:
    """(k, 3) unit tangents of the line and normals of the sheet at an edge."""
    step = 1e-4 * (band.sides[1] - band.sides[0])

    def point(across, along, n):
        s, t = (across, along) if band.along == "t" else (along, across)
        return built.sheet.place(*np.broadcast_arrays(s, t, n))

    toward = step if side == band.sides[0] else -step  # into the band: at a fold the sheet has no one normal
    at = np.full(len(along), side + toward)
    tangent = point(at, along + step, 0.0) - point(at, along - step, 0.0)
    normal = point(at, along, step) - point(at, along, -step)
    return tuple(v / np.linalg.norm(v, axis=1, keepdims=True) for v in (tangent, normal))


def _rigid_turn(built: Built, rows: Array, weight: Array, moved: Array) -> Array:
    """(3,) rotation of the best rigid motion of the nodes."""
    arm = built.mesh.points[rows]
    arm = arm - weight @ arm / weight.sum()
    inertia = weight @ np.einsum("ni,ni->n", arm, arm) * np.eye(3) - np.einsum("n,ni,nj->ij", weight, arm, arm)
    return np.linalg.solve(inertia, weight @ np.cross(arm, moved[rows]))


def _spins(built, rows, place, tangent, normal, moved, turned) -> Array:
    """(k, 3) rotation at each place along an edge: the nodes' own on shells; on solids how the fibre through the
    thickness leans, ω × ν = σ (ω·τ) − τ (ω·σ) with σ = τ × ν, which says nothing of the spin about ν (taken as 0)."""
    count = np.bincount(place)
    if not built.solid:
        return np.stack([np.bincount(place, turned[rows, i]) / count for i in range(3)], axis=1)
    height = built.where[rows, 2]
    height = height - (np.bincount(place, height) / count)[place]
    square = np.maximum(np.bincount(place, height**2), 1e-300)
    lean = np.stack([np.bincount(place, height * moved[rows, i]) / square for i in range(3)], axis=1)
    across = np.cross(tangent, normal)
    turn = [np.einsum("ki,ki->k", lean, v)[:, None] for v in (across, tangent)]
    return turn[0] * tangent - turn[1] * across


def _mean_tangent(built: Built, band: Band) -> Array:
    line = built.line(band)
    chord = line[-1] - line[0]
    return chord / np.linalg.norm(chord)


def _centres(built: Built) -> Array:
    (block,) = built.mesh.blocks
    return built.mesh.points[block.nodes].mean(axis=1)


def _distance(points: Array, line: Array) -> Array:
    """(k,) m to the nearest vertex of a finely divided line."""
    return np.linalg.norm(points[:, None] - line[None], axis=2).min(axis=1)

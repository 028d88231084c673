"""Where the points of a test lie on the mesh, and what its channels see of a shape (DESIGN §6 "Correlate").

Three ways. A stated placement is taken as it is. Named points (three at least, not on a line) are laid on their
places, the mirror image excluded (``similarity``), and the rest of the points then refines the placement by their
distance to the surface: points and places alike are known to a fraction of a per cent only, and all points together
know better than three. Without either, the points are laid onto the surface from every side (``placing``).

Nothing that a user must decide is decided here: where several placements fit equally well, where the points can
slide, or where a unit was mixed up, all is listed and ``settled`` is False.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import scipy.sparse as sp

from viewer.cells.locate import Places, interpolation, nearest
from viewer.errors import InputError, RefusedError
from viewer.insight.near_surface import NearSurface
from viewer.insight.placement_words import Axes, UnitSlip, difference, freedom, unit_slips
from viewer.insight.placing import FAR, SURE, Fit, moved, placement_of, search, with_symmetries
from viewer.insight.registration import GEOMETRY, NAMED, STATED, Alternative, Registration
from viewer.insight.similarity import diameter, on_a_line, similarity
from viewer.jobs import SILENT, Progress
from viewer.model.arrays import Array
from viewer.model.mesh import Mesh
from viewer.model.testset import Placement, TestSet
from viewer.model.written import GAP, digits

LEAST_POINTS = 8  # a placement has six unknowns; fewer distances than this cannot tell one from another
_LIKELY = 6.0  # twice the logarithm of 20: a placement less than 20 times less likely than the best fits equally well
_MISFIT = 0.1  # of the part's size: named points that miss their places by more are not those points
# Span of the points by that of the part: what needs no explanation, and what a mixed-up unit must lead to.
LEAST_COVER, MOST_COVER, _SLIP_COVER = 0.15, 1.15, 0.35
_MISPLACED = FAR / 2  # of the part's size: root mean square distance from which on points do not lie on the part
_SCALE = 1.25  # a scale of named points beyond this is no scatter


def register(
    test: TestSet,
    mesh: Mesh,
    *,
    landmarks: Sequence[tuple[str, Array]] = (),
    placement: Placement | None = None,
    progress: Progress = SILENT,
) -> Registration:
    """Lay the points of ``test`` onto ``mesh``.

    landmarks  (label of a point, place (3,) m in the mesh): three at least, not on a line
    placement  stands as it is, instead of the landmarks
    Raises ``RefusedError`` when there is too little to place by, ``InputError`` when landmarks cannot be right.
    """
    if not mesh.n_cells:
        raise RefusedError("a test cannot be laid onto a mesh without cells", do="give the design a mesh with cells")
    progress.tick("placing the test's points")
    surface = NearSurface(mesh)
    if placement is not None:
        return _finished(test, mesh, surface, placement, STATED)
    if landmarks:
        return _by_landmarks(test, mesh, surface, landmarks)
    return _by_geometry(test, mesh, surface, progress)


def _by_landmarks(
    test: TestSet, mesh: Mesh, surface: NearSurface, landmarks: Sequence[tuple[str, Array]]
) -> Registration:
    rows, places = _named(test, landmarks)
    own = test.points[rows]
    scaled = similarity(own, places, scaled=True)
    slip = None
    if not 1 / _SCALE < scaled.scale < _SCALE:
        slip = min(unit_slips(), key=lambda s: abs(np.log(s.factor / scaled.scale)))
        if abs(np.log(slip.factor / scaled.scale)) > np.log(_SCALE):
            raise InputError(
                f"the named points of test '{test.name}' do not fit their places",
                found=f"they would have to be {digits(scaled.scale, 3)} times as large: no mixed-up unit",
                do="check which points the landmarks name, and the test's length_unit",
            )
    factor = 1.0 if slip is None else slip.factor
    rigid = similarity(factor * own, places)
    _check_fit(test, mesh, factor * own, places, landmarks, rigid.error)
    fit = Fit(surface, factor * test.points, mesh.diagonal, rows, places)
    turns, shifts, _ = fit.refined(rigid.rotation[None], rigid.shift[None])
    found = placement_of(turns[0], shifts[0], factor)
    missed = np.linalg.norm(found.points(own) - places, axis=1)
    misses = tuple((label, float(m)) for (label, _), m in zip(landmarks, missed, strict=True))
    return _finished(test, mesh, surface, found, NAMED, pair_misses=misses, unit_slip=slip)


def _named(test: TestSet, landmarks: Sequence[tuple[str, Array]]) -> tuple[Array, Array]:
    unknown = [label for label, _ in landmarks if label not in test.labels]
    if unknown:
        raise InputError(
            f"landmarks name a point that test '{test.name}' has not",
            found=f"'{unknown[0]}'",
            expected=f"one of: {', '.join(test.labels[:30])}{', …' if len(test.labels) > 30 else ''}",
        )
    rows = np.array([test.row(label) for label, _ in landmarks])
    places = np.array([place for _, place in landmarks], float).reshape(-1, 3)
    if len(set(rows.tolist())) < len(rows):
        raise InputError(f"landmarks of test '{test.name}' name a point twice", do="keep one line for each point")
    for points, what in ((test.points[rows], "named points"), (places, "places that they name")):
        if on_a_line(points):
            lie = "lie on a line" if len(rows) >= 3 else f"are {len(rows)}"
            raise InputError(
                f"landmarks do not fix how test '{test.name}' lies on the mesh",
                found=f"the {what} {lie}",
                expected="three points or more that do not lie on a line",
                do="name another point, away from the line"
                if len(rows) >= 3
                else f"name {3 - len(rows)} more, or none: then the points are placed by the geometry",
            )
    return rows, places


def _check_fit(
    test: TestSet, mesh: Mesh, own: Array, places: Array, landmarks: Sequence[tuple[str, Array]], error: float
) -> None:
    """Refuse named points that no motion lays on their places."""
    limit = _MISFIT * mesh.diagonal
    if error <= limit**2:
        return
    if similarity(own, places, mirrored=True).error < 0.1 * error:
        raise InputError(
            f"the named points of test '{test.name}' fit their places as a mirror image only",
            do="check the handedness of the test's axes, or which points the landmarks name",
        )
    rigid = similarity(own, places)
    missed = np.linalg.norm(own @ rigid.rotation.T + rigid.shift - places, axis=1)
    raise InputError(
        f"the named points of test '{test.name}' cannot be laid on their places",
        found=f"point '{landmarks[int(missed.argmax())][0]}' misses its place by {_millimetres(float(missed.max()))}",
        expected=f"a miss of less than {_millimetres(limit)}",
        do="check which points the landmarks name, and where",
    )


def _by_geometry(test: TestSet, mesh: Mesh, surface: NearSurface, progress: Progress) -> Registration:
    if len(test.points) < LEAST_POINTS or on_a_line(test.points):
        few = len(test.points) < LEAST_POINTS
        raise RefusedError(
            f"test '{test.name}' cannot be placed by its geometry",
            found=f"{len(test.points)} points{'' if few else ' on a line'}",
            expected=f"{LEAST_POINTS} points or more that do not lie on a line",
            do="name landmarks (three points or more with their places), or state a placement",
        )
    slip, fit, found = _at_right_size(test, mesh, surface, progress)
    factor = 1.0 if slip is None else slip.factor
    if found[2][0] > _MISPLACED * mesh.diagonal:
        raise InputError(
            f"the points of test '{test.name}' do not lie on the mesh, however it is turned",
            found=f"{_millimetres(float(found[2][0]))} off on average (root mean square) in the best placement found",
            expected=f"less than {_millimetres(_MISPLACED * mesh.diagonal)}",
            do="check the test's length_unit and the design it is set beside, or name landmarks",
        )
    turns, shifts, cost = with_symmetries(fit, *found, lambda costs: _as_good(fit, costs))
    good = _as_good(fit, cost)
    first = placement_of(turns[0], shifts[0], factor)
    axes = Axes.of(surface.strewn(2_000)[0])
    others = []
    for turn, shift in zip(turns[good][1:], shifts[good][1:], strict=True):
        other = placement_of(turn, shift, factor)
        facts = difference(first, other, test.points, axes, mesh.diagonal)
        others.append(Alternative(other, _rms(fit, turn, shift), facts))
    free = _free(fit, turns[0], shifts[0], float(cost[0]), axes)
    return _finished(test, mesh, surface, first, GEOMETRY, alternatives=tuple(others), free=free, unit_slip=slip)


_Poses = tuple[Array, Array, Array]


def _at_right_size(
    test: TestSet, mesh: Mesh, surface: NearSurface, progress: Progress
) -> tuple[UnitSlip | None, Fit, _Poses]:
    """The placements at the points' own size, or where that cannot be at the size that a mixed-up unit explains."""
    none = (np.empty(0, int), np.empty((0, 3)))
    whole, own = diameter(surface.corners.reshape(-1, 3)), diameter(test.points)
    ratio = own / whole
    tried = []
    for slip in unit_slips() if not LEAST_COVER <= ratio <= MOST_COVER else []:
        if _SLIP_COVER <= ratio * slip.factor <= MOST_COVER:
            fit = Fit(surface, slip.factor * test.points, mesh.diagonal, *none)
            found = search(fit, progress)
            # by the points' own size: a small cloud fits anywhere
            tried.append((float(found[2][0]) / (slip.factor * own), slip, fit, found))
    best = min(tried, key=lambda t: t[0], default=None)
    if best is not None and best[0] < FAR / 2:
        return best[1:]
    if ratio > MOST_COVER:
        raise InputError(
            f"test '{test.name}' does not fit the mesh",
            found=f"points that span {digits(own)}{GAP}m, a part of {digits(whole)}{GAP}m",
            expected="points on the part",
            do="check the test's length_unit and the design it is set beside",
        )
    fit = Fit(surface, test.points, mesh.diagonal, *none)
    return None, fit, search(fit, progress)


def _as_good(fit: Fit, cost: Array) -> Array:
    """(n,) bool: poses that fit as well as the best one, by the ratio of likelihoods. Scatter is taken as ``SURE`` of
    the part's size, more where the best fit leaves more."""
    count = len(fit.points)
    least = float(np.min(cost))
    scatter = max((SURE * fit.size) ** 2, least**2 * count / max(count - 6, 1))
    return count * (cost**2 - least**2) <= _LIKELY * scatter


def _free(fit: Fit, turn: Array, shift: Array, cost: float, axes: Axes) -> tuple[str, ...]:
    """What can be changed by ``FAR`` (or 10°) to one side or the other without fitting worse."""
    ways, middle, arm = fit.weakest(turn, shift)
    words = []
    for way in ways[:3]:  # the weakest three
        far = min(FAR * fit.size, np.radians(10.0) * arm / max(float(np.linalg.norm(way[:3])), 1e-9))
        both = np.outer([1.0, -1.0], way * far)
        poses = moved(
            np.repeat(turn[None], 2, 0), np.repeat(shift[None], 2, 0), middle[None], both[:, :3] / arm, both[:, 3:]
        )
        if _as_good(fit, np.array([cost, *fit.cost(*poses)]))[1:].any():
            words.append(freedom(way, arm, axes))
    return tuple(dict.fromkeys(words))


def _rms(fit: Fit, turn: Array, shift: Array) -> float:
    distance = fit.away(fit.placed(turn[None], shift[None]))[0][0]
    return _on_body(distance, fit.size)


def _on_body(distance: Array, size: float) -> float:
    near = distance[distance <= FAR * size]
    return float(np.sqrt(np.mean((near if len(near) else distance) ** 2)))


def _finished(
    test: TestSet, mesh: Mesh, surface: NearSurface, placement: Placement, how: str, **more: Any
) -> Registration:
    points, directions = placement.points(test.points), placement.directions(test.directions)
    distances, _, triangle = surface.closest(points)
    places = nearest([(b.kind, b.nodes) for b in mesh.blocks], mesh.points, points)
    gone = places.distance > FAR * mesh.diagonal
    normals = surface.normals[triangle][test.sensor]
    cosine = np.abs(np.einsum("ci,ci->c", normals, directions))
    angles = np.where(np.any(normals, axis=1), np.degrees(np.arccos(np.clip(cosine, 0, 1))), np.nan)
    settled = not any(more.get(open_question) for open_question in ("alternatives", "free", "unit_slip"))
    return Registration(
        test,
        placement,
        how,
        mesh.diagonal,
        _on_body(distances, mesh.diagonal),
        distances,
        places,
        angles,
        tuple(test.labels[p] for p in np.flatnonzero(gone)),
        _sensing(test, mesh, places, directions),
        ~gone[test.sensor] & settled,
        **more,
    )


def _sensing(test: TestSet, mesh: Mesh, places: Places, directions: Array) -> sp.csr_array:
    """(c, 3 n_nodes): the element's shape functions at each channel's point, along its direction."""
    carry = sp.lil_array((len(test.points), mesh.n_nodes))
    for mine, nodes, weights in interpolation([(b.kind, b.nodes) for b in mesh.blocks], places):
        for row, at, values in zip(mine, nodes, weights, strict=True):
            carry[row, at] = values
    at_sensors = sp.csr_array(carry)[test.sensor].tocoo()
    row, node = at_sensors.coords
    data = (at_sensors.data[:, None] * directions[row]).ravel()
    columns = (3 * node[:, None] + np.arange(3)).ravel()
    return sp.csr_array((data, (np.repeat(row, 3), columns)), shape=(test.n_channels, 3 * mesh.n_nodes))


def _millimetres(value: float) -> str:
    return f"{digits(1000 * value)}{GAP}mm"

"""The rigid motion, or the similarity, that brings named points closest to their partners.

Kabsch W., Acta Cryst. A32 (1976) 922 (rotation); Umeyama S., IEEE Trans. Pattern Anal. Mach. Intell. 13 (1991) 376
(scale, and never a mirror image).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.spatial.distance import pdist

from viewer.model.arrays import Array

ON_A_LINE = 0.02  # width of a set of points by its length up to which it counts as a line: its turn is then a guess


@dataclass(frozen=True, eq=False)
class Similarity:
    """target ≈ scale · rotation · source + shift; ``error`` is the mean squared distance that remains."""

    rotation: Array  # (d, d), determinant +1
    shift: Array  # (d,)
    scale: float
    error: float


def similarity(source: Array, target: Array, *, scaled: bool = False, mirrored: bool = False) -> Similarity:
    """The best fit of ``source`` (n, d) to ``target`` (n, d), point by point, in the sense of least squares.

    scaled    find the scale too; else it is 1
    mirrored  the best of all mirror images instead, to tell whether axes are left-handed: then determinant −1
    The points must not coincide; for a unique turn they must span d − 1 dimensions, which is left to the caller.
    """
    source, target = np.asarray(source, float), np.asarray(target, float)
    middle, aim = source.mean(axis=0), target.mean(axis=0)
    own, other = source - middle, target - aim
    left, sizes, right = np.linalg.svd(other.T @ own / len(own))
    keep = np.ones(len(sizes))
    if (np.linalg.det(left) * np.linalg.det(right) < 0) != mirrored:
        keep[-1] = -1.0
    rotation = (left * keep) @ right
    scale = float(sizes @ keep / np.mean(np.sum(own**2, axis=1))) if scaled else 1.0
    rest = other - scale * own @ rotation.T
    return Similarity(rotation, aim - scale * rotation @ middle, scale, float(np.mean(np.sum(rest**2, axis=1))))


def widths(points: Array) -> Array:
    """(d,) standard deviations of ``points`` (n, d) along their principal axes, largest first."""
    points = np.asarray(points, float)
    return np.linalg.svd(points - points.mean(axis=0), compute_uv=False) / np.sqrt(len(points))


def on_a_line(points: Array) -> bool:
    """Whether ``points`` (n, 3) are too few or too slim a set to fix a turn in space."""
    if len(points) < 3:
        return True
    along = widths(points)
    return bool(along[1] <= ON_A_LINE * along[0])


def diameter(points: Array) -> float:
    """Largest distance between two of ``points`` (n, 3): from each end to the point farthest from it, until that
    gains nothing. Exact for a few hundred points; for more a lower bound that is hardly ever missed by much."""
    points = np.asarray(points, float)
    if len(points) <= 300:
        return float(pdist(points).max(initial=0.0))
    at, best = points[0], 0.0
    while True:
        gaps = np.linalg.norm(points - at, axis=1)
        if gaps.max() <= best * (1 + 1e-12):
            return best
        at, best = points[int(gaps.argmax())], float(gaps.max())

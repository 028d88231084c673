"""The centre line of a band: a straight line, or an arc whose radius may vary along it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from viewer.model.arrays import Array


@dataclass(frozen=True, eq=False)
class Line:
    """Straight, through ``centre`` along the unit vector ``axis``."""

    centre: Array
    axis: Array

    kind = "line"

    def along(self, points: Array) -> Array:
        """(n,) m from the centre."""
        return (points - self.centre) @ self.axis

    def foot(self, along: Array) -> Array:
        """(n, 3) points on the line."""
        return self.centre + np.asarray(along)[:, None] * self.axis

    def tangent(self, along: Array) -> Array:
        """(n, 3) unit vectors."""
        return np.broadcast_to(self.axis, (len(along), 3))


@dataclass(frozen=True, eq=False)
class Arc:
    """About ``centre`` in the plane of ``first`` and ``second``; radius a polynomial of the angle from ``first``.

    ``along`` counts m at the mean radius from the middle of the arc.
    """

    centre: Array
    first: Array
    second: Array
    radius: Array  # coefficients, highest first
    mean: float

    kind = "curve"

    def along(self, points: Array) -> Array:
        arm = points - self.centre
        return self.mean * np.arctan2(arm @ self.second, arm @ self.first)

    def foot(self, along: Array) -> Array:
        angle = np.asarray(along) / self.mean
        spoke = np.cos(angle)[:, None] * self.first + np.sin(angle)[:, None] * self.second
        return self.centre + np.polyval(self.radius, angle)[:, None] * spoke

    def spoke(self, along: Array) -> Array:
        """(n, 3) unit vectors away from the centre."""
        angle = np.asarray(along)[:, None] / self.mean
        return np.cos(angle) * self.first + np.sin(angle) * self.second

    def tangent(self, along: Array) -> Array:
        angle = np.asarray(along) / self.mean
        spoke = np.cos(angle)[:, None] * self.first + np.sin(angle)[:, None] * self.second
        round_ = -np.sin(angle)[:, None] * self.first + np.cos(angle)[:, None] * self.second
        slope = np.polyval(self.radius, angle)[:, None] * round_
        slope = slope + np.polyval(np.polyder(self.radius), angle)[:, None] * spoke
        return slope / np.linalg.norm(slope, axis=1, keepdims=True)


def principal(points: Array, weights: Array) -> tuple[Array, Array, Array]:
    """Weighted centroid (3,), standard deviations (3,) falling, and their directions (rows)."""
    share = weights / weights.sum()
    centre = share @ points
    arm = points - centre
    values, vectors = np.linalg.eigh(np.einsum("n,ni,nj->ij", share, arm, arm))
    return centre, np.sqrt(np.maximum(values[::-1], 0)), vectors[:, ::-1].T


def fit_arc(points: Array, weights: Array) -> Arc | None:
    """The arc through weighted points, None when they do not lie on one: least-squares circle in their plane."""
    centre, spread, directions = principal(points, weights)
    if spread[1] < 1e-9 * spread[0] or len(points) < 8:
        return None
    flat = (points - centre) @ directions[:2].T
    root = np.sqrt(weights / weights.sum())
    system = np.column_stack([2 * flat, np.ones(len(flat))])
    solution = np.linalg.lstsq(system * root[:, None], (flat**2).sum(axis=1) * root, rcond=None)[0]
    middle = solution[:2]
    radius = float(np.sqrt(max(solution[2] + middle @ middle, 0.0)))
    if not np.isfinite(radius) or radius == 0:
        return None
    arm = flat - middle
    mean = (root**2) @ (arm / np.maximum(np.linalg.norm(arm, axis=1, keepdims=True), 1e-300))
    if np.linalg.norm(mean) < 1e-6:
        mean = np.array([1.0, 0.0])
    first2 = mean / np.linalg.norm(mean)
    second2 = np.array([-first2[1], first2[0]])
    angle = np.arctan2(arm @ second2, arm @ first2)
    degree = 3 if len(points) > 40 and np.ptp(angle) < 5 else 0
    fitted = np.polyfit(angle, np.linalg.norm(arm, axis=1), degree, w=root)
    return Arc(centre + middle @ directions[:2], first2 @ directions[:2], second2 @ directions[:2], fitted, radius)

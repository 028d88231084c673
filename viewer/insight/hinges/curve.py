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


_BINS = 12  # places along an arc, whose means are fitted: scatter across the band would pull the circle in
_ROUNDS = 2


def fit_arc(points: Array, weights: Array) -> Arc | None:
    """The arc through weighted points, None when they do not lie on one: least-squares circle in their plane, through
    the points and then through their means from place to place along it; the radius may vary as a cubic."""
    centre, spread, directions = principal(points, weights)
    if spread[1] < 1e-9 * spread[0] or len(points) < 8:
        return None
    flat = (points - centre) @ directions[:2].T
    spots, mass = flat, weights
    for _ in range(1 + _ROUNDS):
        middle = _circle(spots, mass)
        if middle is None:
            return None
        arm = flat - middle
        mean = weights @ (arm / np.maximum(np.linalg.norm(arm, axis=1, keepdims=True), 1e-300))
        first = mean / np.linalg.norm(mean) if np.linalg.norm(mean) > 1e-6 * weights.sum() else np.array([1.0, 0.0])
        second = np.array([-first[1], first[0]])
        angle = np.arctan2(arm @ second, arm @ first)
        place = np.minimum((angle - angle.min()) / max(np.ptp(angle), 1e-300) * _BINS, _BINS - 1).astype(int)
        mass = np.bincount(place, weights, minlength=_BINS)
        full = mass > 0
        spots = np.stack([np.bincount(place, weights * c, minlength=_BINS)[full] for c in flat.T], axis=1)
        mass = mass[full]
        spots = spots / mass[:, None]
    arm = spots - middle
    angles, radii = np.arctan2(arm @ second, arm @ first), np.linalg.norm(arm, axis=1)
    degree = 3 if len(angles) == _BINS and np.ptp(angle) < 5 else 0
    return Arc(
        centre + middle @ directions[:2],
        first @ directions[:2],
        second @ directions[:2],
        np.polyfit(angles, radii, degree, w=np.sqrt(mass)),
        float(np.average(radii, weights=mass)),
    )


def _circle(spots: Array, mass: Array) -> Array | None:
    """(2,) centre of the least-squares circle."""
    if len(spots) < 3:
        return None
    root = np.sqrt(mass / mass.sum())[:, None]
    system = np.column_stack([2 * spots, np.ones(len(spots))])
    solution = np.linalg.lstsq(system * root, (spots**2).sum(axis=1) * root[:, 0], rcond=None)[0]
    return solution[:2] if np.isfinite(solution).all() else None

"""The best rigid motion of a footprint of nodes: what carries lumped masses and functional points.

The motion is the least-squares fit of a small rigid motion to the nodal translations, all nodes weighing the
same. It adds no stiffness: the footprint deforms freely, the body follows its mean. (In the trade: an
interpolation or distributing constraint, as opposed to a rigid link.)
"""

from __future__ import annotations

from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike

from viewer.model.arrays import Array, frozen

_FLAT = 1e-6  # singular value, relative to the largest, below which a rotation cannot be seen


def cross_matrix(arms: ArrayLike) -> Array:
    """(…, 3, 3) matrices S with S v = arm × v, for arms (…, 3)."""
    x, y, z = np.moveaxis(np.asarray(arms, float), -1, 0)
    zero = np.zeros_like(x)
    return np.stack([zero, -z, y, z, zero, -x, -y, x, zero], axis=-1).reshape(*x.shape, 3, 3)


def rigid_fields(points: ArrayLike, about: ArrayLike) -> Array:
    """(k, 3, 6) translations of the points under unit motions ux uy uz rx ry rz of a body about ``about``."""
    points = np.asarray(points, float)
    fields = np.zeros((len(points), 3, 6))
    fields[:, :, :3] = np.eye(3)
    fields[:, :, 3:] = -cross_matrix(points - np.asarray(about, float))  # ω × arm = −arm × ω
    return fields


class RigidPatch:
    """A footprint of ``points`` (k, 3), m, and the ``position`` (3,), m, whose motion is asked (None: centroid).

    rank      how many of the six rigid motions the translations show: 6; 5 for points in a line (the spin about
              it is unseen); 3 for a single point (no rotation is seen)
    seen_axes (3, rank − 3) orthonormal axes of the rotations that the translations show
    unseen    the same in words, "" when everything is seen
    operator  (6, 3k) motion (ux uy uz rx ry rz) about ``position`` from the nodal translations, node by node.
              Unseen rotations come out as zero, by the pseudo-inverse.
    operator_with_rotations
              (6, 6k) the same from translations *and* rotations, per node ux uy uz rx ry rz: what the
              translations cannot show is taken from the mean of the nodal rotations, so that a single shell or
              beam node carries a body through its own rotation and a line of nodes passes on its spin.
              Rotations that the translations show are not averaged in.
    """

    def __init__(self, points: ArrayLike, position: ArrayLike | None = None) -> None:
        self.points = frozen(points, float, shape=(None, 3))
        if len(self.points) == 0:
            raise ValueError("a footprint needs at least one point")
        centroid = self.points.mean(axis=0)
        self.position = frozen(centroid if position is None else position, float, shape=(3,))
        arms = self.points - centroid
        # Rotations are scaled by the footprint's radius, so that all six singular values are comparable.
        radius = float(np.sqrt((arms**2).sum(axis=1).mean()))
        noise = 1e-12 * float(np.abs(self.points).max(initial=0.0))
        seen = np.zeros(3, bool)
        axes = np.eye(3)
        if radius > noise:
            turning = np.einsum("kij,kil->jl", cross_matrix(arms), cross_matrix(arms)) / (len(arms) * radius**2)
            strength, axes = np.linalg.eigh(turning)  # Σ|ω × arm|²: zero for a spin about a line of points
            seen = strength > _FLAT**2 * strength[-1]
        self.seen_axes = axes[:, seen]
        self.rank = 3 + int(seen.sum())
        self._arms, self._centroid = arms, centroid

    @property
    def unseen(self) -> str:
        return {6: "", 5: "the points lie in a line: the spin about it is not seen"}.get(
            self.rank, "a single point: no rotation is seen"
        )

    @cached_property
    def operator(self) -> Array:
        count = len(self.points)
        translate = np.tile(np.eye(3) / count, count)
        rotate = np.zeros((3, 3 * count))
        if self.rank > 3:
            fields = -cross_matrix(self._arms).reshape(-1, 3) @ self.seen_axes  # (3k, seen)
            rotate = self.seen_axes @ np.linalg.solve(fields.T @ fields, fields.T)
        return frozen(self._about_position(translate, rotate))

    @cached_property
    def operator_with_rotations(self) -> Array:
        count = len(self.points)
        from_translations = self._about_centroid(self.operator)
        whole = np.zeros((6, count, 6))
        whole[:, :, :3] = from_translations.reshape(6, count, 3)
        blind = np.eye(3) - self.seen_axes @ self.seen_axes.T
        whole[3:, :, 3:] = blind[:, None, :] / count
        flat = whole.reshape(6, 6 * count)
        return frozen(self._about_position(flat[:3], flat[3:]))

    def motion(self, translations: ArrayLike, rotations: ArrayLike | None = None) -> Array:
        """(…, 6) rigid motion about ``position`` from nodal translations (…, k, 3), m, real or complex.

        ``rotations`` (…, k, 3), rad, when the nodes have them: used for what the translations cannot show.
        """
        moved = np.asarray(translations)
        if rotations is None:
            return moved.reshape(*moved.shape[:-2], -1) @ self.operator.T
        both = np.concatenate([moved, np.asarray(rotations)], axis=-1)
        return both.reshape(*both.shape[:-2], -1) @ self.operator_with_rotations.T

    def _about_position(self, translate: Array, rotate: Array) -> Array:
        arm = cross_matrix(self.position - self._centroid)
        return np.concatenate([translate - arm @ rotate, rotate])

    def _about_centroid(self, operator: Array) -> Array:
        arm = cross_matrix(self.position - self._centroid)
        return np.concatenate([operator[:3] + arm @ operator[3:], operator[3:]])

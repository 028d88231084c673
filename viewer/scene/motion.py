"""Where nodes are at a phase. Shapes are real (standing) or complex (travelling); see viewer.scene.picture."""

from __future__ import annotations

import numpy as np

from viewer.model.arrays import Array


def is_standing(shape: Array) -> bool:
    """True when all nodes move in phase along the real part: the second half of a cycle mirrors the first."""
    return not np.iscomplexobj(shape) or not np.any(np.imag(shape))


def displacement(shape: Array, factor: float, phase: float) -> Array:
    """Drawn displacement in metres at ``phase`` rad: ``factor * Re(shape * exp(1j * phase))``, like ``shape``."""
    moved = np.real(shape) * np.asarray(factor * np.cos(phase), np.real(shape).dtype)
    if np.iscomplexobj(shape):
        moved -= shape.imag * np.asarray(factor * np.sin(phase), shape.imag.dtype)
    return moved


def positions(points: Array, shape: Array, factor: float, phase: float) -> Array:
    """Drawn positions (n, 3) in metres of nodes at rest at ``points``."""
    return points + displacement(shape, factor, phase)


def swing(shape: Array, direction: Array) -> Array:
    """(n,) largest motion over the cycle along a unit ``direction``, in units of ``shape``: exact."""
    return np.abs(shape @ np.asarray(direction))

"""A shape over one cycle of vibration: u(p) = Re(shape · exp(ip)), shapes real or complex."""

from __future__ import annotations

import numpy as np

from viewer.model.arrays import Array


def cycle_peaks(vectors: Array) -> Array:
    """(n,) largest |Re(v·exp(ip))| over the cycle of each row of a real or complex (n, 3) field.

    For v = a + ib: max² = (|a|² + |b|²)/2 + √((|a|² − |b|²)²/4 + (a·b)²), the major axis of the ellipse.
    """
    if not np.iscomplexobj(vectors):
        return np.linalg.norm(vectors, axis=1)
    a, b = vectors.real, vectors.imag
    aa, bb, ab = (a * a).sum(1), (b * b).sum(1), (a * b).sum(1)
    return np.sqrt((aa + bb) / 2 + np.hypot((aa - bb) / 2, ab))


def steadiest_turn(shape: Array) -> complex:
    """The unit complex factor that brings a shape as close to real as it gets: its largest swing at phase 0.

    Σφ² of the turned shape is real and positive, which maximises Σ Re(φ)². 1 for a real shape.
    """
    if not np.iscomplexobj(shape):
        return 1.0 + 0.0j
    total = complex((shape * shape).sum())
    return complex(np.exp(-0.5j * np.angle(total))) if abs(total) > 0 else 1.0 + 0.0j

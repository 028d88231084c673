"""A shape over one cycle of vibration: u(p) = Re(shape · exp(ip)), shapes real or complex."""

from __future__ import annotations

import numpy as np

from viewer.model.arrays import Array


def cycle_peaks(vectors: Array) -> Array:
    """(n,) largest |Re(v·exp(ip))| over the cycle of each row of a real or complex (n, 3) field: exact.

    |Re(v·exp(ip))|² = ½ Σ|v|² + ½ Re(exp(2ip) Σv²), whose largest value over p is ½ (Σ|v|² + |Σv²|): the long half
    axis of the row's ellipse.
    """
    total = np.sum(np.abs(vectors) ** 2, axis=-1)
    return np.sqrt(0.5 * (total + np.abs(np.sum(vectors * vectors, axis=-1))))


def steadiest_turn(shape: Array) -> complex:
    """The unit complex factor that brings a shape as close to real as it gets: its largest swing at phase 0.

    Σφ² of the turned shape is real and positive, which maximises Σ Re(φ)². 1 for a real shape.
    """
    if not np.iscomplexobj(shape):
        return 1.0 + 0.0j
    total = complex((shape * shape).sum())
    return complex(np.exp(-0.5j * np.angle(total))) if abs(total) > 0 else 1.0 + 0.0j

"""How far a measured shape moves all at once: collinearity, mean phase deviation, and the phase it is best seen at.

In the complex plane the components of a shape whose points all move in phase or in counter-phase lie on a straight
line through zero. Damping that is unevenly spread, or poor measurements, scatter them. Shapes are rows (modes,
coordinates).
"""

from __future__ import annotations

import numpy as np

from viewer.model.arrays import Array


def collinearity(shapes: Array) -> Array:
    """(modes,) modal phase collinearity: 1 when all components lie on one line, 0 when none is preferred.

    ((Sxx − Syy)² + 4 Sxy²) / (Sxx + Syy)² of real parts x and imaginary parts y, no mean taken off. Juang J.-N.,
    Pappa R.S., J. Guid. Control Dyn. 8 (1985) 620; Pappa R.S. et al., J. Guid. Control Dyn. 16 (1993) 852. A shape of
    zeros has 1.
    """
    shapes = np.atleast_2d(shapes)
    # |Σ φ²|² / (Σ|φ|²)² is the same, and needs no parts
    whole = (np.abs(shapes) ** 2).sum(axis=1) ** 2
    line = np.abs((shapes**2).sum(axis=1)) ** 2
    return np.divide(line, whole, out=np.ones(len(shapes)), where=whole > 0)


def phase_of(shapes: Array) -> Array:
    """(modes,) rad in (−π/2, π/2]: direction of the line through zero that lies closest to the components, by the
    first right singular vector of the columns real and imaginary part."""
    shapes = np.atleast_2d(shapes)
    return 0.5 * np.angle((shapes**2).sum(axis=1))  # the same direction in closed form


def phase_deviation_deg(shapes: Array) -> Array:
    """(modes,) mean phase deviation, degrees: angle of the components from that line, weighted by their amplitude.

    Reynders E., Houbrechts J., De Roeck G., Mech. Syst. Signal Process. 29 (2012) 228.
    """
    shapes = np.atleast_2d(shapes)
    turned = shapes * np.exp(-1j * phase_of(shapes))[:, None]
    size = np.abs(turned)
    away = np.arctan2(np.abs(turned.imag), np.abs(turned.real))
    whole = size.sum(axis=1)
    mean = np.divide((size * away).sum(axis=1), whole, out=np.zeros(len(shapes)), where=whole > 0)
    return np.degrees(mean)


def turned_real(shapes: Array) -> Array:
    """(modes, coordinates) complex: the shapes turned so that the line of :func:`phase_of` is the real axis and the
    component with the largest real part is positive. Real shapes stay real, up to their sign."""
    shapes = np.atleast_2d(shapes)
    turned = shapes if not np.iscomplexobj(shapes) else shapes * np.exp(-1j * phase_of(shapes))[:, None]
    largest = np.argmax(np.abs(turned.real), axis=1)
    signs = np.where(turned.real[np.arange(len(turned)), largest] < 0, -1.0, 1.0)
    return turned * signs[:, None]

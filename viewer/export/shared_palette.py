"""One palette of 256 colours for all frames of a loop, so that resting pixels rest and no frame brings its own.

Fast octree (Pillow) gives the first guess and keeps small marks; a few Lloyd steps (S. P. Lloyd, "Least squares
quantization in PCM", IEEE Trans. Inf. Theory 28, 1982) in OKLab then move the colours to where the frames have
theirs: that nearly halves the error of smooth shading, which shows as bands.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from PIL import Image
from scipy.spatial import cKDTree

from viewer.model.arrays import Array
from viewer.scene.palette import from_oklab, to_oklab

COLOURS = 256
STEPS = 8


class SharedPalette:
    """A palette made for ``images`` ((h, w, 3) uint8, all alike in size). ``colours`` is (≤ 256, 3) uint8."""

    def __init__(self, images: Sequence[Array]) -> None:
        guess = Image.fromarray(np.concatenate(images)).quantize(
            COLOURS, method=Image.Quantize.FASTOCTREE, dither=Image.Dither.NONE
        )
        start = np.array(guess.getpalette(), np.uint8).reshape(-1, 3)[:COLOURS]
        packed, count = np.unique(np.concatenate([_packed(image) for image in images]), return_counts=True)
        self.colours = _refined(start, _unpacked(packed), count)
        self._tree = cKDTree(to_oklab(self.colours / 255))
        self._bytes = self.colours.tobytes()

    def index(self, image: Array) -> Image.Image:
        """``image`` in the palette's colours, each pixel the nearest one in OKLab, without dithering."""
        packed, place = np.unique(_packed(image), return_inverse=True)
        nearest = self._tree.query(to_oklab(_unpacked(packed) / 255))[1].astype(np.uint8)
        held = Image.fromarray(nearest[place].reshape(image.shape[:2]))
        held.putpalette(self._bytes)
        return held


def _refined(colours: Array, found: Array, count: Array) -> Array:
    """Colours after Lloyd steps over the ``found`` colours (n, 3) uint8.

    Weights are square roots of counts, so that a large quiet background does not take the palette from what moves.
    A colour that makes up most of its group (background, ink, a token) is kept as it is.
    """
    lab, weight = to_oklab(found / 255), np.sqrt(count)
    centre = to_oklab(colours / 255)
    for _ in range(STEPS):
        group = cKDTree(centre).query(lab)[1]
        total = np.bincount(group, weight, minlength=len(centre))
        mean = np.stack([np.bincount(group, weight * part, minlength=len(centre)) for part in lab.T], axis=1)
        centre = np.where(total[:, None] > 0, mean / np.maximum(total, 1e-12)[:, None], centre)
    refined = np.round(from_oklab(centre) * 255).astype(np.uint8)
    group = cKDTree(centre).query(lab)[1]
    main = 2 * count > np.bincount(group, count, minlength=len(centre))[group]
    refined[group[main]] = found[main]
    return refined


def _packed(image: Array) -> Array:
    """(n,) int32, one number for each pixel's colour."""
    wide = image.reshape(-1, 3).astype(np.int32)
    return (wide[:, 0] << 16) | (wide[:, 1] << 8) | wide[:, 2]


def _unpacked(packed: Array) -> Array:
    return np.stack([packed >> 16, (packed >> 8) & 255, packed & 255], axis=1).astype(np.uint8)

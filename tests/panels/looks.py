"""Screenshots compared with accepted ones, tolerantly: what is meant to be seen, not which face the system has.

Both pictures are reduced to a quarter by their mean, so that letters become grey and edges soft. Accepted anew with
HINGELIGHT_ACCEPT=1, after looking at them.
"""

from __future__ import annotations

import os
from pathlib import Path

import numpy as np
from PIL import Image, ImageFilter

ACCEPTED = Path(__file__).parent / "accepted"
REDUCED = 4
MEAN, FAR, FAR_SHARE = 3.0, 48.0, 0.02  # grey levels of 255: mean difference; share of places that may be farther off


def look(window) -> np.ndarray:
    """(h, w, 3) uint8 of what the window shows, reduced."""
    window.repaint()
    image = window.grab().toImage().convertToFormat(window.canvas.image.Format.Format_RGB888)
    raw = np.frombuffer(image.constBits(), np.uint8).reshape(image.height(), image.bytesPerLine())
    whole = raw[:, : 3 * image.width()].reshape(image.height(), image.width(), 3)
    return np.asarray(Image.fromarray(np.ascontiguousarray(whole)).reduce(REDUCED))


def difference(one: np.ndarray, two: np.ndarray) -> tuple[float, float]:
    """Mean difference in grey levels, and the share of places that differ by more than ``FAR``; both pictures
    softened first. Unequal sizes differ wholly."""
    if one.shape != two.shape:
        return 255.0, 1.0
    soft = [
        np.asarray(Image.fromarray(image).filter(ImageFilter.GaussianBlur(1.5)), np.int16) for image in (one, two)
    ]
    away = np.abs(soft[0] - soft[1]).max(axis=2)
    return float(away.mean()), float((away > FAR).mean())


def check_look(window, name: str, kept: Path) -> None:
    """The window looks as accepted under ``name``; a picture that does not is left in ``kept``."""
    found, path = look(window), ACCEPTED / f"{name}.png"
    if os.environ.get("HINGELIGHT_ACCEPT"):
        ACCEPTED.mkdir(exist_ok=True)
        Image.fromarray(found).save(path, optimize=True)
        return
    mean, share = difference(found, np.asarray(Image.open(path).convert("RGB")))
    if mean > MEAN or share > FAR_SHARE:
        Image.fromarray(found).save(kept / f"{name}.png")
        raise AssertionError(f"{name}: mean difference {mean:.1f}, {share:.1%} far off; seen: {kept / name}.png")

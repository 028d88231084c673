"""How figures are written in pictures: one or two significant digits, engineering units, spaces that do not break."""

from __future__ import annotations

from math import isfinite

from viewer.model.written import GAP, THIN, change, digits, hertz

__all__ = ["GAP", "THIN", "change", "digits", "hertz", "kilograms", "length", "times"]

_LENGTHS = (("pm", 1e-12), ("nm", 1e-9), ("µm", 1e-6), ("mm", 1e-3), ("m", 1.0))


def length(metres: float, significant: int = 2, trim: bool = False) -> str:
    """A length in the unit that leaves one to three digits before the point: 3.9e-6 → "3.9 µm"."""
    rounded = float(f"{metres:.{significant - 1}e}") if isfinite(metres) else metres
    name, unit = _LENGTHS[0] if rounded else ("mm", 1e-3)
    for name_, unit_ in _LENGTHS:
        if abs(rounded) >= unit_ * (1 - 1e-9):
            name, unit = name_, unit_
    return f"{digits(metres / unit, significant, trim)}{GAP}{name}"


def times(magnification: float, significant: int = 2) -> str:
    """A magnification: 8342 → "8 300×"."""
    return f"{digits(magnification, significant)}×"


def kilograms(mass: float) -> str:
    """A mass in g below one kilogram, in kg from there on."""
    if abs(mass) < 0.9995:
        return f"{digits(1e3 * mass, 3, trim=True)}{GAP}g"
    return f"{digits(mass, 3, trim=True)}{GAP}kg"

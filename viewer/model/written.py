"""How figures are written: one or two significant digits, never powers of ten, spaces that do not break."""

from __future__ import annotations

from math import floor, isfinite, log10

THIN = "\u202f"  # narrow no-break space between groups of three digits
GAP = "\u00a0"  # no-break space between a figure and its unit


def digits(value: float, significant: int = 2, trim: bool = False) -> str:
    """``value`` rounded to ``significant`` digits, thousands set apart: 8342 → "8 300", 0.000612 → "0.00061".

    ``trim`` drops zeros after the decimal point, for figures that are stated, not measured: 8.0 → "8".
    """
    if not isfinite(value):
        return "unknown"
    if value == 0:
        return "0"
    rounded = float(f"{value:.{significant - 1}e}")
    places = significant - 1 - floor(log10(abs(rounded)))
    text = f"{rounded:,.{max(places, 0)}f}".replace(",", THIN)
    return text.rstrip("0").rstrip(".") if trim and "." in text else text


def hertz(freq_hz: float) -> str:
    """A frequency to a tenth of a hertz, whole hertz from 1000 on, two decimals below 10."""
    if abs(freq_hz) < 0.01:
        return f"below 0.01{GAP}Hz"
    places = 0 if freq_hz >= 999.95 else 1 if freq_hz >= 9.995 else 2
    return f"{freq_hz:,.{places}f}".replace(",", THIN) + f"{GAP}Hz"


def change(new: float, old: float) -> str:
    """The relative change from ``old`` to ``new`` in percent with its sign: "+23 %"; "" when ``old`` is zero."""
    if old == 0 or not isfinite(new / old):
        return ""
    percent = 100 * (new / old - 1)
    if abs(percent) < 0.05:
        return f"±0{GAP}%"
    return f"{'+' if percent > 0 else '−'}{digits(abs(percent), 2 if abs(percent) >= 1 else 1)}{GAP}%"

"""Element descriptors of data set 2412 and our kinds of cells."""

from __future__ import annotations

_SURFACE = {3: "tri3", 6: "tri6", 4: "quad4", 8: "quad8"}
_LINE = {2: "line2", 3: "line3"}
_SURFACES = range(41, 80), range(91, 100)  # plane stress and strain, plates, membranes; thin shells
_LINES = (11, 21, 22, 23, 24)  # rods and beams
_SOLIDS = {
    (111, 4): "tet4", (118, 10): "tet10", (112, 6): "wedge6", (113, 15): "wedge15", (115, 8): "hex8",
    (116, 20): "hex20",
}  # fmt: skip
# What is written: beams, thin shells, solids.
DESCRIPTORS = {
    "line2": 21, "line3": 24, "tri3": 91, "tri6": 92, "quad4": 94, "quad8": 95, "tet4": 111, "tet10": 118,
    "wedge6": 112, "wedge15": 113, "hex8": 115, "hex20": 116,
}  # fmt: skip
# Ours[i] = the file's[p[i]]: mid-side nodes stand between their corners there. Checked by edge midpoints.
ORDER = {
    "line3": (0, 2, 1),
    "tri6": (0, 2, 4, 1, 3, 5),
    "quad8": (0, 2, 4, 6, 1, 3, 5, 7),
    "tet10": (0, 2, 4, 9, 1, 3, 5, 6, 7, 8),
    "wedge15": (0, 2, 4, 9, 11, 13, 1, 3, 5, 10, 12, 14, 6, 7, 8),
    "hex20": (0, 2, 4, 6, 12, 14, 16, 18, 1, 3, 5, 7, 13, 15, 17, 19, 8, 9, 10, 11),
}


def kind_of(descriptor: int, count: int) -> str:
    """Our kind of an element of the file, "" when it is none of ours."""
    if any(descriptor in numbers for numbers in _SURFACES):
        return _SURFACE.get(count, "")
    return _LINE.get(count, "") if descriptor in _LINES else _SOLIDS.get((descriptor, count), "")

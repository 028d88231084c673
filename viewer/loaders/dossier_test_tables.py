"""The layout of ``[[tests]]`` in ``dossier.toml``: hammer tests, where they lie on the mesh, what was wrong in them::

[[tests]]
name = "hammer"
file = "hammer.unv"         # or a table of a CSV set; several runs of one test: file = ["run_1.unv", "run_2.unv"]
length_unit = "mm"          # of the points in the file; universal files that state their unit need none
design = "baseline"         # the design that it is set beside; default: the first
# Where four or more of its points lie on the mesh, in [units] length or by node; without, it is found from the
# geometry: landmarks = [{point = "1", near = [0, 0, 0]}, {point = "9", node = 112}]
# A placement that was accepted stands instead: place on the mesh = scale · rotation · point + shift, the shift in
# [units] length: placement = {rotation = [[1, 0, 0], [0, 1, 0], [0, 0, 1]], shift = [0, 0, 0], scale = 1}
# What was accepted as wrong, put right in this order, for all modes; axes are the test's own:
corrections = [
    {kind = "flip", point = "12", axis = "x"},                          # wrong sign; without axis: all channels
    {kind = "swap axes", point = "3", axis = "x", other_axis = "y"},    # two channels exchanged
    {kind = "move", point = "7", other = "9"},                          # recorded there, measured here
    {kind = "move", point = "8", position = [10, 0, 20]},               # or at a place, in [units] length
    {kind = "leave out", point = "5", axis = "z"},                      # nothing usable was measured
]
"""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import Field, model_validator

from viewer.loaders.dossier_values import Length, Name, Positive, Table, Vector

Axis = Literal["x", "y", "z"]
# Keys beside kind and point that each kind of correction needs, and those that it may have.
_NEEDED = {"flip": (), "swap axes": ("axis", "other_axis"), "move": (), "leave out": ()}
_ALLOWED = {
    "flip": ("axis",),
    "swap axes": ("axis", "other_axis"),
    "move": ("other", "position"),
    "leave out": ("axis",),
}


class LandmarkTable(Table):
    point: Name
    near: Vector | None = None
    node: int | None = None

    @model_validator(mode="after")
    def _one_place(self):
        if (self.near is None) == (self.node is None):
            raise ValueError("expected either near = [x, y, z] or node = ID")
        return self


class PlacementTable(Table):
    rotation: Annotated[list[Vector], Field(min_length=3, max_length=3)]
    shift: Vector
    scale: Positive = 1.0


class CorrectionTable(Table):
    kind: Literal["flip", "swap axes", "move", "leave out"]
    point: Name
    axis: Axis | None = None
    other_axis: Axis | None = None
    other: Name | None = None
    position: Vector | None = None

    @model_validator(mode="after")
    def _what(self):
        given = [key for key in ("axis", "other_axis", "other", "position") if getattr(self, key) is not None]
        missing = [key for key in _NEEDED[self.kind] if key not in given]
        if missing:
            raise ValueError(f'says no {missing[0]}, expected {" and ".join(_NEEDED[self.kind])} for "{self.kind}"')
        odd = [key for key in given if key not in _ALLOWED[self.kind]]
        if odd:
            raise ValueError(f'says {odd[0]}, expected only {" or ".join(_ALLOWED[self.kind])} for "{self.kind}"')
        if self.kind == "move" and len(given) != 1:
            raise ValueError('expected either other = "LABEL" or position = [x, y, z] for "move"')
        if self.kind == "move" and self.other == self.point:
            raise ValueError("moves a point to itself, expected another point")
        if self.kind == "swap axes" and self.axis == self.other_axis:
            raise ValueError("swaps an axis with itself, expected two axes")
        return self


class TestTable(Table):
    name: Name
    file: Name | Annotated[list[Name], Field(min_length=1)]
    length_unit: Length | Positive | None = None
    design: Name | None = None
    landmarks: list[LandmarkTable] = []
    placement: PlacementTable | None = None
    corrections: list[CorrectionTable] = []

    __test__ = False  # not a test case of pytest's

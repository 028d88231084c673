"""The sheet over a picture: scale note, rulers, colour bar, title keys, labels and magnifier, as primitives.

Pure: what is where can be asserted without drawing. What stands still is composed once for a camera
(:func:`plan_sheet`); for each phase only the gauge's knob, the leaders and the magnifier's dot are made.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from viewer.scene.bead_scale import bead_scale_items
from viewer.scene.colour_bar import picture_bar
from viewer.scene.cover import cover
from viewer.scene.labels import Placed, marked_lines, picture_labels, place_label
from viewer.scene.magnifier import Magnifier, place_magnifier
from viewer.scene.note_layout import note_height, note_items, note_knob, swings
from viewer.scene.picture import Picture
from viewer.scene.primitives import (
    Box,
    Disc,
    Frame,
    GradientBar,
    Line,
    Polygon,
    Primitive,
    Ring,
    Sheet,
    Text,
    grown,
    sheet_size,
)
from viewer.scene.rulers import ruler_items
from viewer.scene.surface import Surface
from viewer.scene.title_keys import title_key_items
from viewer.scene.tokens import THEMES

__all__ = [
    "Box",
    "Disc",
    "Frame",
    "GradientBar",
    "Line",
    "Polygon",
    "Primitive",
    "Ring",
    "Sheet",
    "SheetPlan",
    "Text",
    "compose_sheet",
    "note_height",
    "plan_sheet",
    "sheet_size",
]


@dataclass(frozen=True, eq=False)
class SheetPlan:
    """A sheet for one picture and one camera; ``at`` gives it at a phase."""

    picture: Picture
    frame: Frame
    fixed: tuple[Primitive, ...]
    labels: tuple[Placed, ...]
    magnifier: Magnifier | None

    def at(self, phase: float) -> Sheet:
        """The sheet at a phase; ``fixed`` is the same object every time."""
        halo = THEMES[self.picture.theme].halo
        moving = [item for placed in self.labels for item in placed.moving(self.frame, phase, halo)]
        if self.magnifier is not None:
            moving.append(self.magnifier.dot(phase))
        if swings(self.picture):
            moving.append(note_knob(self.picture, self.frame, phase))
        return Sheet(self.frame.width, self.frame.height, self.fixed, tuple(moving))


def plan_sheet(picture: Picture, frame: Frame, surfaces: Sequence[Surface] | None = None) -> SheetPlan:
    """Compose everything that stands still. ``surfaces`` of the bodies spare finding them again."""
    band_top = frame.height - note_height(picture)
    furniture = [*picture_bar(picture, frame, band_top)]
    furniture += title_key_items(picture, frame)
    furniture += bead_scale_items(picture, frame)
    furniture += ruler_items(picture, frame) if picture.layout == "single" else []
    wanted = picture_labels(picture, frame)
    labels: list[Placed] = []
    magnifier = None
    if wanted or picture.magnified is not None:
        covered = cover(picture, frame, surfaces)
        taken = [grown(item.box, 4.0) for item in furniture if not isinstance(item, Line)]
        taken.append((0.0, band_top, frame.width, frame.height))
        leaders = marked_lines(picture, frame)
        left, top, right, foot = frame.boxes[0]
        magnifier = place_magnifier(picture, frame, (left, top, right, min(foot, band_top)), covered, taken, leaders)
        for label in wanted:
            left, top, right, foot = frame.boxes[label.anchor.body]
            region = (left, top, right, min(foot, band_top))
            labels.append(place_label(label, frame, region, covered, taken, leaders, wanted))
    fixed = [*(magnifier.items() if magnifier is not None else []), *furniture, *note_items(picture, frame)]
    fixed += [text for placed in labels for text in placed.texts()]
    return SheetPlan(picture, frame, tuple(fixed), tuple(labels), magnifier)


def compose_sheet(picture: Picture, phase: float, frame: Frame) -> Sheet:
    """The sheet of one picture at one phase. Drawing a loop, keep the plan: ``plan_sheet(…).at(phase)``."""
    return plan_sheet(picture, frame).at(phase)

"""Pictures with every kind of mark and note, for tests of the sheet."""

from __future__ import annotations

import numpy as np

from tests.stage.channel import LENGTH, WIDTH, body, channel
from viewer.insight.scale import Scale
from viewer.scene import view
from viewer.scene.note_layout import note_height, scale_note
from viewer.scene.picture import Body, Magnified, MassMark, Picture, PointMark, SupportMark
from viewer.scene.sheet import Frame

NAME = "boom nods at the cable window"
DRIVE, HELD = "belt drive at 12 Hz, 1.5 % damping", "clamped root, camera 1.2 kg"


def scale(**changes) -> Scale:
    """The finding of LOOK.md's sentences."""
    said = {
        "mode": 1,
        "factor": 1.0,
        "magnification": 8342.0,
        "largest_real": 3.94e-6,
        "largest_row": 0,
        "largest_place": "camera lens",
        "largest_word": "down",
        "drawn_percent": 8.0,
        "limited_by": "peak",
        "condition": DRIVE,
    }
    return Scale(**{**said, **changes})


def unknown(**changes) -> Scale:
    return scale(magnification=None, largest_real=None, condition="", **changes)


def marked(name: str = "baseline", **changes) -> Body:
    """The channel with pegs at its root, a camera below its web and a lens beneath."""
    bare = body(channel(window=changes.pop("window", 0.035)), name, **changes)
    mesh = bare.mesh
    x, _, z = mesh.points.T
    foot = np.nonzero((np.abs(x - 0.5) < 0.05) & (z > -1e-9))[0]
    motion = np.concatenate([bare.shape[foot].mean(axis=0), [0.0, 2.0, 0.0]])
    at = np.array([0.9 * LENGTH, WIDTH / 2, -0.11])
    return Body(
        bare.name,
        mesh,
        bare.shape,
        bare.factor,
        changes.get("freq_hz", 84.6),
        bare.density,
        (SupportMark("root", np.nonzero(x < 1e-9)[0]),),
        (MassMark("camera", 1.2, at, foot, motion),),
        (PointMark("image blur: sideways", at - np.array([0, 0, 0.04]), np.array([0.0, 1.0, 0.0]), motion),),
    )


def known(**changes) -> Picture:
    note = scale_note(1, NAME, 84.6, scale(), HELD)
    return Picture((marked(),), note, magnification=8342.0, energy_top=25.0).with_(**changes)


def of_unknown_size(**changes) -> Picture:
    note = scale_note(1, NAME, 84.6, unknown(), HELD)
    return Picture((marked(),), note, energy_top=16.0, energy_caution="energies not trusted").with_(**changes)


def true(**changes) -> Picture:
    shown = marked(share=1e-5)
    note = scale_note(1, NAME, 84.6, scale(magnification=1.0), HELD)
    glass = Magnified("camera lens", shown.points[0].position, np.array([0.0, 0.0, -1.0]), 3.94e-6)
    return Picture((shown,), note, magnification=1.0, energy_top=25.0, magnified=glass).with_(**changes)


def side(**changes) -> Picture:
    pair = marked(), marked("modified: narrow window", window=0.02)
    note = scale_note(1, NAME, None, (scale(), scale(largest_real=2.4e-6)), HELD, one_colour_scale=True)
    words = "strain energy density ÷ own mean"
    return Picture(
        pair,
        note,
        "side",
        8342.0,
        energy_top=25.0,
        energy_words=words,
        height=576,
        energy_caution="not trusted: baseline, modified",
    ).with_(**changes)


def overlay(**changes) -> Picture:
    note = scale_note(1, NAME, None, (scale(), scale(magnification=12000.0, largest_real=2.4e-6)), HELD)
    return side(note=note, layout="overlay", energy_top=None, energy_caution="", height=640).with_(**changes)


ALL = {"known": known, "unknown": of_unknown_size, "true": true, "side": side, "overlay": overlay}


def frame_of(picture: Picture) -> Frame:
    camera, boxes = view.fit(picture, note_height(picture))
    return view.frame(picture, camera, boxes)

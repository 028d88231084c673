"""Findings of known geometry on the channel of tests/stage/channel.py, for tests of marks."""

from __future__ import annotations

import numpy as np

from tests.stage.channel import FLANGE, WIDTH, body, channel
from viewer.insight.hinges import Flap, Hinge, HingeFinding
from viewer.scene.finding_marks import flap_marks, hinge_marks
from viewer.scene.picture import Body

FOLD_AT = 0.18  # x of the channel's fold
TURN = np.array([0.0, 2.0, 0.0])  # rad per unit of the shape, of the free part of the channel


def middles(mesh) -> np.ndarray:
    return np.concatenate([mesh.points[block.nodes].mean(axis=1) for block in mesh.blocks])


def hinge(mesh, **changes) -> Hinge:
    """The channel's fold: across the web at x = 0.18 m, in which ``nod`` turns the free part by 2 rad per unit."""
    x = middles(mesh)[:, 0]
    axis = np.array([[FOLD_AT, 0.0, -0.03], [FOLD_AT, WIDTH, -0.03]])
    said = {
        "number": 1,
        "kind": "line",
        "axis": axis,
        "motion": np.array([[0.0, 0.0, -0.03], [0.0, 0.0, -0.03]]),
        "position": axis.mean(axis=0),
        "direction": np.array([0.0, 1.0, 0.0]),
        "length": WIDTH,
        "width": 0.1,
        "fold": TURN,
        "stiffness": None,
        "strain_share": 0.614,
        "volume_share": 0.2,
        "contrast": 12.0,
        "turn_share": 0.9,
        "cells": np.nonzero(np.abs(x - FOLD_AT) < 0.05)[0],
        "sides": (np.nonzero(x < FOLD_AT - 0.05)[0], np.nonzero(x > FOLD_AT + 0.05)[0]),
        "arm": np.array([1.0, 0.0, 0.0]),
        "score": 2.0,
        "gate": "contrast",
        "confidence": 0.97,
        "label": "strong",
    }
    return Hinge(**{**said, **changes})


def finding(mesh, *hinges: Hinge) -> HingeFinding:
    """The fold, and the outer half of the near flange as a flap."""
    x, y, z = middles(mesh).T
    cells = np.nonzero((y < 1e-9) & (z < -FLANGE / 3) & (np.abs(x - 0.45) < 0.09))[0]
    flap = Flap(1, (1,), cells, 0.42, 0.01, 0.99, 0.18)
    return HingeFinding(1, 84.6, "hinges", hinges or (hinge(mesh),), (flap,))


def marked(scale, *, chosen: int = 0, **changes) -> Body:
    """The channel with the marks of its finding."""
    mesh = channel()
    found = finding(mesh)
    hinges = hinge_marks(found, scale, scale.turn, mesh, chosen)
    return body(mesh, hinges=hinges, flaps=flap_marks(found), **changes)

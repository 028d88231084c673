"""When a measured candidate is a hinge: gates, score, label and confidence."""

from __future__ import annotations

import numpy as np

from viewer.insight.hinges.band import Draft
from viewer.insight.hinges.field import Field

_NECK = "the only way across"
JOINT = 1.6  # elongation below which a band has no line

# Least value of each figure; a figure that must be small is given as its reciprocal.
THRESHOLDS = {
    "share of the energy": 0.03,
    "contrast": 4.0,
    "sharp edges": 3.0,
    "turn against the bending beside it": 0.2,
    "abrupt edges": 2.5,
    "steepness": 2.5,
    "slenderness": 1 / 0.16,
    "turn about the line": 0.85,
    "one sense along the line": 0.3,
    "turn against the whole": 0.05,
    "even density across": 0.2,
}
# Bending crowds at any clamp, so a band that lies on one must be clearer.
AT_CLAMP = {"contrast": 6.0, "sharp edges": 4.5, "abrupt edges": 3.0, "steepness": 3.5}
# One row of cells at a clamp, no smaller than the next, shows the crowding of a plain built-in sheet as a step: the
# moment there falls to a half within a twentieth of a wave, and cells as coarse as that are common.
_ONE_ROW, _COARSE = 1.5, 1.5
# A joint's surroundings are crowded, which blurs its edges; but it must stand out and turn all the more.
AT_JOINT = {
    "contrast": 8.0,
    "sharp edges": 2.5,
    "steepness": 1.8,
    "abrupt edges": 2.0,
    "turn against the bending beside it": 0.3,
    _NECK: 1.0,
}
STRONG_SCORE, STRONG_TURN, STRONG_SHARE = 1.5, 0.35, 0.15
DOUBTFUL = 0.8  # score from which a mode without a hinge may fold: 35 of 42 such candidates were lines
DOUBTFUL_SHARE = 0.1  # of the energy in it: a doubt about less is not worth a sentence
DOUBTFUL_VOLUME = 0.15  # of the material in it: what fills more is no narrow band, and its bending is spread
_JOINT_SIZE = 0.65  # a joint as large as this share over the bound on slenderness, 1/10 of the part, is none
_CAPPED = {
    "turn about the line",
    "one sense along the line",
    "even density across",
    _NECK,
}  # shares: they say no more


def is_joint(draft: Draft) -> bool:
    """Without length, or turning about an axis that is not its line."""
    return draft.length < JOINT * draft.width or bool(
        draft.frame.blob and abs(draft.frame.about[0] @ draft.direction) < 0.8
    )


def only_way(field: Field, draft: Draft) -> bool:
    """Whether the two sides do not hang together around the band in its surroundings. A joint is a neck; where stress
    crowds in the middle of a sheet, at a corner or on the back of a rib, material goes past it."""
    near = np.setdiff1d(draft.frame.near, draft.cells)
    number = np.full(len(field.volume), -1)
    number[near] = field.pieces(near)
    first, second = (number[side.cells] for side in draft.sides)
    return not np.intersect1d(first[first >= 0], second[second >= 0]).size


def values(field: Field, draft: Draft) -> dict[str, float]:
    """The figure of every gate."""
    joint = is_joint(draft)
    return ({_NECK: float(only_way(field, draft))} if joint else {}) | {
        "share of the energy": draft.strain,
        "contrast": draft.contrast,
        "sharp edges": draft.step,
        "turn against the bending beside it": draft.turn_share,
        "abrupt edges": draft.jump,
        "steepness": draft.steep,
        "slenderness": _JOINT_SIZE * field.size / draft.width if joint else draft.length / draft.width,
        "turn about the line": draft.aligned,
        "one sense along the line": draft.even,
        "turn against the whole": draft.bend / max(field.turn_rms, 1e-300),
        "even density across": draft.filled,
    }


def score(field: Field, draft: Draft) -> tuple[float, str]:
    """Smallest figure over its threshold and the name of that gate. Shares pass or fail and never count above 1.5
    times their threshold's worth."""
    ratios = {}
    thresholds = THRESHOLDS | (AT_JOINT if is_joint(draft) else {})
    if draft.grounded:
        coarse = _COARSE if draft.rows < _ONE_ROW else 1.0
        thresholds = thresholds | {name: coarse * value for name, value in AT_CLAMP.items()}
    for name, value in values(field, draft).items():
        ratio = value / thresholds[name]
        ratios[name] = max(ratio, 3.0) if name in _CAPPED and ratio >= 1 else ratio
    gate = min(ratios, key=lambda name: ratios[name])
    return float(ratios[gate]), gate


def worth_a_doubt(draft: Draft) -> bool:
    """Whether a line that does not quite pass deserves to be spoken of: it holds energy, and is narrow."""
    return draft.strain >= DOUBTFUL_SHARE and draft.volume <= DOUBTFUL_VOLUME


def label(score_: float, draft: Draft) -> str:
    """How sure and how weighty: "strong" is well above the gates, turns much more than its sides bend, and holds
    enough energy for the mode to be about it; "undecided" lies between ``DOUBTFUL`` and 1; "weak" is the rest."""
    if score_ < 1:
        return "undecided"
    strong = score_ >= STRONG_SCORE and draft.turn_share >= STRONG_TURN and draft.strain >= STRONG_SHARE
    return "strong" if strong else "weak"


CALIBRATION = (
    "chance from a logistic curve in the logarithm of the score, fitted to 571 candidates with a score of at least "
    "0.5 (the best of each place) in 100 generated parts of 36 families, 390 of them on a line or neck that was "
    "built in; foretold for each family from all others it agrees within 2 percentage points on average; no "
    "candidate is given more than 98 percent, since parts of other sorts may do worse"
)
_LOGIT, _MOST = (2.14, 5.11), 0.98


def confidence(score_: float) -> float:
    """Chance that a candidate of this score is a hinge line (``CALIBRATION``)."""
    return float(min(_MOST, 1 / (1 + np.exp(-(_LOGIT[0] + _LOGIT[1] * np.log(max(score_, 1e-6)))))))

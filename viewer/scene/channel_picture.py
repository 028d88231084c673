"""Figures of a test's channels on the structure, at rest: where test and analysis disagree, what may be wrong.

Each point shows the worst of its channels: the larger and darker its bead, the worse; the worst are named with their
figures, so that nothing is told by colour alone.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from viewer.model.arrays import Array
from viewer.model.testset import Correction, direction_words
from viewer.scene.compose import SINGLE, mode_body, picture_height
from viewer.scene.figures import GAP, digits
from viewer.scene.picture import Body, Note, Picture, TestCall
from viewer.scene.placed_test import PlacedTest, question
from viewer.scene.tokens import BASE_WIDTH
from viewer.workspace import Study

TOLD = 3  # worst points named
WORTH_TELLING = 0.15  # weight below which a point needs no words
AT_REST = "drawn at rest"


@dataclass(frozen=True)
class Kind:
    """How a figure is read: its title, what it means, its value where all is well and at the other end of the scale
    (None: the largest, rounded up), and whether it is told in percent."""

    title: str
    meaning: tuple[str, ...]
    scale: str
    good: float
    bad: float | None
    percent: bool = False


KINDS = {
    "comac": Kind(
        "Where test and analysis agree",
        (
            "each channel over all paired modes, signs aside (COMAC): 1 agrees, 0 does not",
            "it says little where a point hardly moves",
        ),
        "COMAC, worst channel of the point",
        1.0,
        0.0,
    ),
    "ecomac": Kind(
        "Where test and analysis disagree",
        ("each channel over all paired modes, signs included (enhanced COMAC): 0 agrees, larger is worse",),
        "enhanced COMAC, worst channel",
        0.0,
        None,
    ),
    "residual": Kind(
        "What the expansion cannot explain",
        ("each channel predicted from all others, and missed by this share of the mode's rms reading",),
        "left-out error, worst channel",
        0.0,
        None,
        True,
    ),
}


def channel_picture(
    study: Study,
    placed: PlacedTest,
    values: Array,
    kind: str,
    *,
    told: int = TOLD,
    said: Sequence[str] = (),
    width: int = BASE_WIDTH,
    **look: Any,
) -> Picture:
    """The points of a test on the plain body, sized by a figure of their channels.

    values  (c,) by channel, NaN where there is none (such points are hollow)
    kind    "comac", "ecomac", "residual" (shares)
    told    how many of the worst points are named
    said    further statements of the note
    """
    kinds = KINDS[kind]
    values = np.asarray(values, float)
    bad = _end(values) if kinds.bad is None else kinds.bad
    weights, worst = _worst(placed, (values - kinds.good) / (bad - kinds.good))
    order = [int(p) for p in np.argsort(-np.nan_to_num(weights), kind="stable") if weights[p] >= WORTH_TELLING]
    calls = []
    for point in order[:told]:
        channel = int(worst[point])
        label, along = placed.test.labels[point], direction_words(placed.test.directions[channel])
        calls.append(TestCall(point, (f"point {label} {along}", _figure(values[channel], kinds))))
    mark = placed.mark(placed.test.name, _still(placed), weights=weights, calls=tuple(calls), ticks=np.empty((0, 3)))
    ends = (kinds.good, (kinds.good + bad) / 2, bad)
    samples = [(share, _figure(value, kinds)) for share, value in zip((0.0, 0.5, 1.0), ends, strict=True)]
    if np.isnan(weights).any():
        samples.append((float("nan"), "not used"))
    note = Note(kinds.title, "", (*kinds.meaning, *said), (AT_REST, *_tested(placed)))
    scale = (kinds.scale, tuple(samples))
    return _resting(study, replace(mark, freq_hz=None), note, width, look).with_(bead_scale=scale)


def faults_picture(
    study: Study,
    placed: PlacedTest,
    proposals: Sequence[tuple[Correction, Sequence[str]]],
    *,
    said: Sequence[str] = (),
    width: int = BASE_WIDTH,
    **look: Any,
) -> Picture:
    """Channels that may be wrong, ringed and called out as questions, with what each correction would do.

    proposals  the correction and further lines for its words ("MAC 0.71 → 0.98 on average")
    """
    calls = []
    for correction, effect in proposals:
        target: Array | None = None
        if correction.other:
            target = placed.points[placed.row(correction.other)]
        elif correction.position is not None:
            target = placed.placement.points(np.array([correction.position]))[0]
        words = (question(placed.test, correction), *effect)
        calls.append(TestCall(placed.row(correction.point), words, True, target))
    mark = placed.mark(placed.test.name, _still(placed), calls=tuple(calls))
    count = len(calls)
    title = f"{count} correction{'s' if count != 1 else ''} proposed" if count else "No channel seems wrong"
    asked = ("not applied: each would hold for all modes",) if count else ()
    note = Note(
        title, "", (*asked, "arrows: the way each channel measures as plus", *said), (AT_REST, *_tested(placed))
    )
    return _resting(study, mark, note, width, look)


def _resting(study: Study, mark: Any, note: Note, width: int, look: dict[str, Any]) -> Picture:
    """The design at rest, plain, with the test on it."""
    scale = study.scale(0)
    body: Body = mode_body(study, 0, scale, scale.turn, energy=False)
    body = replace(body, factor=0.0, points=(), traces=(mark,))
    return Picture((body,), note, width=width, height=picture_height(width, SINGLE), **{**look, "ghost": False})


def _tested(placed: PlacedTest) -> tuple[str, ...]:
    test = placed.test
    return (
        f"test: {test.name}, {int(placed.used.sum())} of {test.n_channels} channels used",
        *placed.corrections_said,
    )


def _still(placed: PlacedTest) -> Array:
    return np.zeros((len(placed.points), 3))


def _worst(placed: PlacedTest, shares: Array) -> tuple[Array, Array]:
    """(p,) the largest share of each point's channels, NaN without any; and that channel (p,)."""
    weights = np.full(len(placed.points), np.nan)
    channels = np.full(len(placed.points), -1)
    for point in range(len(weights)):
        rows = placed.test.channels_of(point)
        rows = rows[np.isfinite(shares[rows])]
        if len(rows):
            channels[point] = rows[int(np.argmax(shares[rows]))]
            weights[point] = np.clip(shares[channels[point]], 0.0, 1.0)
    return weights, channels


def _end(values: Array) -> float:
    """End of a scale that holds all ``values`` from 0 on: 1, 2, 4, 6 or 8 times a power of ten."""
    most = float(np.nanmax(values, initial=0.0)) if np.isfinite(values).any() else 0.0
    if not most > 0:
        return 1.0
    decade = 10.0 ** np.floor(np.log10(most))
    return float(next(step * decade for step in (1, 2, 4, 6, 8, 10) if step * decade >= most * (1 - 1e-9)))


def _figure(value: float, kind: Kind) -> str:
    if kind.percent:
        return f"{digits(100 * value, trim=True)}{GAP}%"
    return f"{value:.2f}" if kind.good == 1.0 else digits(value, trim=True)

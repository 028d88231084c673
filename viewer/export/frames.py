"""The frames of a loop: which phases are drawn, and which of them need drawing at all."""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np

from viewer.jobs import SILENT, Progress
from viewer.model.arrays import Array
from viewer.scene.picture import Picture
from viewer.scene.tokens import FRAMES


def phase_of(frame: int) -> float:
    """Phase in rad of frame 0 … 39 of one cycle."""
    return 2 * np.pi * frame / FRAMES


def source_frames(picture: Picture) -> list[int]:
    """For each frame of a cycle the frame whose drawing it shows.

    When every body stands (all nodes in phase), phase −p looks like phase p: 21 drawings make 40 frames.
    """
    if all(body.standing for body in picture.bodies):
        return [min(frame, FRAMES - frame) for frame in range(FRAMES)]
    return list(range(FRAMES))


def drawings(
    picture: Picture,
    draw: Callable[[float], Array],
    first: tuple[int, ...] = (),
    progress: Progress = SILENT,
) -> Iterator[tuple[int, Array]]:
    """Each frame that needs drawing, once, as (frame, image (h, w, 3) uint8); the frames ``first`` lead.

    ``draw(phase)`` renders; ``progress`` ticks before each frame.
    """
    wanted = sorted(set(source_frames(picture)))
    order = [*dict.fromkeys(first), *(frame for frame in wanted if frame not in first)]
    for done, frame in enumerate(order):
        progress.tick("drawing frames", done, len(order))
        yield frame, draw(phase_of(frame))

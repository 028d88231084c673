"""A loop as a video that any player and any slide shows: H.264 in MP4, several cycles, exact in time and size.

Needs ``imageio-ffmpeg`` (the ``video`` extra), whose wheel carries the encoder as a program of its own.
"""

from __future__ import annotations

import os
from importlib import import_module
from math import ceil
from pathlib import Path
from typing import Any

import numpy as np

from viewer.errors import ExportError
from viewer.export.frames import drawings, source_frames
from viewer.jobs import SILENT, Progress, atomic_path
from viewer.model.arrays import Array
from viewer.scene.picture import Picture
from viewer.scene.tokens import FRAME_MS, FRAMES
from viewer.stage import Stage

LEAST_SECONDS = 5.0  # a player that does not repeat shows at least so much
BLOCK = 16  # H.264 codes blocks of 16 × 16 pixels
# constant quality, near the still; colours by ITU-R BT.709, and said so, since players guess otherwise
_ENCODING = (
    "-crf", "14", "-preset", "medium", "-tune", "animation", "-movflags", "+faststart",
    "-vf", "scale=out_color_matrix=bt709:out_range=tv:flags=accurate_rnd+full_chroma_int,"
    "setparams=colorspace=bt709:color_primaries=bt709:color_trc=bt709:range=tv",
)  # fmt: skip


def save_mp4(picture: Picture, path: str | os.PathLike[str], progress: Progress = SILENT) -> Path:
    """Write whole cycles of 40 frames of 40 ms, at least 5 s of them; returns the path.

    Sizes that are no multiples of 16 are padded at the right and lower edge, never rescaled. Raises ``ExportError``
    when the file cannot be written or the encoder is missing, ``Cancelled`` (nothing is left) when asked to stop.
    """
    encoder = _encoder(path)
    with atomic_path(path) as part:
        drawn: dict[int, Array] = {}
        with Stage(picture) as stage:
            for frame, image in drawings(picture, stage.image, progress=progress):
                drawn[frame] = padded(image)
        order = source_frames(picture) * cycles()
        height, width, _ = next(iter(drawn.values())).shape
        try:
            _encode(encoder, part, (width, height), [drawn[frame] for frame in order], progress)
            found = encoder.count_frames_and_secs(str(part))
        except (OSError, RuntimeError) as error:
            raise ExportError(
                "the video cannot be encoded",
                file=path,
                found=str(error).strip().splitlines()[0],
                do="check space and rights, or write a .gif",
            ) from error
        seconds = len(order) * FRAME_MS / 1000
        if found[0] != len(order) or abs(found[1] - seconds) > FRAME_MS / 2000:
            raise ExportError(
                "the video does not last as long as it should",
                file=path,
                found=f"{found[0]} frames, {found[1]} s",
                expected=f"{len(order)} frames, {seconds} s",
            )
    return Path(path)


def cycles() -> int:
    """Whole cycles in a video."""
    return ceil(LEAST_SECONDS / (FRAMES * FRAME_MS / 1000) - 1e-9)


def padded(image: Array) -> Array:
    """(h, w, 3) with both sizes raised to multiples of 16 by repeating the right column and the last row: background
    and note band go on."""
    height, width, _ = image.shape
    return np.pad(image, ((0, -height % BLOCK), (0, -width % BLOCK), (0, 0)), mode="edge")


def _encoder(path: str | os.PathLike[str]) -> Any:
    try:
        encoder = import_module("imageio_ffmpeg")
        encoder.get_ffmpeg_exe()
    except (ImportError, RuntimeError) as error:
        raise ExportError(
            "a video needs an encoder that is not installed",
            file=path,
            found=str(error).splitlines()[0],
            expected="imageio-ffmpeg",
            do="pip install 'hingelight[video]', or write a .gif",
        ) from error
    return encoder


def _encode(encoder: Any, path: Path, size: tuple[int, int], frames: list[Array], progress: Progress) -> None:
    writer = encoder.write_frames(
        str(path),
        size,
        fps=1000 / FRAME_MS,
        codec="libx264",
        pix_fmt_out="yuv420p",
        quality=None,
        macro_block_size=1,
        ffmpeg_log_level="fatal",
        output_params=list(_ENCODING),
    )
    writer.send(None)
    try:
        for done, frame in enumerate(frames):
            if done % FRAMES == 0:
                progress.tick("encoding", done, len(frames))
            writer.send(np.ascontiguousarray(frame))
    finally:
        writer.close()
    progress.tick("encoding", len(frames), len(frames))

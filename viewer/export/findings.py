"""Stills of findings: one picture for each hinge of a mode, and one of its gain map."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from viewer.export.stills import save_png
from viewer.insight.hinges import HingeFinding
from viewer.jobs import SILENT, Progress
from viewer.scene.compose import single_picture
from viewer.workspace import Study


def write_hinge_stills(
    folder: Path,
    stem: str,
    study: Study,
    number: int,
    finding: HingeFinding,
    *,
    progress: Progress = SILENT,
    **look: Any,
) -> tuple[tuple[str, str], ...]:
    """A still of mode ``number`` for each hinge of ``finding``, that hinge set off; returns (words, file name)."""
    written = []
    for hinge in finding.hinges:
        name = f"{stem}_hinge_{hinge.number}.png"
        picture = single_picture(study, number, finding=finding, chosen=hinge.number, **look)
        save_png(picture, folder / name, progress=progress)
        written.append((f"hinge {hinge.number}", name))
    return tuple(written)

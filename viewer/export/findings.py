"""Pictures of findings: a still for each hinge of a mode, and one of its gain map."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from viewer.errors import RefusedError
from viewer.export.stills import save_png
from viewer.insight.gain_finding import GainMap
from viewer.insight.hinges import HingeFinding
from viewer.jobs import Give, at_once
from viewer.scene.compose import single_picture
from viewer.scene.gain_picture import gain_picture
from viewer.workspace import Study

Pictures = tuple[tuple[str, str], ...]  # (words, file name)


def write_hinge_stills(
    folder: Path,
    stem: str,
    study: Study,
    number: int,
    finding: HingeFinding,
    *,
    give: Give = at_once,
    **look: Any,
) -> Pictures:
    """A still of mode ``number`` for each hinge of ``finding``, that hinge set off."""
    written = []
    for hinge in finding.hinges:
        name = f"{stem}_hinge_{hinge.number}.png"
        picture = single_picture(study, number, finding=finding, chosen=hinge.number, **look)
        give(save_png, picture, folder / name)
        written.append((f"hinge {hinge.number}", name))
    return tuple(written)


def write_gain_still(
    folder: Path,
    stem: str,
    study: Study,
    number: int,
    gain: GainMap,
    *,
    give: Give = at_once,
    **look: Any,
) -> Pictures:
    """A still of the gain map of mode ``number``; nothing where it has no figures in hertz."""
    try:
        picture = gain_picture(study, number, gain, **look)
    except RefusedError:
        return ()
    give(save_png, picture, folder / f"{stem}_gain.png")
    return (("where to stiffen and to lighten", f"{stem}_gain.png"),)

"""The functions of ``import viewer``. Modes are counted from 1 here, as everywhere a user sees them."""

from __future__ import annotations

import os
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from viewer.errors import InputError
from viewer.jobs import SILENT, Progress
from viewer.loaders import read_mesh, read_modes, read_test
from viewer.mechanics.energy import Energies
from viewer.mechanics.energy import energies as form_energies
from viewer.mechanics.relative import relative_energies, states_no_material
from viewer.model.design import Design
from viewer.model.dossier import StatedAmplitude
from viewer.model.modes import ModeSet
from viewer.model.testset import TestSet
from viewer.scene.picture import Picture
from viewer.workspace import OpenDossier, Study, Workspace, study
from viewer.workspace.comparison import Comparison, compare

if TYPE_CHECKING:
    from viewer.insight.hammer_pairing import TestCorrelation
    from viewer.insight.registration import Registration

__all__ = [
    "animate",
    "correlate",
    "energies",
    "open_dossier",
    "pair",
    "read_mesh",
    "read_modes",
    "read_test",
    "solve",
    "still",
]


def open_dossier(path: str | os.PathLike[str], *, cache: bool = True) -> OpenDossier:
    """Open ``dossier.toml`` (or its folder): ``dossier["baseline"]``, ``dossier.modes("baseline")``."""
    return _workspace(cache).open(Path(path))


def solve(design: Design, count: int = 6, *, cache: bool = True, progress: Progress = SILENT) -> ModeSet:
    """The first ``count`` modes of ``design``, mass-normalised (m/√kg), from the cache when solved before."""
    return _workspace(cache).solve(design, count, progress)


def energies(design: Design, modes: ModeSet, progress: Progress = SILENT) -> Energies:
    """Element strain and kinetic energies of every mode, with closure and trust; of a design without materials
    relative ones: shares under one assumed material (``relative`` is True), without closure and trust."""
    if states_no_material(design):
        return relative_energies(design, modes, progress)
    return form_energies(design, modes, progress=progress)


def pair(first: Study, second: Study, progress: Progress = SILENT) -> Comparison:
    """Which mode of one study became which of another, by shape: ``pair(opened.study("a"), opened.study("b"))``."""
    return compare(first, second, progress=progress)


def correlate(
    test: TestSet,
    design: Design,
    modes: ModeSet,
    registration: Registration | None = None,
    progress: Progress = SILENT,
) -> TestCorrelation:
    """Which measured mode is which of ``modes``, and how well they agree, at the channels of ``test``; laid onto the
    mesh from its geometry when no ``registration`` is given. ``RefusedError`` when that is not settled."""
    from viewer.insight.hammer_pairing import correlate_test
    from viewer.insight.register import register

    placed = (registration or register(test, design.mesh, progress=progress)).require()
    seen = np.array([placed.seen(modes.shape(i)) for i in range(modes.count)])
    names = tuple(design.mode_names.get(i + 1, "") for i in range(modes.count))
    return correlate_test(test, seen, modes.freq_hz, design=design.name, names=names, used=placed.used)


@dataclass(frozen=True, eq=False)
class Loop:
    """A picture that can be saved: ``save("loop.gif")``, ``save("loop.mp4")``, ``save("still.png")``."""

    picture: Picture

    def save(self, path: str | os.PathLike[str], *, phase: float = 0.0, progress: Progress = SILENT) -> Path:
        """Write a loop (.gif or .mp4) or a still at ``phase`` rad (.png); returns the path."""
        from viewer.export import save_gif, save_mp4, save_png

        target = Path(path)
        if target.suffix.lower() == ".gif":
            return save_gif(self.picture, target, progress)
        if target.suffix.lower() == ".mp4":
            return save_mp4(self.picture, target, progress)
        if target.suffix.lower() == ".png":
            return save_png(self.picture, target, phase, progress)
        raise InputError(
            "cannot tell what to draw",
            file=target,
            found=f"the ending '{target.suffix}'",
            expected=".gif, .mp4 or .png",
        )


def animate(
    design: Design,
    modes: ModeSet,
    mode: int,
    *,
    amplitudes: Sequence[StatedAmplitude] = (),
    condition: str = "",
    **options: Any,
) -> Loop:
    """The loop of mode number ``mode``, its hinges and flaps marked where energies are drawn.

    ``options`` are those of ``viewer.scene.compose.single_picture``:
    true_scale, peak_percent, energy, theme, width, ghost, mesh_edges, node_lines, showing, view. Parts:
    ``showing=viewer.Showing(hide=("lid",), plane=viewer.Plane((1, 0, 0), 0.12))``."""
    from viewer.scene.compose import single_picture

    stated = {a.mode: a for a in amplitudes}
    studied = study(design, modes, stated, condition, energy=options.get("energy", True))
    if options.get("energy", True):
        options.setdefault("finding", studied.hinges_if_known(studied.index_of(mode)))
    return Loop(single_picture(studied, mode, **options))


def still(design: Design, modes: ModeSet, mode: int, path: str | os.PathLike[str], **options: Any) -> Path:
    """Write a still of mode number ``mode`` at its extreme; options as in :func:`animate`."""
    return animate(design, modes, mode, **options).save(path)


def _workspace(cache: bool) -> Workspace:
    return Workspace() if cache else Workspace(cache=None)

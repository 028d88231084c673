"""What was decided in the window is written into the dossier."""

from __future__ import annotations

from viewer.errors import RefusedError
from viewer.loaders import save_mode_name
from viewer.session.project import Project
from viewer.session.state import State


def save_names(project: Project, state: State) -> None:
    """Write the names given in the window into the dossier file, which keeps its comments and layout.

    ``RefusedError`` when there is no dossier to write into; ``DossierError`` or ``ExportError`` when it cannot be
    written.
    """
    if not project.can_save:
        raise RefusedError(
            "names have no place to be kept: this mesh has no dossier",
            file=project.opened.dossier.path,
            do="make one: hingelight check prints it",
        )
    for (design, mode), name in state.named.items():
        save_mode_name(project.opened.dossier.path, design, mode, name)

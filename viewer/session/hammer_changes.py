"""What was accepted of a hammer test is written into the dossier, which is then read anew."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from viewer.errors import RefusedError
from viewer.insight.wrong_channels import Faults
from viewer.loaders import write_test_changes
from viewer.model.testset import Correction
from viewer.session.project import Project


def accepted(project: Project, name: str) -> tuple[Correction, ...]:
    """All corrections of a test from now on: those of the dossier, and every certain one that is proposed."""
    tested = project.tested(name)
    if tested is None or not isinstance(tested.faults, Faults) or not tested.faults.corrections:
        raise RefusedError(f"no correction is proposed for test '{name}'", expected="none: no channel seems wrong")
    return (*tested.found.plan.corrections, *tested.faults.corrections)


def correct(project: Project, name: str, corrections: Sequence[Correction]) -> Project:
    """The project after all ``corrections`` of a test (none: as recorded) are written into its dossier; what is known
    of the designs stays, what is known of tests is found anew.

    Raises ``RefusedError`` without a dossier to write into, ``DossierError`` or ``ExportError`` when it cannot be.
    """
    path = project.opened.dossier.path
    if not project.can_save:
        raise RefusedError("corrections have no place to be kept: this mesh has no dossier", file=path)
    write_test_changes(path, name, corrections=corrections)
    return replace(project, opened=project.opened.workspace.open(path), tests={})

"""Reading, solving and finding for the window: functions that run beside it, each with progress and a way to stop."""

from __future__ import annotations

import importlib.resources
from pathlib import Path

from viewer.errors import Cancelled, HingelightError, InputError
from viewer.jobs import SILENT, Progress
from viewer.loaders import read_modes
from viewer.model.dossier import DesignPlan, Dossier
from viewer.session.project import Project, Tested
from viewer.workspace import OpenDossier, Study, Workspace
from viewer.workspace.comparison import Comparison, compare
from viewer.workspace.explanation import Explanation
from viewer.workspace.passage import follow_designs

SAMPLE = "sample"


def open_project(
    path: Path, modes: Path | None = None, workspace: Workspace | None = None, progress: Progress = SILENT
) -> Project:
    """Open a dossier, a folder that holds one, or a mesh with its modes (in the same file, or in ``modes``).

    The lengths of a bare mesh are taken as metres. Raises what reading raises.
    """
    owner = workspace or Workspace()
    if modes is None and (path.is_dir() or path.suffix.lower() == ".toml"):
        return Project(owner.open(path))
    progress.tick(f"reading {path.name}")
    plan = DesignPlan(path.stem, path, modes_file=modes or path)
    dossier = Dossier(path.stem, path, (plan,))
    opened = OpenDossier(owner, dossier, ("no dossier: lengths are taken as metres, materials are unknown",))
    mesh = opened.design(plan.name, progress).mesh
    try:
        read_modes(plan.modes_file or path, mesh, progress=progress)
    except HingelightError as error:
        if modes is not None:
            raise
        raise InputError(
            "a mesh without modes has nothing to play",
            file=path,
            found=str(error),
            do=f"give its modes as a second file, or a dossier: hingelight check {path.name} prints one",
        ) from None
    return Project(opened, can_save=False)


def sample() -> Path | None:
    """The folder of the sample boom, beside a checkout or inside an installed package; None when it is in neither."""
    packaged = Path(str(importlib.resources.files("viewer"))) / "samples" / "boom"
    beside = Path(str(importlib.resources.files("viewer"))).parent / "sample_meshes" / "boom"
    for folder in (packaged, beside):
        if (folder / "dossier.toml").is_file():
            return folder
    return None


def read_study(opened: OpenDossier, design: str, progress: Progress = SILENT) -> Study:
    """The design with its modes and energies."""
    return opened.study(design, None, progress)


def explain(study: Study, mode: int, progress: Progress = SILENT) -> Explanation:
    """All that is found about mode number ``mode``."""
    return study.explain(mode - 1, progress)


def compare_studies(
    opened: OpenDossier, first: Study, second: Study, progress: Progress = SILENT, *, closely: bool = True
) -> Comparison:
    """Which mode became which; ``closely``: and what changed in each, which takes longer."""
    stated = opened.stated_pairs(first.design.name, second.design.name)
    return compare(first, second, stated, progress, explain=closely)


def lay_test(opened: OpenDossier, name: str, progress: Progress = SILENT) -> Tested:
    """A hammer test laid beside its design, and which mode is which."""
    found = opened.test(name, progress=progress)
    return Tested(found, found.correlation(progress))


def look_for_faults(tested: Tested, progress: Progress = SILENT) -> Tested:
    """The same, with the channels that seem wrong, or why that cannot be told."""
    try:
        return tested.with_faults(tested.found.faults(progress))
    except Cancelled:
        raise
    except HingelightError as error:
        return tested.with_faults(str(error))


def follow(opened: OpenDossier, progress: Progress = SILENT):
    """The modes followed through the dossier's designs."""
    return follow_designs(opened, None, progress)

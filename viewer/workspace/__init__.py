"""The one owner of reading, solving and caching."""

from viewer.workspace.advice import BetterFormulation, better_formulation
from viewer.workspace.store import Cache
from viewer.workspace.study import Study, study
from viewer.workspace.workspace import OpenDossier, Workspace

__all__ = [
    "BetterFormulation",
    "Cache",
    "OpenDossier",
    "Study",
    "Workspace",
    "better_formulation",
    "study",
]

"""Which element formulations would close better with given modes than those in use, and how to choose them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from viewer.errors import RefusedError
from viewer.jobs import SILENT, Progress
from viewer.mechanics.energy import best_formulation
from viewer.mechanics.formulations import FORMULATIONS
from viewer.model.design import Design
from viewer.workspace.study import Study

WORTH_SAYING = 1e-3  # of closure: a smaller gain is the difference of two programs' quadrature, not of elements


@dataclass(frozen=True)
class BetterFormulation:
    """Formulations that close better than those in use.

    names   cell kind → formulation to choose, where it differs from the one in use; used: those in use
    error, used_error   median over the elastic modes of |closure − 1|, chosen and as it is
    choose  what to write into the dossier, by cell kind
    """

    design: str
    names: Mapping[str, str]
    used: tuple[str, ...]
    error: float
    used_error: float
    choose: Mapping[str, str]

    @property
    def sentence(self) -> str:
        return (
            f"{self.design}: {', '.join(self.names.values())} closes better with these modes: off by "
            f"{self.error:.2%} (median) against {self.used_error:.2%} with {', '.join(self.used)}; to choose it, "
            f"{'; '.join(self.choose.values())}"
        )

    def to_dict(self) -> dict[str, Any]:
        return {
            "design": self.design,
            "formulations": dict(self.names),
            "closure_error": self.error,
            "used_formulations": list(self.used),
            "used_closure_error": self.used_error,
            "choose": dict(self.choose),
            "sentence": self.sentence,
        }


def better_formulation(study: Study, progress: Progress = SILENT) -> BetterFormulation | None:
    """None unless the modes are imported, have closure, and other formulations of the kinds in use improve it."""
    found = study.energies
    if found is None or study.relative or study.modes.origin != "imported":
        return None
    kinds = {f.kind for offers in FORMULATIONS.values() for f in offers if f.name in found.formulations}
    elastic = np.isfinite(found.closure)
    if not elastic.any() or all(len(FORMULATIONS[kind]) < 2 for kind in kinds):
        return None
    used_error = float(np.median(np.abs(found.closure[elastic] - 1)))
    if used_error < WORTH_SAYING:
        return None
    try:
        best = best_formulation(study.design, study.modes, progress)
    except RefusedError:
        return None
    names = {kind: name for kind, name in best.names.items() if name not in found.formulations}
    if not names or best.error > used_error - WORTH_SAYING:
        return None
    choose = {kind: _how(study.design, kind, name, kinds) for kind, name in names.items()}
    return BetterFormulation(study.design.name, names, found.formulations, best.error, used_error, choose)


def _how(design: Design, kind: str, name: str, used: set[str]) -> str:
    """Where the name goes: into the assignments that make cells of this kind, unless they make others as well."""
    mesh, targets, mixed = design.mesh, [], False
    kinds = np.repeat([block.kind for block in mesh.blocks], [len(block) for block in mesh.blocks])
    for item in design.physics.assignments:
        here = used.intersection(kinds[design.target_rows(item.target)])
        if kind in here:
            targets.append(f"'{item.target}'")
            mixed = mixed or len(here) > 1
    where = (
        f'in an assignment of {kind} cells alone (target = "{kind}")'
        if mixed
        else (f"in the assignment{'s' * (len(targets) > 1)} to {', '.join(targets)}")
    )
    return f'write formulation = "{name}" {where}'

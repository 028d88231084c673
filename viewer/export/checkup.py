"""``check``: does a dossier hold together; or a ready dossier for a bare mesh."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from viewer.errors import HingelightError, LoadError, ModelError
from viewer.jobs import SILENT, Progress
from viewer.loaders import bare_dossier, read_mesh_report, read_modes, read_planned_test
from viewer.mechanics.assembly import assemble
from viewer.mechanics.relative import states_no_material
from viewer.model.mesh import Mesh
from viewer.model.testset import TestSet
from viewer.workspace import OpenDossier, better_formulation


@dataclass(frozen=True)
class Checkup:
    """What was found: statements, cautions, errors; ``draft`` is a ready dossier for a bare mesh."""

    statements: tuple[str, ...]
    cautions: tuple[str, ...] = ()
    errors: tuple[str, ...] = ()
    draft: str = ""

    @property
    def sound(self) -> bool:
        return not self.errors

    @property
    def text(self) -> str:
        if self.draft:  # a dossier is printed so that it can be saved as it stands
            said = [line for words in (*self.statements, *self.cautions) for line in words.splitlines()]
            return "\n".join([*(f"# {line}" for line in said), self.draft])
        lines = [*self.statements, *(f"caution: {c}" for c in self.cautions), *(f"error: {e}" for e in self.errors)]
        lines.append("the dossier is sound" if self.sound else f"{len(self.errors)} error(s)")
        return "\n".join(lines)

    def to_dict(self) -> dict[str, Any]:
        return {
            "sound": self.sound,
            "statements": list(self.statements),
            "cautions": list(self.cautions),
            "errors": list(self.errors),
            "draft_dossier": self.draft or None,
        }


def check_dossier(opened: OpenDossier, progress: Progress = SILENT) -> Checkup:
    """Read every mesh and mode set, assemble every design that has physics, and say what was found.

    An error in one design does not hide those of the next.
    """
    statements, cautions, errors = [], list(opened.warnings), []
    for name in opened.names:
        progress.tick(f"checking {name}")
        try:
            found, doubts = _check_design(opened, name, progress)
            statements += found
            cautions += doubts
        except HingelightError as error:
            errors.append(f"design '{name}': {error}")
    for plan in opened.dossier.tests:
        try:
            test = read_planned_test(opened.dossier, plan.name, progress)
            statements.append(f"test {plan.name}: {words_of_test(test)}")
            cautions += [f"test {plan.name}: {remark}" for remark in test.remarks]
        except HingelightError as error:
            errors.append(f"test '{plan.name}': {error}")
    return Checkup(tuple(statements), tuple(dict.fromkeys(cautions)), tuple(errors))


def _check_design(opened: OpenDossier, name: str, progress: Progress) -> tuple[list[str], list[str]]:
    design = opened.design(name, progress)
    plan = opened.dossier.plan(name)
    report = opened.workspace.report(opened.dossier, name)
    statements = [f"{name}: {mesh_words(design.mesh)}"]
    cautions = [*opened.doubts(name), *(f"{name}: {note}" for note in report.notes)]
    for carrier in design.points:
        carrier.where.rows(design.mesh, f"point '{carrier.name}'")
    for amplitude in opened.dossier.amplitudes:
        if amplitude.design == name and amplitude.where is not None:
            amplitude.where.rows(design.mesh, f"stated amplitude of mode {amplitude.mode}")
    has_material = bool(design.physics.assignments) and not states_no_material(design)
    if has_material:
        system = assemble(design, progress)
        free = len(system.free)
        ones = system.gather(np.tile([1.0, 0, 0], (design.mesh.n_nodes, 1)))
        mass = float(ones @ (system.M @ ones))
        statements.append(f"{name}: {system.n_dof} degrees of freedom, {free} free; mass {mass:.4g} kg")
        statements += [f"{name}: {statement}" for statement in system.statements]
        cautions += [f"{name}: {caution}" for caution in system.cautions]
    if plan.modes_file is not None:
        modes = opened.modes(name, None, progress)
        span = f"{modes.freq_hz.min():.4g} to {modes.freq_hz.max():.4g} Hz" if modes.count else "none"
        statements.append(f"{name}: {modes.count} modes from {plan.modes_file.name}, {span}")
        study = opened.study(name, None, progress)
        if study.energies is None and has_material:
            raise ModelError(study.no_energies)
        if study.energies is None or study.relative:
            cautions += study.cautions
        else:
            statements += [f"{name}: {study.energies.sentence(i)}" for i in range(modes.count)]
        advice = better_formulation(study, progress)
        if advice is not None:
            statements.append(advice.sentence)
    return statements, cautions


def check_mesh(path: Path, modes_path: Path | None, progress: Progress = SILENT) -> Checkup:
    """Read a bare mesh (and its mode set, by default one in the same file) and write a dossier to start from."""
    mesh, report = read_mesh_report(path, progress=progress)
    statements = [mesh_words(mesh)]
    if modes_path is not None:
        modes = read_modes(modes_path, mesh, progress=progress)
        statements.append(f"{modes.count} modes in {modes_path.name}")
    else:
        try:
            modes = read_modes(path, mesh, progress=progress)
            modes_path = path
            statements.append(f"{modes.count} modes in the same file")
        except LoadError as error:  # as for most meshes; the reason tells a broken mode set from none
            statements.append(f"no modes taken from the same file: {error.problem}")
    return Checkup(tuple(statements), (*report.warnings, *report.notes), (), bare_dossier(mesh, path, modes_path))


def words_of_test(test: TestSet) -> str:
    """ "22 points, 31 channels, 6 complex modes, 82.5 to 280.1 Hz" """
    kind = "complex modes" if test.is_complex else "modes"
    span = f"{test.freq_hz.min():.4g} to {test.freq_hz.max():.4g} Hz"
    return f"{len(test.labels)} points, {test.n_channels} channels, {test.count} {kind}, {span}"


def mesh_words(mesh: Mesh) -> str:
    """ "1204 nodes, 1150 quad4, size 0.9 × 0.1 × 0.08 m, 6 groups" """
    counts: dict[str, int] = {}
    for block in mesh.blocks:
        counts[block.kind] = counts.get(block.kind, 0) + len(block)
    kinds = ", ".join(f"{n} {kind}" for kind, n in counts.items()) or "no cells"
    size = (mesh.points.max(axis=0) - mesh.points.min(axis=0)) if mesh.n_nodes else (0, 0, 0)
    groups = len(mesh.node_groups) + len(mesh.cell_groups)
    return "{} nodes, {}, size {} m, {} groups".format(
        mesh.n_nodes, kinds, " × ".join(f"{s:.4g}" for s in size), groups
    )

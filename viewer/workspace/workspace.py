"""Reading, solving and caching for one run: memory first, then the cache on disk, then the work itself."""

from __future__ import annotations

import tempfile
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from viewer.errors import HingelightError, RefusedError
from viewer.jobs import SILENT, Progress, in_child
from viewer.loaders import (
    ReadReport,
    read_dossier_report,
    read_matrices,
    read_mesh_report,
    read_modes,
    read_planned_test,
)
from viewer.mechanics.eigen import solve
from viewer.model.design import Design
from viewer.model.dossier import DesignPlan, Dossier, StatedAmplitude
from viewer.model.modes import ArrayShapes, ModeSet
from viewer.workspace.keys import design_key
from viewer.workspace.store import Cache, read_modes_npz, write_modes_npz
from viewer.workspace.study import Study, study

if TYPE_CHECKING:
    from viewer.workspace.testing import TestStudy

# Nodes. A factorisation hears neither Ctrl-C nor a cancel, so that larger designs are solved in a process that can be
# killed; a block of 8 000 nodes (24 000 directions) keeps SuperLU busy for seconds at a stretch.
IN_CHILD_ABOVE = 4_000
BEYOND = 2  # times as many modes of a design as of a test beside it: some lie between those measured, some beyond


@dataclass
class Workspace:
    """One owner of load, solve and cache. ``cache`` None: nothing is kept on disk."""

    cache: Cache | None = field(default_factory=Cache)
    _designs: dict[tuple[Path, str], Design] = field(default_factory=dict)
    _modes: dict[str, ModeSet] = field(default_factory=dict)
    _reports: dict[tuple[Path, str], ReadReport] = field(default_factory=dict)

    def open(self, path: str | Path) -> OpenDossier:
        """Read and check ``dossier.toml`` (or a folder that holds one); meshes stay on disk until asked for."""
        dossier, warnings = read_dossier_report(dossier_file(path))
        return OpenDossier(self, dossier, warnings)

    def design(self, dossier: Dossier, name: str, progress: Progress = SILENT) -> Design:
        """The named design with its mesh read."""
        plan = dossier.plan(name)
        key = (dossier.path, name)
        if key not in self._designs:
            mesh, report = read_mesh_report(plan.mesh_file, length_unit=plan.length_unit, progress=progress)
            given = None if plan.matrices is None else read_matrices(plan.matrices, mesh, progress)
            self._designs[key] = plan.build(mesh, given)
            self._reports[key] = report
        return self._designs[key]

    def report(self, dossier: Dossier, name: str, progress: Progress = SILENT) -> ReadReport:
        """What reading the named design's mesh had to notice."""
        self.design(dossier, name, progress)
        return self._reports[dossier.path, name]

    def modes(
        self, design: Design, plan: DesignPlan | None = None, count: int | None = None, progress: Progress = SILENT
    ) -> ModeSet:
        """The mode set that the plan's file gives, or the first ``count`` modes solved (cached by content)."""
        if plan is not None and plan.modes_file is not None:
            key = f"{plan.modes_file}:{plan.length_unit}:{design.mesh.source}"
            if key not in self._modes:
                self._modes[key] = read_modes(
                    plan.modes_file, design.mesh, length_unit=plan.length_unit, progress=progress
                )
            return self._modes[key]
        return self.solve(design, count or (plan.mode_count if plan else 6), progress)

    def solve(self, design: Design, count: int, progress: Progress = SILENT) -> ModeSet:
        """The first ``count`` modes of ``design``; large ones in a process that can be killed."""
        key = design_key(design, count)
        found = self.known(design, count)
        if found is None:
            found = self._solved(design, count, key, progress)
        self._modes[key] = found
        return found

    def known(self, design: Design, count: int) -> ModeSet | None:
        """The modes if they were solved before."""
        key = design_key(design, count)
        return self._modes.get(key) or (self.cache.get(key) if self.cache else None)

    def keep(self, design: Design, count: int, modes: ModeSet) -> ModeSet:
        """Keep modes that were solved elsewhere; returns them."""
        key = design_key(design, count)
        if self.cache:
            write_modes_npz(self.cache.path(key), modes)
            self.cache.trim()
        self._modes[key] = modes
        return modes

    def _solved(self, design: Design, count: int, key: str, progress: Progress) -> ModeSet:
        stage = f"solving {design.name}"
        progress.tick(stage)
        if design.mesh.n_nodes <= IN_CHILD_ABOVE:
            return self.keep(design, count, solve(design, count, progress))
        if self.cache:
            path = in_child(_solve_into, design, count, self.cache.path(key), progress=progress, stage=stage)
            self.cache.trim()
            return read_modes_npz(path)
        with tempfile.TemporaryDirectory() as folder:
            return read_modes_npz(
                in_child(_solve_into, design, count, Path(folder) / "modes.npz", progress=progress, stage=stage)
            )


@dataclass(frozen=True)
class OpenDossier:
    """A dossier whose designs are read when asked for: ``dossier["baseline"]``."""

    workspace: Workspace
    dossier: Dossier
    warnings: tuple[str, ...] = ()

    @property
    def names(self) -> tuple[str, ...]:
        return tuple(plan.name for plan in self.dossier.plans)

    def __getitem__(self, name: str) -> Design:
        return self.design(name)

    def design(self, name: str, progress: Progress = SILENT) -> Design:
        return self.workspace.design(self.dossier, name, progress)

    def modes(self, name: str, count: int | None = None, progress: Progress = SILENT) -> ModeSet:
        """The mode set of the named design: from its file, or solved."""
        design, plan = self.design(name, progress), self.dossier.plan(name)
        wanted = count or plan.mode_count
        if plan.modes_file is None and any(test.design == name for test in self.dossier.tests):
            # a test needs modes beyond its own: solved once for both
            return _first(self.workspace.modes(design, plan, BEYOND * wanted, progress), wanted)
        return self.workspace.modes(design, plan, count, progress)

    def study(
        self, name: str, count: int | None = None, progress: Progress = SILENT, *, energy: bool = True
    ) -> Study:
        """The named design with modes, energies (unless ``energy`` is False) and stated sizes."""
        design = self.design(name, progress)
        modes = self.modes(name, count, progress)
        amplitudes = self._amplitudes(name, modes)
        found = study(design, modes, amplitudes, self.dossier.condition, progress, energy=energy)
        for number in found.amplitudes:  # a stated amplitude that cannot be used is said before anything is drawn
            try:
                found.scale(number - 1)
            except RefusedError as error:
                raise error.at(file=self.dossier.path, place="amplitudes") from None
        return found

    def test(self, name: str, design: str = "", count: int | None = None, progress: Progress = SILENT) -> TestStudy:
        """The named test beside the design that the dossier says, or beside ``design``; ``count`` modes of it are
        asked for at least. Raises what reading, solving and registration raise."""
        from viewer.workspace.testing import lay_beside  # heavy, and most runs have no test

        plan, recorded = self.dossier.test(name), read_planned_test(self.dossier, name, progress)
        beside = design or plan.design
        own = self.dossier.plan(beside)
        wanted = BEYOND * max(count or own.mode_count, recorded.count)
        modes = self.workspace.modes(self.design(beside, progress), own, wanted, progress)
        amplitudes = self._amplitudes(beside, modes)
        found = study(self.design(beside), modes, amplitudes, self.dossier.condition, progress, energy=False)
        try:
            return lay_beside(found, plan, recorded, self.dossier.length_unit, progress)
        except HingelightError as error:
            raise error.at(file=self.dossier.path, place=f'tests "{name}"') from None

    def doubts(self, name: str) -> tuple[str, ...]:
        """What reading the named design's mesh found hard to believe: an implausible size, nodes far off."""
        return tuple(f"{name}: {words}" for words in self.workspace.report(self.dossier, name).warnings)

    def stated_pairs(self, first: str, second: str) -> tuple[tuple[int, int], ...]:
        """Numbers of the modes of two designs that the dossier says correspond."""
        found = []
        for p in self.dossier.pairs:
            if (p.first_design, p.second_design) == (first, second):
                found.append((p.first_mode, p.second_mode))
            elif (p.first_design, p.second_design) == (second, first):
                found.append((p.second_mode, p.first_mode))
        return tuple(found)

    def _amplitudes(self, name: str, modes: ModeSet) -> dict[int, StatedAmplitude]:
        found = {}
        for item in self.dossier.amplitudes:
            if item.design != name:
                continue
            if item.mode <= modes.count:
                found[item.mode] = item if item.condition else replace(item, condition=self.dossier.condition)
        return found


def dossier_file(path: str | Path) -> Path:
    """The dossier that ``path`` names: the file itself, or ``dossier.toml`` in a folder."""
    path = Path(path)
    return path / "dossier.toml" if path.is_dir() else path


def _first(modes: ModeSet, count: int) -> ModeSet:
    """The first ``count`` modes of a solved set."""
    if modes.count <= count:
        return modes
    moved = np.array([modes.shape(i) for i in range(count)])
    turns = [modes.rotations(i) for i in range(count)]
    turned = None if any(turn is None for turn in turns) else np.array(turns)
    return modes.with_(freq_hz=modes.freq_hz[:count], shapes=ArrayShapes(moved, turned))


def _solve_into(design: Design, count: int, path: Path) -> Path:
    """Runs in the child: solve, write where the parent said, return the path."""
    return write_modes_npz(path, solve(design, count))

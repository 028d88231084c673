"""A hammer test beside a design: laid onto its mesh, compared, judged, spread over the mesh; each when asked for."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any, cast

import numpy as np
import scipy.sparse as sp

from viewer.errors import InputError, ModelError, SolveError
from viewer.insight.corrections import apply_corrections, correction_words
from viewer.insight.expand import Expansion, expand
from viewer.insight.hammer_pairing import TestCorrelation, correlate_test
from viewer.insight.register import register
from viewer.insight.registration import Registration
from viewer.insight.sensor_choice import SensorChoice, extra_points
from viewer.insight.soft_support import SoftSupport, soft_support
from viewer.insight.wrong_channels import Faults, find_faults
from viewer.jobs import SILENT, Progress
from viewer.mechanics.reduced import ChannelMass, reduce_to_channels
from viewer.model.arrays import Array
from viewer.model.dossier import TestPlan
from viewer.model.testset import Correction, TestSet
from viewer.workspace.explanation import Answer, Finding, asked
from viewer.workspace.study import Study, study


@dataclass(frozen=True, eq=False)
class TestExplanation:
    """The findings about a test, None where one cannot be had; ``refused`` then says why."""

    registration: Registration
    correlation: TestCorrelation | None
    faults: Faults | None
    points: SensorChoice | None
    support: SoftSupport | None
    expansion: Expansion | None
    refused: tuple[str, ...] = ()

    __test__ = False

    @property
    def findings(self) -> dict[str, Finding]:
        """The answers by question, in the order in which they are told."""
        named: dict[str, Finding | None] = {
            "correlation": self.correlation,
            "registration": self.registration,
            "faults": self.faults,
            "points": self.points,
            "support": self.support,
            "expansion": self.expansion,
        }
        return {name: finding for name, finding in named.items() if finding is not None}

    @property
    def sentences(self) -> tuple[str, ...]:
        return tuple(finding.sentence for finding in self.findings.values())

    def to_dict(self) -> dict[str, Any]:
        return {
            **{name: {**f.to_dict(), "sentence": f.sentence} for name, f in self.findings.items()},
            "refused": list(self.refused),
        }


@dataclass(frozen=True, eq=False)
class TestStudy:
    """A test and the design it is set beside.

    study       of the design, without energies; with modes beyond those of the test
    plan        what the dossier says of the test
    recorded    the test as its files have it; ``test``: with the accepted corrections made
    length_unit m per unit of length in the dossier, for lines to be written into it
    """

    study: Study
    plan: TestPlan
    recorded: TestSet
    test: TestSet
    registration: Registration
    length_unit: float = 1.0
    _found: dict[str, Any] = field(default_factory=dict, init=False, repr=False)

    __test__ = False

    @property
    def name(self) -> str:
        return self.test.name

    @property
    def design(self) -> str:
        return self.study.design.name

    @property
    def corrected(self) -> tuple[str, ...]:
        """What was put right in the test, in words."""
        return tuple(correction_words(c, self.recorded) for c in self.test.corrections)

    @property
    def cautions(self) -> tuple[str, ...]:
        """What a reader of any figure of this test must know."""
        words = [*self.test.remarks]
        if self.corrected:
            words.append(f"readings are corrected as the dossier says: {'; '.join(self.corrected)}")
        return tuple(f"test {self.name}: {w}" for w in words)

    @cached_property
    def analysis(self) -> Array:
        """(k, c) what the channels see of the design's modes. Raises ``RefusedError`` when the test's place on the
        mesh is not settled."""
        placed = self.registration.require(self.length_unit)
        return np.array([placed.seen(self.study.modes.shape(i)) for i in range(self.study.count)])

    def channel_mass(self, progress: Progress = SILENT) -> ChannelMass | None:
        """The design's mass brought down to the channels in use; None where the design does not state it."""

        def find() -> ChannelMass | None:
            sensing = sp.csr_array(self.registration.sensing[np.flatnonzero(self.registration.used)])
            try:
                return reduce_to_channels(self.study.design, sensing, progress)
            except (ModelError, SolveError):
                return None

        return self._once("mass", find)

    def correlation(self, progress: Progress = SILENT) -> TestCorrelation:
        """Which mode is which, and how well they agree."""

        def find() -> TestCorrelation:
            analysis = self.analysis
            mass = self.channel_mass(progress)
            return correlate_test(
                self.test,
                analysis,
                self.study.modes.freq_hz,
                design=self.design,
                names=self.study.names,
                used=self.registration.used,
                reduced_mass=None if mass is None else mass.mass,
            )

        return self._once("correlation", find)

    def faults(self, progress: Progress = SILENT) -> Faults:
        """Channels that seem wrong still, with the corrections that the dossier has."""

        def find() -> Faults:
            placed = self.registration.require(self.length_unit)
            return find_faults(
                self.test,
                placed.sensing,
                self.study.modes,
                mesh=self.study.design.mesh,
                placement=placed.placement,
                used=placed.used,
                design=self.design,
                progress=progress,
            )

        return self._once("faults", find)

    def points(self, progress: Progress = SILENT, count: int = 5) -> SensorChoice:
        """Whether the points are enough to tell the modes apart, and which ``count`` more would help most."""

        def find() -> SensorChoice:
            measured = [p.analysis for p in self.correlation(progress).paired if p.analysis]
            placed, there = self.registration, self.registration.used
            return extra_points(
                self.study.design.mesh,
                self.study.modes,
                self.analysis[:, there],
                count=count,
                numbers=measured,
                points=placed.points[self.test.sensor[there]],
                along=placed.directions[there],
                progress=progress,
            )

        return self._once(f"points {count}", find)

    @property
    def held(self) -> bool:
        """Whether the design is held somewhere: then there is no soft support to ask about."""
        return bool(self.study.design.physics.supports)

    def support(self) -> SoftSupport:
        """Whether the part hung softly enough, where the test was made on a free part."""
        free = None if not self.study.design.physics.assignments else not self.held
        return self._once("support", lambda: soft_support(self.test, free=free, used=self.registration.used))

    def expansion(self, progress: Progress = SILENT) -> Expansion:
        """The measured shapes spread over the mesh."""

        def find() -> Expansion:
            placed = self.registration.require(self.length_unit)
            return expand(self.test, placed.sensing, self.study.modes, used=placed.used, progress=progress)

        return self._once("expansion", find)

    def expanded(self, progress: Progress = SILENT) -> Study:
        """The design with the expanded shapes for modes: energies and findings of it are marked as such."""

        def find() -> Study:
            modes = self.expansion(progress).modes
            return study(self.study.design, modes, condition=self.study.condition, progress=progress)

        return self._once("expanded", find)

    def explain(self, progress: Progress = SILENT, *, extra: int = 5) -> TestExplanation:
        """All that is found about the test."""
        refused: list[str] = []
        return TestExplanation(
            self.registration,
            asked(lambda: self.correlation(progress), refused),
            asked(lambda: self.faults(progress), refused),
            asked(lambda: self.points(progress, extra), refused),
            None if self.held else asked(self.support, refused),
            asked(lambda: self.expansion(progress), refused),
            tuple(dict.fromkeys(refused)),
        )

    def to_dict(self) -> dict[str, Any]:
        return {
            "test": self.name,
            "design": self.design,
            "files": [path.name for path in self.plan.files],
            "modes": self.test.count,
            "channels": self.test.n_channels,
            "point_count": len(self.test.labels),
            "complex": self.test.is_complex,
            "corrections": list(self.corrected),
            "remarks": list(self.test.remarks),
        }

    def _once(self, question: str, find: Callable[[], Answer]) -> Answer:
        if question not in self._found:
            self._found[question] = find()
        return cast(Answer, self._found[question])


def lay_beside(
    beside: Study, plan: TestPlan, recorded: TestSet, length_unit: float = 1.0, progress: Progress = SILENT
) -> TestStudy:
    """Make the corrections that the dossier has, and lay the test onto the mesh of the design."""
    test = apply_corrections(recorded, plan.corrections)
    mesh = beside.design.mesh
    landmarks = [(landmark.point, landmark.place(mesh)) for landmark in plan.landmarks]
    placed = register(test, mesh, landmarks=landmarks, placement=plan.placement, progress=progress)
    return TestStudy(beside, plan, recorded, test, placed, length_unit)


def with_accepted(found: TestStudy, numbers: Sequence[int], progress: Progress = SILENT) -> tuple[Correction, ...]:
    """All corrections from now on: those that the dossier has, and the proposals ``numbers``.

    Raises ``InputError`` for a number that is not proposed.
    """
    proposals = {p.number: p for p in found.faults(progress).proposals}
    unknown = [n for n in numbers if n not in proposals]
    if unknown:
        listed = ", ".join(str(n) for n in proposals)
        raise InputError(
            f"no correction {unknown[0]} is proposed for test '{found.name}'",
            expected=f"one of: {listed}" if listed else "none: no channel seems wrong",
        )
    chosen = [proposals[n].correction for n in sorted(set(numbers))]
    return (*found.plan.corrections, *chosen)

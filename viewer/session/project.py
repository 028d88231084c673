"""What is known of an open dossier so far: studies, findings, comparisons. Frozen; grows by ``with_…``."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from types import MappingProxyType

from viewer.insight.hammer_pairing import TestCorrelation, TestPair
from viewer.insight.lineage import LineageFinding
from viewer.insight.wrong_channels import Faults
from viewer.scene.placed_test import PlacedTest, place
from viewer.workspace import OpenDossier, Study
from viewer.workspace.comparison import Comparison
from viewer.workspace.explanation import Explanation
from viewer.workspace.testing import TestStudy

Pair = tuple[str, str]


@dataclass(frozen=True, eq=False)
class Tested:
    """What is known of a hammer test: it is laid beside its design, and which mode is which.

    faults  None while nobody has looked for wrong channels; a string says why there are none to be had
    """

    found: TestStudy
    correlation: TestCorrelation
    faults: Faults | str | None = None

    @property
    def placed(self) -> PlacedTest:
        """The test in the mesh's axes."""
        at = self.found.registration
        return place(self.found.test, at.placement, at.used, at.places)

    def pair_of(self, mode: int) -> TestPair | None:
        """The pair that mode ``mode`` of the design is in."""
        return next((p for p in self.correlation.paired if p.analysis == mode), None)

    def with_faults(self, faults: Faults | str) -> Tested:
        return replace(self, faults=faults)


@dataclass(frozen=True, eq=False)
class Project:
    """One open dossier (or a bare mesh dressed as one).

    opened       None of its designs need have been read
    can_save     whether there is a dossier file that names can be written into
    studies      by design; told: explanations by (design, mode number)
    comparisons  by the names of both designs; a string says why there is none
    close        the pairs whose comparison also tells what changed in each mode, or that cannot be had
    lineage      of the dossier's designs, or why there is none
    tests        by name: a hammer test beside its design; a string says why there is none
    """

    opened: OpenDossier
    can_save: bool = True
    studies: Mapping[str, Study] = field(default_factory=dict)
    told: Mapping[tuple[str, int], Explanation] = field(default_factory=dict)
    comparisons: Mapping[Pair, Comparison | str] = field(default_factory=dict)
    close: frozenset[Pair] = frozenset()
    lineage: LineageFinding | str | None = None
    tests: Mapping[str, Tested | str] = field(default_factory=dict)

    def __post_init__(self) -> None:
        for name in ("studies", "told", "comparisons", "tests"):
            object.__setattr__(self, name, MappingProxyType(dict(getattr(self, name))))

    @property
    def title(self) -> str:
        return self.opened.dossier.title

    @property
    def designs(self) -> tuple[str, ...]:
        return self.opened.names

    def study(self, design: str) -> Study | None:
        return self.studies.get(design)

    def count(self, design: str) -> int:
        """Number of modes of a design, 0 while it is not known."""
        study = self.studies.get(design)
        return 0 if study is None else study.count

    def other_of(self, design: str, wished: str = "") -> str:
        """The design to compare with: the wished one, else the next of the dossier; empty when there is none."""
        if wished and wished != design and wished in self.designs:
            return wished
        others = [name for name in self.designs if name != design]
        at = self.designs.index(design) if design in self.designs else 0
        return "" if not others else others[min(at, len(others) - 1)]

    def comparison(self, first: str, second: str) -> Comparison | None:
        found = self.comparisons.get((first, second))
        return found if isinstance(found, Comparison) else None

    def partner(self, first: str, mode: int, second: str) -> int | None:
        """The mode of ``second`` that mode ``mode`` of ``first`` became, where the comparison is known."""
        found = self.comparison(first, second)
        if found is not None:
            return next((o.pair.second for o in found.outcomes if o.pair.first == mode), None)
        found = self.comparison(second, first)
        if found is not None:
            return next((o.pair.first for o in found.outcomes if o.pair.second == mode), None)
        return dict(self.opened.stated_pairs(first, second)).get(mode)

    def tests_of(self, design: str) -> tuple[str, ...]:
        """Names of the hammer tests that the dossier sets beside a design."""
        return tuple(plan.name for plan in self.opened.dossier.tests if plan.design == design)

    def tested(self, name: str) -> Tested | None:
        found = self.tests.get(name)
        return found if isinstance(found, Tested) else None

    def with_study(self, design: str, study: Study) -> Project:
        return replace(self, studies={**self.studies, design: study})

    def with_told(self, design: str, told: Explanation) -> Project:
        return replace(self, told={**self.told, (design, told.number): told})

    def with_comparison(self, pair: Pair, found: Comparison | str, *, closely: bool = True) -> Project:
        close = self.close | {pair} if closely or isinstance(found, str) else self.close
        return replace(self, comparisons={**self.comparisons, pair: found}, close=close)

    def with_lineage(self, found: LineageFinding | str) -> Project:
        return replace(self, lineage=found)

    def with_test(self, name: str, found: Tested | str) -> Project:
        return replace(self, tests={**self.tests, name: found})

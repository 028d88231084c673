"""A test of a dossier, read, with every point that the dossier names checked against it."""

from __future__ import annotations

from collections.abc import Iterator

from viewer.errors import DossierError
from viewer.jobs import SILENT, Progress
from viewer.loaders.registry import read_test
from viewer.model.dossier import Dossier, TestPlan
from viewer.model.testset import TestSet


def read_planned_test(dossier: Dossier, name: str, progress: Progress = SILENT) -> TestSet:
    """The test ``name`` as its files have it, corrections not yet applied. Raises ``LoadError`` for the files,
    ``DossierError`` for a landmark or correction at a point that the test does not have."""
    plan = dossier.test(name)
    test = read_test(plan.files, plan.length_unit, progress).with_(name=name)
    for place, label in _named_points(plan):
        if label not in test.labels:
            some = ", ".join(test.labels[:10]) + (" …" if len(test.labels) > 10 else "")
            raise DossierError(
                f"the test has no point '{label}'",
                file=dossier.path,
                place=f'tests "{name}", {place}',
                expected=f"one of: {some}",
            )
    return test


def _named_points(plan: TestPlan) -> Iterator[tuple[str, str]]:
    for number, landmark in enumerate(plan.landmarks, 1):
        yield f"landmarks {number}", landmark.point
    for number, correction in enumerate(plan.corrections, 1):
        for label in (correction.point, correction.other):
            if label:
                yield f"corrections {number}", label

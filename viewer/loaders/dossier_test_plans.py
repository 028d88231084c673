"""``[[tests]]`` of a dossier as data in SI; references, files and the placement are checked here."""

from __future__ import annotations

import numpy as np

from viewer.errors import DossierError
from viewer.loaders.dossier_parse import short
from viewer.loaders.dossier_parts import Parts
from viewer.loaders.dossier_test_tables import CorrectionTable, PlacementTable, TestTable
from viewer.loaders.dossier_values import LENGTHS
from viewer.model.dossier import DesignPlan, Landmark, TestPlan
from viewer.model.testset import Correction, Placement

_STRAIGHT = 1e-2  # what is written with two or three digits is still a rotation; it is made exact


def plan_of_test(parts: Parts, item: TestTable, place: str, plans: tuple[DesignPlan, ...]) -> TestPlan:
    """Raises ``DossierError``. Labels of points are checked once the test itself is read."""
    design = item.design or plans[0].name
    parts.known("design", design, [plan.name for plan in plans], f"{place}, design")
    files = [item.file] if isinstance(item.file, str) else item.file
    parts.no_duplicates(f"{place}, file", files)
    parts.no_duplicates(f"{place}, landmarks", [landmark.point for landmark in item.landmarks])
    unit = item.length_unit
    return TestPlan(
        item.name,
        tuple(parts.existing(name, f"{place}, file") for name in files),
        None if unit is None else float(LENGTHS[unit] if isinstance(unit, str) else unit),
        design,
        tuple(Landmark(mark.point, parts.position(mark.near), mark.node) for mark in item.landmarks),
        None if item.placement is None else _placement(parts, item.placement, f"{place}, placement"),
        tuple(_correction(parts, each) for each in item.corrections),
    )


def _placement(parts: Parts, item: PlacementTable, place: str) -> Placement:
    given = np.array(item.rotation)
    off = np.abs(given @ given.T - np.eye(3)).max()
    if not off <= _STRAIGHT or np.linalg.det(given) < 0:
        mirrored = off <= _STRAIGHT
        raise DossierError(
            "is a mirror image" if mirrored else "is no rotation",
            file=parts.path,
            place=f"{place}, rotation",
            found=short(item.rotation),
            expected="three rows of unit length, at right angles to one another and right-handed",
            do="turn the sign of one row, if the test's axes were right-handed" if mirrored else "",
        )
    left, _, right = np.linalg.svd(given)  # the nearest rotation: digits that were cut off must not shear a test
    return Placement(left @ right, np.array(item.shift) * parts.length, item.scale)


def _correction(parts: Parts, item: CorrectionTable) -> Correction:
    position = parts.position(item.position)
    return Correction(
        item.kind,
        item.point,
        item.axis or "",
        item.other_axis or "",
        item.other or "",
        None if position is None else tuple(position.tolist()),
    )

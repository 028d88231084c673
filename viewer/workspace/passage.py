"""Modes followed through what a dossier holds: a sweep, or its designs in order."""

from __future__ import annotations

from itertools import pairwise

from viewer.errors import InputError
from viewer.insight.lineage import LineageFinding, follow
from viewer.insight.pairing import cross_products
from viewer.jobs import SILENT, Progress
from viewer.model.dossier import SweepPlan
from viewer.workspace.sweep import sweep
from viewer.workspace.workspace import OpenDossier


def follow_sweep(
    opened: OpenDossier,
    plan: SweepPlan,
    count: int | None = None,
    insert: bool | None = None,
    progress: Progress = SILENT,
) -> LineageFinding:
    """Solve a sweep of the dossier and follow its modes; ``count`` and ``insert`` stand for the plan's own."""
    design = opened.design(plan.design, progress)
    put_in = plan.insert if insert is None else insert
    found = sweep(
        opened.workspace,
        design,
        plan.variation,
        plan.values,
        count or plan.count,
        insert=put_in,
        progress=progress,
    )
    return found.lineage


def follow_designs(opened: OpenDossier, count: int | None = None, progress: Progress = SILENT) -> LineageFinding:
    """Follow the modes of a dossier's designs from each to the next; pairs that it states stand as they are.

    ``InputError`` when there is one design only, ``RefusedError`` when two neighbours share no common support.
    """
    if len(opened.names) < 2:
        raise InputError(
            "one design alone has no lineage",
            file=opened.dossier.path,
            do="add another design to the dossier, or [[sweeps]] and name one",
        )
    studies = [opened.study(name, count, progress, energy=False) for name in opened.names]
    crosses, stated = [], []
    for one, two in pairwise(studies):
        support = one.support_with(two, progress)
        crosses.append(cross_products(one.design, one.modes, two.design, two.modes, support, progress))
        stated.append(opened.stated_pairs(one.design.name, two.design.name))
    return follow(
        range(1, len(studies) + 1),
        [study.modes.freq_hz for study in studies],
        crosses,
        parameter="design",
        unit=None,
        labels=[study.design.name for study in studies],
        names=[study.design.mode_names for study in studies],
        stated=stated,
    )

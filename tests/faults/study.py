"""How well faults are found: 200 seeds each of the boom and the fork, 0 to 3 faults, as committed in table.csv.

    python -m tests.faults.study

The method was tuned on seeds 0 to 199; the table is of others, which it had not seen. Every point has three channels.
In the parts called sparse most have one, and 100 seeds are run: what then is told apart is fewer, above all places.

Definitions (those of places and of dead points found in part were settled while tuning):

fault       0, 1, 2 or 3 (seed modulo 4) at as many different points, kind and place at random: a sign flipped, two
            axes of a point exchanged, two points exchanged, a point that was measured elsewhere (any node of the skin
            where a sensor could sit), a channel or a whole point that reads noise only. Nothing is done to choose
            faults that show.
detectable  by truth: without noise the fault changes at least one reading of its point by ``SEEN`` noise levels or
            more, root mean square over the modes. Found is also counted over all faults, detectable or not.
found       a proposal of the same kind at the same place: point and axis; both axes; both points; for a point
            measured elsewhere a place within ``NEAR`` of the size of the part, or within the reach that the proposal
            states (or nothing, where it reads noise at that place); of a dead point every channel whose
            loss is detectable by itself, and none that is alive. The kind must be right: "left out" for a wrong sign
            is a miss and a false proposal. A proposal that names alternatives counts by its first cause.
false       a proposal that is true of no fault, detectable or not; as a share of the proposals made, of the runs with
            one at least, and of the runs of tests without faults with one at least.
"""

from __future__ import annotations

import csv
from collections.abc import Iterable
from pathlib import Path

import numpy as np

from tests.faults.articles import design, modelled
from tests.faults.sets import HERE, KINDS, NOISE, SEEN, Case, Fault, case
from viewer.insight.corrections import axis_of
from viewer.insight.wrong_channels import Faults, Proposal, find_faults
from viewer.jobs import atomic_path
from viewer.model.testset import Correction

SEEDS = range(5000, 5200)
NEAR = 0.05
SETS = (
    ("boom", "boom", False),
    ("fork", "fork", False),
    ("boom sparse", "boom", True),
    ("fork sparse", "fork", True),
)
TABLE = Path(__file__).parent / "table.csv"
TOTALS = Path(__file__).parent / "totals.csv"
FIELDS = (
    "part", "seed", "article", "kind", "fault", "change", "detectable", "found", "alone", "proposal", "place_error",
    "false",
)  # fmt: skip


def run(one: Case, **changes) -> Faults:
    about = {"mesh": design(one.part).mesh, "placement": HERE, **changes}
    return find_faults(one.test, one.sensing, modelled(one.part), **about)


def rows_of(one: Case, found: Faults) -> list[dict[str, object]]:
    """One row for every fault, then one for every false proposal, at least one for every run."""
    rows, matched = [], set()
    for fault in one.faults:
        right = [p for p in found.proposals if p.number not in matched and true_of(one, fault, p)]
        matched |= {p.number for p in right}
        rows.append(
            {
                "kind": fault.kind,
                "fault": told(fault.correction),
                "change": f"{fault.change:.1f}",
                "detectable": int(fault.detectable),
                "found": int(bool(right) and complete(one, fault, right)),
                "alone": int(bool(right) and all(p.certain for p in right)),
                "proposal": " + ".join(told(p.correction) for p in right),
                "place_error": f"{error(one, fault, right[0]):.3f}" if right and right[0].reach is not None else "",
                "false": 0,
            }
        )
    rows += [
        {"kind": "none", "proposal": told(p.correction), "alone": int(p.certain), "false": 1}
        for p in found.proposals
        if p.number not in matched
    ]
    head = {"part": one.part, "seed": one.seed, "article": one.article}
    return [{**dict.fromkeys(FIELDS, ""), **head, **row} for row in rows or [{"kind": "none", "false": 0}]]


def true_of(one: Case, fault: Fault, proposal: Proposal) -> bool:
    """Whether what is proposed is true of the fault."""
    truth, said = fault.correction, proposal.correction
    if fault.mute and said.kind == "leave out":
        return said.point == truth.point
    if truth.kind != said.kind:
        return False
    if truth.kind == "leave out":
        return _channels(one, said) <= _channels(one, truth)
    if truth.position is not None:
        if said.point != truth.point or said.position is None or proposal.reach is None:
            return False
        return error(one, fault, proposal) <= max(NEAR, proposal.reach / design(one.part).mesh.diagonal)
    if truth.other:
        return {truth.point, truth.other} == {said.point, said.other}
    return (truth.point, {truth.axis, truth.other_axis}) == (said.point, {said.axis, said.other_axis})


def complete(one: Case, fault: Fault, proposals: list[Proposal]) -> bool:
    """Whether all of a fault is said: of a dead point, every channel whose loss is detectable by itself."""
    if fault.correction.kind != "leave out":
        return True
    dead = sorted(_channels(one, fault.correction))
    loss = np.sqrt((one.true[:, dead] ** 2).mean(axis=0)) / NOISE
    out = set().union(*(_channels(one, p.correction) for p in proposals))
    return {c for c, n in zip(dead, loss, strict=True) if n >= SEEN} <= out


def error(one: Case, fault: Fault, proposal: Proposal) -> float:
    """How far a proposed place lies from the true one, share of the size of the part."""
    away = np.subtract(fault.correction.position, proposal.correction.position)
    return float(np.linalg.norm(away) / design(one.part).mesh.diagonal)


def _channels(one: Case, fix: Correction) -> set[int]:
    rows = one.test.channels_of(one.test.row(fix.point))
    return {int(c) for c in rows if fix.axis in ("", axis_of(one.test, c))}


def told(fix: Correction) -> str:
    place = "" if fix.position is None else "at " + " ".join(f"{x:.4f}" for x in fix.position)
    return " ".join(word for word in (fix.kind, fix.point, fix.axis, fix.other_axis, fix.other, place) if word)


def totals(rows: Iterable[dict]) -> list[dict[str, object]]:
    """By part and kind of fault, of detectable faults and of all."""
    rows = list(rows)
    out = []
    for part in dict.fromkeys(r["part"] for r in rows):
        mine = [r for r in rows if r["part"] == part]
        runs = {r["seed"] for r in mine}
        bad = {r["seed"] for r in mine if int(r["false"])}
        clean = runs - {r["seed"] for r in mine if r["fault"]}
        for kind in (*KINDS, "all"):
            faults = [r for r in mine if r["fault"] and kind in (r["kind"], "all")]
            seen = [r for r in faults if int(r["detectable"])]
            made = [r for r in mine if r["proposal"]]
            row = {
                "part": part,
                "kind": kind,
                "faults": len(faults),
                "found_of_all": sum(int(r["found"]) for r in faults),
                "detectable": len(seen),
                "found": sum(int(r["found"]) for r in seen),
                "found_share": f"{sum(int(r['found']) for r in seen) / max(len(seen), 1):.3f}",
            }
            if kind == "all":
                wrong = sum(int(r["false"]) for r in mine)
                row |= {"runs": len(runs), "proposals": len(made), "false": wrong}
                row |= {"false_of_proposals": f"{wrong / max(len(made), 1):.4f}", "runs_with_false": len(bad)}
                row |= {"false_of_runs": f"{len(bad) / len(runs):.4f}"}
                row |= {"runs_without_fault": len(clean), "of_these_with_false": len(clean & bad)}
            out.append(row)
    return out


def read(path: Path) -> list[dict[str, str]]:
    with path.open(newline="", encoding="utf-8") as file:
        return list(csv.DictReader(file))


def write(path: Path, rows: list[dict]) -> None:
    fields = list(dict.fromkeys(key for row in rows for key in row))
    with atomic_path(path) as target, target.open("w", newline="", encoding="utf-8") as file:
        writer = csv.DictWriter(file, fields, lineterminator="\n", restval="")
        writer.writeheader()
        writer.writerows(rows)


def main() -> None:
    rows = []
    for name, part, sparse in SETS:
        for seed in SEEDS[:100] if sparse else SEEDS:
            one = case(part, seed, sparse=sparse)
            rows += [{**row, "part": name} for row in rows_of(one, run(one))]
    write(TABLE, rows)
    write(TOTALS, totals(rows))


if __name__ == "__main__":
    main()

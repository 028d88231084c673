"""Noisy shapes: what the search makes of modes that come as a measurement or another program would give them.

Gaussian noise of 2 % of the largest motion on every component of every node; rotations are dropped in every other
part, and no energies are handed over. Each part is looked at in its modes with a strong hinge that folds by one angle
or, where it has none, in three modes free of hinges; modes free of hinges of parts with bands are looked at as well.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence

import numpy as np

from tests.collection.parts import SEED, Part
from tests.collection.registry import part_named
from tests.collection.scoring import Row, score
from tests.collection.solved import Solved, solved
from viewer.model.modes import ArrayShapes, ModeSet

LEVEL, SEEDS = 0.02, 5
WITH, WITHOUT, FREE = 12, 6, 2  # parts with strong hinges, parts without bands, free modes looked at in each


def noisy(given: ModeSet, seed: Sequence[int], rotations: bool) -> ModeSet:
    """The same modes with noise, as an import of unknown origin."""
    random = np.random.default_rng(seed)
    moved = np.stack([given.shape(i) for i in range(given.count)])
    turned = None
    for shape in moved:
        shape += LEVEL * np.abs(shape).max() * random.normal(size=shape.shape)
    if rotations and given.shapes.has_rotations:
        turned = np.stack([given.rotations(i) for i in range(given.count)])
        for shape in turned:
            shape += LEVEL * np.abs(shape).max() * random.normal(size=shape.shape)
    return given.with_(shapes=ArrayShapes(moved, turned), origin="imported", normalisation="unknown")


def chosen(parts: Sequence[Part]) -> list[tuple[Part, list[int], list[int]]]:
    """One part a family, of every kind of cell in turn, with its modes with hinges and without."""
    families: dict[str, list[Part]] = {}
    for part in parts:
        families.setdefault(part.family, []).append(part)
    out, count = [], {True: 0, False: 0}
    for number, members in enumerate(families.values()):
        start = number % len(members)
        for part in members[start:] + members[:start]:
            ready = solved(part)
            strong = [j for j, t in enumerate(ready.truths) if any(_clear(x) and _line(ready, x) for x in t)]
            free = [j for j, t in enumerate(ready.truths) if all(x.level == "none" for x in t)]
            bent = bool(strong)
            if (part.sheet.bands and not bent) or count[bent] >= (WITH if bent else WITHOUT):
                continue
            count[bent] += 1
            out.append((part, strong, free[: FREE if bent else FREE + 1]))
            break
    return out


def _clear(t) -> bool:
    return t.level == "strong" and t.one_angle


def _line(ready: Solved, t) -> bool:
    return ready.part.sheet.bands[t.band].kind != "joint"


def _scored(task: tuple[int, str, list[int]]) -> list[Row]:
    number, name, wanted = task
    ready, rows = solved(part_named(name)), []
    for seed in range(SEEDS):
        modes = noisy(ready.modes, [SEED, number, seed], rotations=number % 2 == 0)
        rows += score(ready, modes, wanted)
    return rows


def run(parts: Sequence[Part], say: Callable[[str], None], each: Callable[..., Iterable] = map) -> dict[str, float]:
    """Totals of the run with noise."""
    picked = chosen(parts)
    rows: list[Row] = []
    tasks = [(number, part.name, sorted({*strong, *free})) for number, (part, strong, free) in enumerate(picked)]
    for (part, strong, free), fresh in zip(picked, each(_scored, tasks), strict=True):
        lines = [r for r in fresh if r.level == "strong" and r.kind != "joint"]
        hits, false = sum(r.hit for r in lines), sum(bool(r.false) for r in fresh if r.free and r.band <= 1)
        say(f"noise: {part.name}, modes {[j + 1 for j in strong]}: {hits} of {len(lines)} found; "
            f"free modes {[j + 1 for j in free]}: {false} of {SEEDS * len(free)} false")  # fmt: skip
        rows += fresh
    lines = [r for r in rows if r.level == "strong" and r.kind != "joint"]
    hits = [r for r in lines if r.hit]
    clear = [r for r in rows if r.free and r.band <= 1]
    position, direction = (np.array([getattr(r, name) for r in hits]) for name in ("position", "direction"))
    false = sum(bool(r.false) for r in clear)
    most = lambda values, share: float(np.quantile(values, share)) if len(values) else float("nan")  # noqa: E731
    return {
        "parts": len(picked),
        "parts with hinges": sum(bool(strong) for _, strong, _ in picked),
        "seeds": SEEDS,
        "strong hinges": len(lines),
        "found": len(hits),
        "recall": len(hits) / len(lines) if lines else float("nan"),
        "called strong": sum(r.found.endswith("strong") for r in hits),
        "hinge-free modes": len(clear),
        "of these with a false hinge": false,
        "false share": false / len(clear) if clear else float("nan"),
        "stray hinges in modes with one": sum(bool(r.false) for r in rows if not r.free and r.band <= 1),
        "position median": most(position, 0.5),
        "position 95 %": most(position, 0.95),
        "position worst": most(position, 1.0),
        "position beyond 0.035": int((position > 0.035).sum()),
        "direction median": most(direction, 0.5),
        "direction 95 %": most(direction, 0.95),
        "direction worst": most(direction, 1.0),
        "direction beyond 12": int((direction > 12).sum()),
    }

"""The same part in another mesh: do the findings stay, and how far do they move?

Pairs: twice the density, bricks against tetrahedra, solid against shell. Modes are paired by their shape (MAC on the
middle of the sheet, sampled in s and t); a pair counts when MAC ≥ 0.9 and a band is strong in either mesh.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence

import numpy as np
from scipy.interpolate import LinearNDInterpolator, NearestNDInterpolator
from scipy.optimize import linear_sum_assignment

from tests.collection.parts import Part
from tests.collection.registry import part_named
from tests.collection.scoring import NEAR, gap, in_plane, named
from tests.collection.sheets import Sheet, build
from tests.collection.solved import Solved, solved
from viewer.insight.correlate import mac
from viewer.insight.hinges import Hinge, find_hinges
from viewer.model.arrays import Array

ALIKE = 0.9
CELLS = 3_500  # parts whose finer mesh has more cells are left out
OTHERS = {"hex20": ("tet10", "quad8"), "quad8": ("tri3",), "quad4": ("tri3",)}


def sampled(ready: Solved, at: Array) -> Array:
    """(modes, 3 k) motion of the middle of the sheet at (k, 2) places s, t."""
    where, built = ready.built.where, ready.built
    level = np.abs(where[:, 2]) if built.solid else where[:, 2] * 0
    rows = np.nonzero(~np.isin(np.arange(len(where)), _only_ribs(ready)))[0]
    # Of the nodes above one another the one nearest to the middle.
    rows = rows[np.lexsort((level[rows], where[rows, 1].round(9), where[rows, 0].round(9)))]
    _, first = np.unique(where[rows, :2].round(9), axis=0, return_index=True)
    rows = rows[first]
    moved = np.stack([ready.modes.shape(i)[rows] for i in range(ready.first, ready.modes.count)], axis=1)
    values = LinearNDInterpolator(where[rows, :2], moved)(at)
    outside = np.isnan(values).any(axis=(1, 2))
    values[outside] = NearestNDInterpolator(where[rows, :2], moved)(at[outside])
    return values.transpose(1, 0, 2).reshape(moved.shape[1], -1)


def _only_ribs(ready: Solved) -> Array:
    mesh, rib = ready.built.mesh, ready.built.rib
    return np.setdiff1d(mesh.nodes_of_cells(np.nonzero(rib)[0]), mesh.nodes_of_cells(np.nonzero(~rib)[0]))


def places(sheet: Sheet) -> Array:
    """Places on a grid where there is material."""
    s, t = (np.linspace(0.02, 0.98, 17) * size for size in sheet.size)
    at = np.stack(np.meshgrid(s, t, indexing="ij"), axis=-1).reshape(-1, 2)
    return at[sheet.thickness_at(*at.T) > 0]


def found(ready: Solved, j: int) -> list[Hinge]:
    finding = find_hinges(ready.built.design, ready.modes, ready.first + j + 1, ready.energies)
    return list(named(finding))


def compare(first: Solved, second: Solved) -> list[dict]:
    """One entry per band that is strong in either of two paired modes."""
    at = places(first.part.sheet)
    alike = mac(sampled(first, at), sampled(second, at))
    out = []
    for i, j in zip(*linear_sum_assignment(-alike), strict=True):
        if alike[i, j] < ALIKE:
            continue
        levels = zip(first.truths[i], second.truths[j], strict=True)
        bands = [a.band for a, b in levels if "strong" in (a.level, b.level)]
        if not bands:
            continue
        both = [found(ready, mode) for ready, mode in ((first, i), (second, j))]
        for number in bands:
            band = first.part.sheet.bands[number]
            picked = [
                min((h for h in hinges if gap(ready.built, band, h) <= NEAR),
                    key=lambda h, r=ready: gap(r.built, band, h), default=None)
                for ready, hinges in zip((first, second), both, strict=True)
            ]  # fmt: skip
            moved = float("nan")
            if None not in picked:
                moved = (
                    in_plane(first.built, band, picked[1].position, picked[0].position) / first.built.mesh.diagonal
                )
            out.append({
                "mode": int(i) + 1, "band": number + 1, "found": [h is not None for h in picked], "moved": moved,
                "counts": tuple(len(hinges) for hinges in both), "levels": (first.truths[i][number].level,
                                                                           second.truths[j][number].level),
            })  # fmt: skip
    return out


def pairs(parts: Sequence[Part]) -> list[tuple[str, Part, Part, int]]:
    """The pairs, one part per family and change."""
    out, done = [], set()
    for part in parts:
        if not part.sheet.bands:
            continue
        changes: list[tuple[str, Part, int]] = [("refined", part, 2)]
        for kind in OTHERS.get(part.kind, ()):
            word = {"tet10": "tetrahedra", "quad8": "shell"}.get(kind, "triangles")
            changes.append((word, part.twin(kind), 1))
        for word, other, density in changes:
            if (part.family, word) in done:
                continue
            mesh = build(other.name, other.sheet, other.kind, density)
            if mesh.mesh.n_cells > CELLS * (1 if mesh.solid else 2):
                continue
            done.add((part.family, word))
            out.append((word, part, other, density))
    return out


def _compared(pair: tuple[str, str, int]) -> list[dict]:
    first, second, density = pair
    return compare(solved(part_named(first)), solved(part_named(second), density))


def run(parts: Sequence[Part], say: Callable[[str], None], each: Callable[..., Iterable] = map) -> dict[str, float]:
    """Totals of all pairs, by kind of change."""
    entries: dict[str, list[dict]] = {}
    picked = pairs(parts)
    tasks = [(first.name, second.name, density) for _, first, second, density in picked]
    for (word, first, _, _), fresh in zip(picked, each(_compared, tasks), strict=True):
        entries.setdefault(word, []).extend(fresh)
        for e in fresh:
            if not all(e["found"]) or e["moved"] > 0.005 or e["counts"][0] != e["counts"][1]:
                say(f"invariance: {first.name} {word}: {e}")
    out: dict[str, float] = {}
    for word, group in entries.items():
        moved = np.array([e["moved"] for e in group if np.isfinite(e["moved"])])
        out |= {
            f"{word}: hinges": len(group),
            f"{word}: found in both": sum(all(e["found"]) for e in group),
            f"{word}: found in one only": sum(e["found"][0] != e["found"][1] for e in group),
            f"{word}: same number of hinges": sum(e["counts"][0] == e["counts"][1] for e in group),
            f"{word}: moved median": float(np.median(moved)) if len(moved) else float("nan"),
            f"{word}: moved worst": float(moved.max()) if len(moved) else float("nan"),
            f"{word}: moved beyond 0.005": int((moved > 0.005).sum()),
        }
    return out

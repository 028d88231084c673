"""Score the search for hinge lines: ``python -m tests.collection.score --families development|scored|all``.

Prints totals and the rows that went wrong. ``--runs coarse,fine,noise,invariance`` says what is done: the parts, the
parts at twice the density, noisy shapes, other meshes of the same parts. ``--write`` puts rows into table.csv and
totals into totals.csv; those of other runs stay, so that all must be run again after a change of the search.
"""

from __future__ import annotations

import argparse
import csv
import io
import math
import multiprocessing
import sys
import time
from collections.abc import Callable, Iterable, Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import asdict, fields
from functools import partial
from importlib import import_module
from pathlib import Path

import numpy as np

from tests.collection.parts import SEED, VERSION, Part
from tests.collection.registry import DEVELOPMENT, GROUPS, SCORED, part_named, parts_of
from tests.collection.scoring import Row, score
from tests.collection.sheets import build
from tests.collection.solved import solved
from viewer.jobs import write_text

Each = Callable[..., Iterable]  # map, or that of a pool of processes
HERE = Path(__file__).parent
TABLE = HERE / "table.csv"
TOTALS = HERE / "totals.csv"
LARGEST = {"quad4": 6_500, "tri3": 7_500, "quad8": 2_000, "hex8": 2_500, "hex20": 1_500, "tet10": 4_000}  # cells
OTHER_RUNS = ("noise", "invariance")  # modules of this package
DIRECTION_DEG, POSITION, SHARE_OFF = 3.0, 0.01, 0.15  # what a strong hinge must keep to


def totals(rows: Sequence[Row]) -> dict[str, float]:
    """Figures over rows of lines, joints and modes without hinges."""
    strong = [r for r in rows if r.level == "strong"]
    lines = [r for r in strong if r.kind != "joint"]
    joints = [r for r in strong if r.kind == "joint"]
    hits = [r for r in lines if r.hit]
    free = _modes(r for r in rows if r.free)
    bent = _modes(r for r in rows if not r.free)
    out: dict[str, float] = {
        "parts": len({r.part for r in rows}),
        "modes": len(free) + len(bent),
        "strong hinges": len(lines),
        "found": len(hits),
        "recall": _ratio(len(hits), len(lines)),
        "within all bounds": sum(_within(r) for r in hits),
        "curves": sum(r.kind == "curve" for r in lines),
        "curves called curves": sum(r.found.startswith("curve") for r in hits if r.kind == "curve"),
        "joints": len(joints),
        "joints found": sum(r.hit for r in joints),
        "joints called joints": sum(r.hit and r.found.startswith("joint") for r in joints),
        "strong by energy only": sum(r.level == "energy only" for r in rows),
        "of these found": sum(r.level == "energy only" and r.hit for r in rows),
        "hinge-free modes": len(free),
        "of these with a false hinge": sum(any(r.false for r in m) for m in free),
        "false share": _ratio(sum(any(r.false for r in m) for m in free), len(free)),
        "of these with an idle band named": sum(any(r.idle for r in m) for m in free),
        "other modes with a stray hinge": sum(any(r.false for r in m) for m in bent),
        "other modes": len(bent),
    }
    for name in ("position", "direction", "axis", "fold", "stiffness"):
        values = np.abs([getattr(r, name) for r in hits])
        values = values[np.isfinite(values)]
        for word, figure in (("median", np.median), ("worst", np.max)):
            out[f"{name} {word}"] = float(figure(values)) if len(values) else float("nan")
        bound = {"position": POSITION, "direction": DIRECTION_DEG, "axis": DIRECTION_DEG}.get(name, SHARE_OFF)
        out[f"{name} beyond {bound:g}"] = int((values > bound).sum())
        if name in ("fold", "stiffness"):
            out[f"{name} judged"] = len(values)
    out["stiffness without a settled truth"] = sum(math.isnan(r.mesh) for r in hits)
    out["mesh worst"] = max((abs(r.mesh) for r in hits if not math.isnan(r.mesh)), default=float("nan"))
    return out


def _within(r: Row) -> bool:
    pairs = ((r.position, POSITION), (r.direction, DIRECTION_DEG), (r.axis, DIRECTION_DEG), (r.fold, SHARE_OFF),
             (r.stiffness, SHARE_OFF))  # fmt: skip
    return all(not abs(value) > bound for value, bound in pairs)


def _ratio(part: int, whole: int) -> float:
    return part / whole if whole else float("nan")


def _modes(rows: Iterable[Row]) -> list[list[Row]]:
    groups: dict[tuple, list[Row]] = {}
    for r in rows:
        groups.setdefault((r.part, r.density, r.mode), []).append(r)
    return list(groups.values())


def wrong(row: Row) -> str:
    """What is to be looked at in a row, "" when nothing is."""
    words = []
    if row.level == "strong" and not row.hit:
        words.append("MISSED")
    if row.level == "strong" and row.hit and row.kind != "joint" and not _within(row):
        words.append("INEXACT")
    if row.false:
        words.append("FALSE" if row.free else "STRAY")
    return " ".join(words)


def text_of(rows: Sequence[Row]) -> str:
    """The table as text; its first line states seed and version of the generator."""
    out = io.StringIO()
    out.write(f"# seed {SEED}, generator version {VERSION}\n")
    writer = csv.DictWriter(out, [f.name for f in fields(Row)], lineterminator="\n")
    writer.writeheader()
    for row in rows:
        writer.writerow({name: cell(value) for name, value in asdict(row).items()})
    return out.getvalue()


def cell(value: object) -> object:
    if isinstance(value, bool):
        return int(value)
    if isinstance(value, float):
        return "" if np.isnan(value) else f"{value:.4g}"
    return value


def read_table(path: Path = TABLE) -> tuple[str, list[dict[str, str]]]:
    """First line and rows of a table written by :func:`text_of`."""
    first, rest = path.read_text("utf-8").split("\n", 1)
    return first, list(csv.DictReader(io.StringIO(rest)))


def _row(texts: dict[str, str]) -> Row:
    """A row as it was before it was written."""
    read = {"str": str, "int": int, "bool": lambda text: text == "1", "float": lambda text: float(text or "nan")}
    return Row(**{f.name: read[f.type](texts[f.name]) for f in fields(Row)})


def run(parts: Sequence[Part], say: Callable[[str], None], each: Each = map, density: int = 1) -> list[Row]:
    """All parts scored, those of more cells than ``LARGEST`` at the coarse density only; ``say`` hears what went
    wrong."""
    rows: list[Row] = []
    fits = [p for p in parts if density == 1 or _cells(p, density) <= LARGEST[p.kind]]
    for part, (fresh, cells, took) in zip(
        fits, each(partial(_scored, density=density), [p.name for p in fits]), strict=True
    ):
        say(f"{part.name} ({cells} cells, {took:.2f} s a mode)")
        for row in fresh:
            if wrong(row):
                facts = {name: cell(value) for name, value in asdict(row).items() if name != "part"}
                say(f"    {wrong(row)}: " + " ".join(f"{name}={value}" for name, value in facts.items()))
        rows += fresh
    return rows


def _cells(part: Part, density: int) -> int:
    return build(part.name, part.sheet, part.kind, density).mesh.n_cells


def _scored(name: str, density: int) -> tuple[list[Row], int, float]:
    part = part_named(name)
    ready = solved(part, density)
    start = time.perf_counter()
    rows = score(ready)
    return rows, ready.built.mesh.n_cells, (time.perf_counter() - start) / max(1, part.modes)


def show(title: str, figures: dict[str, float], say: Callable[[str], None]) -> None:
    say(f"\n{title}")
    for name, value in figures.items():
        say(f"    {name:34s} {value if isinstance(value, int) else format(value, '.4g')}")


def results_of(rows: Sequence[Row]) -> dict[str, dict[str, float]]:
    """Totals by density and group of families, of the half seen while the search was made, of the scored half, and of
    everything."""
    names = {group: {p.name for p in parts_of(group)} for group in GROUPS}
    names["development half"] = set().union(*(names[group] for group in DEVELOPMENT))
    names["scored half"] = set().union(*(names[group] for group in SCORED))
    names["all"] = names["development half"] | names["scored half"]
    out = {}
    for density, word in ((1, ""), (2, "twice as dense: ")):
        for group, members in names.items():
            picked = [r for r in rows if r.density == density and r.part in members]
            if picked and (density > 1 or {r.part for r in picked} == members):
                out[word + group] = totals(picked)
    return out


def _merged(old: Sequence[Row], new: Sequence[Row]) -> list[Row]:
    """The new rows with the old ones of other parts and densities, in the order of the parts."""
    done = {(r.part, r.density) for r in new}
    order = {p.name: i for i, p in enumerate(p for group in GROUPS for p in parts_of(group))}
    kept = [r for r in old if (r.part, r.density) not in done and r.part in order]
    return sorted([*kept, *new], key=lambda r: (r.density, order[r.part], r.mode, r.band))


def _write(rows: Sequence[Row], others: dict[str, dict[str, float]]) -> None:
    """Put rows into the table and totals beside it; those of other runs of the same generator stay."""
    head, kept = f"# seed {SEED}, generator version {VERSION}", {}
    same = TABLE.exists() and TABLE.read_text("utf-8").startswith(head + "\n")
    rows = _merged([_row(r) for r in read_table()[1]] if same else [], rows)
    if same and TOTALS.exists():
        for line in TOTALS.read_text("utf-8").splitlines()[2:]:
            run_name, name, value = line.split(",")
            if run_name.startswith(OTHER_RUNS):
                kept.setdefault(run_name, {})[name] = value
    results = results_of(rows) | kept | others
    write_text(TABLE, text_of(rows))
    lines = [f"{title},{name},{cell(value)}" for title, figures in results.items() for name, value in figures.items()]
    write_text(TOTALS, "\n".join([head, "run,figure,value", *lines]) + "\n")


def main(arguments: Sequence[str] | None = None) -> int:
    parser = argparse.ArgumentParser(prog="python -m tests.collection.score", description=__doc__)
    parser.add_argument("--families", choices=[*GROUPS, "development", "scored", "all"], default="tuning")
    parser.add_argument("--runs", default="coarse", help="some of coarse, fine, noise, invariance, with commas")
    parser.add_argument("--part", default="", help="only parts whose names contain this")
    parser.add_argument("--jobs", type=int, default=1, help="processes")
    parser.add_argument("--write", action="store_true", help="update table.csv and totals.csv")
    given = parser.parse_args(arguments)
    say = lambda line: print(line, flush=True)  # noqa: E731, T201
    each: Each = map
    if given.jobs > 1:
        each = ProcessPoolExecutor(given.jobs, multiprocessing.get_context("forkserver")).map
    several = {"development": DEVELOPMENT, "scored": SCORED, "all": tuple(GROUPS)}
    chosen = several.get(given.families, (given.families,))
    parts = [p for name in chosen for p in parts_of(name) if given.part in p.name]
    rows, others = [], {}
    for name in given.runs.split(","):
        if name in OTHER_RUNS:
            others[f"{name}: {given.families}"] = import_module(f"tests.collection.{name}").run(parts, say, each)
        else:
            rows += run(parts, say, each, {"coarse": 1, "fine": 2}[name])
    results = {"picked": totals(rows)} if rows and given.part else results_of(rows)
    for title, figures in (results | others).items():
        show(title, figures, say)
    if given.write:
        _write(rows, others)
    return 0


if __name__ == "__main__":
    sys.exit(main())

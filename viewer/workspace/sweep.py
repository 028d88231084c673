"""A design solved at many values of one quantity, in parallel, from the cache where it was solved before.

Any ``concurrent.futures`` executor serves: processes of this machine, or a cluster's. The parent alone writes the
cache, as soon as a value is solved, so that a sweep that is stopped goes on where it was.
"""

from __future__ import annotations

import multiprocessing
import os
import pickle
import signal
import tempfile
from collections.abc import Sequence
from concurrent.futures import FIRST_COMPLETED, Executor, Future, ProcessPoolExecutor, wait
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path

import numpy as np

from viewer.insight.encounters import Encounter
from viewer.insight.lineage import LineageFinding, follow, successors
from viewer.insight.pairing import cross_products
from viewer.jobs import SILENT, Progress, lay_down, no_main_module
from viewer.mechanics.eigen import solve
from viewer.model.design import Design
from viewer.model.modes import ModeSet
from viewer.model.variation import Variation
from viewer.workspace.store import read_modes_npz, write_modes_npz
from viewer.workspace.workspace import Workspace

_ROUNDS = 4  # of steps put between others
_INSERTED = 12  # steps a round and encounter at most
_LOOK = 0.2  # s between looks for a wish to stop


@dataclass(frozen=True, eq=False)
class Sweep:
    """Designs and mode sets by value, ascending, and how the modes pass one another."""

    values: tuple[float, ...]
    designs: tuple[Design, ...]
    modes: tuple[ModeSet, ...]
    lineage: LineageFinding


def sweep(
    workspace: Workspace,
    design: Design,
    variation: Variation,
    values: Sequence[float],
    count: int = 6,
    *,
    insert: bool = False,
    executor: Executor | None = None,
    progress: Progress = SILENT,
) -> Sweep:
    """Solve ``design`` at ``values`` (SI) and follow its modes.

    insert    put further steps where a passage is unresolved, a few rounds at most
    executor  None: processes of this machine
    Raises what solving raises; ``Cancelled`` when asked to stop, with every value solved so far in the cache.
    """
    steps = sorted({float(v) for v in values})
    varied = {v: variation.apply(design, v) for v in steps}
    solved = solve_all(workspace, [varied[v] for v in steps], count, executor, progress)
    modes = dict(zip(steps, solved, strict=True))
    for rounds_left in range(_ROUNDS if insert else 0, -1, -1):
        steps = sorted(modes)
        found = _followed(design, variation, varied, modes, count, workspace, progress)
        more = sorted({v for e in found.encounters for v in _between(e)} - set(steps)) if rounds_left else []
        if not more:
            break
        varied |= {v: variation.apply(design, v) for v in more}
        modes |= dict(
            zip(more, solve_all(workspace, [varied[v] for v in more], count, executor, progress), strict=True)
        )
    return Sweep(tuple(steps), tuple(varied[v] for v in steps), tuple(modes[v] for v in steps), found)


def solve_all(
    workspace: Workspace, designs: Sequence[Design], count: int, executor: Executor | None, progress: Progress
) -> list[ModeSet]:
    """The first ``count`` modes of every design; only those that the workspace does not know are solved."""
    found: dict[int, ModeSet] = {}
    for k, design in enumerate(designs):
        if (known := workspace.known(design, count)) is not None:
            found[k] = known
    missing = [k for k in range(len(designs)) if k not in found]
    if not missing:
        return [found[k] for k in range(len(designs))]
    with tempfile.TemporaryDirectory(prefix="hingelight-") as folder, no_main_module():
        own = None
        waiting: dict[Future, int] = {}
        try:
            if executor is None:
                own = _pool(len(missing))
                waiting = {
                    own.submit(_solve_file, lay_down(Path(folder) / f"{k}.design", designs[k]), count): k
                    for k in missing
                }
            else:
                waiting = {executor.submit(solve, designs[k], count): k for k in missing}
            while waiting:
                progress.tick("solving the steps", len(found), len(designs))
                done, _ = wait(waiting, timeout=_LOOK, return_when=FIRST_COMPLETED)
                for future in done:
                    k = waiting.pop(future)
                    answer = future.result() if own is None else read_modes_npz(future.result())
                    found[k] = workspace.keep(designs[k], count, answer)
        finally:
            for future in waiting:
                future.cancel()
            if own is not None:
                _end(own, kill=bool(waiting))
    return [found[k] for k in range(len(designs))]


def _pool(orders: int) -> ProcessPoolExecutor:
    """Processes of this machine, which leave Ctrl-C to the one that ends them."""
    context = multiprocessing.get_context("spawn")
    return ProcessPoolExecutor(
        min(orders, os.cpu_count() or 1), context, signal.signal, (signal.SIGINT, signal.SIG_IGN)
    )


def _solve_file(order: Path, count: int) -> Path:
    """Runs in another process; designs and modes cross in files (``jobs.lay_down`` says why)."""
    return write_modes_npz(order.with_suffix(".npz"), solve(pickle.loads(order.read_bytes()), count))


def _end(pool: ProcessPoolExecutor, kill: bool) -> None:
    """A factorisation hears no wish to stop: its process is ended."""
    processes = list((pool._processes or {}).values()) if kill else []
    pool.shutdown(wait=not kill, cancel_futures=True)
    for process in processes:
        process.kill()


def _followed(
    design: Design,
    variation: Variation,
    varied: dict[float, Design],
    modes: dict[float, ModeSet],
    count: int,
    workspace: Workspace,
    progress: Progress,
) -> LineageFinding:
    steps, crosses = sorted(modes), []
    for k, (a, b) in enumerate(pairwise(steps)):
        progress.tick("following the modes", k, len(steps) - 1)
        crosses.append(cross_products(varied[a], modes[a], varied[b], modes[b]))
    names: list[dict[int, str]] = [{} for _ in steps]
    if design.mode_names:  # they are those of the design as it stands
        at = int(np.argmin(np.abs(np.array(steps) - variation.own_value(design))))
        own = workspace.solve(design, count, progress)
        near = varied[steps[at]], modes[steps[at]]
        to = successors(cross_products(design, own, *near), own.freq_hz, near[1].freq_hz)
        names[at] = {to[number - 1] + 1: name for number, name in design.mode_names.items() if number - 1 in to}
    return follow(
        steps,
        [modes[v].freq_hz for v in steps],
        crosses,
        parameter=variation.words,
        unit=variation.unit,
        names=names,
    )


def _between(encounter: Encounter) -> list[float]:
    """Values that would resolve an encounter: around its place, at the step that it asks for."""
    if encounter.step is None:
        return []
    low, high = encounter.between
    around = [encounter.at + k * encounter.step for k in range(-_INSERTED // 2, _INSERTED // 2 + 1)]
    return [v for v in around if low < v < high]

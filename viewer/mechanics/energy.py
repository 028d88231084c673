"""Strain and kinetic energy of every cell in every mode, and whether they can be trusted.

The element matrices are those of assembly, so that for the model's own modes the cells, springs and masses add up
to ½φᵀKφ and ½ω²φᵀMφ. For imported modes two figures tell whether these matrices are those of whoever made them:

closure   √(2U / φᵀMφ) / ω, the frequency from our own energies over the one given; elastic modes only.
residual  the share of energy that does not belong to a mode of that frequency, see ``closure.py``.

Bounds. Closure within 5 %; residual at most ``RESIDUAL_BOUND`` = 2 %, an error of 14 % in the energy norm. Chosen
between two populations: modes that quadratic elements of an independent library give on the same mesh, as long as
closure is within 5 %, reach 0.02 % to 1.8 %; sums of two modes whose frequencies differ by half, modes of other
supports, shuffled shapes, and stiffness off by a factor of 5 in half the body, all with the frequency adjusted so
that they close exactly, start at 3 %. Stiffness off by a factor of 2 in half a cantilever leaves 1.2 % in its first
mode and passes: a figure of the whole body says nothing about local error, which is why the residual is also given
by cell.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, fields
from functools import cached_property
from itertools import product
from typing import Any

import numpy as np

from viewer.errors import ModelError, RefusedError
from viewer.jobs import SILENT, Progress, in_child
from viewer.mechanics.assembly import Layout, lay_out
from viewer.mechanics.closure import flexible_share, residuals
from viewer.mechanics.constraints import Attachment
from viewer.mechanics.factor import AT_ONCE
from viewer.mechanics.formulations import FORMULATIONS
from viewer.mechanics.recovery import examine
from viewer.mechanics.sums import cell_volumes, strain_and_kinetic
from viewer.model.arrays import Array, frozen
from viewer.model.design import Design
from viewer.model.modes import ModeSet

CLOSURE_BOUND = 0.05
RESIDUAL_BOUND = 0.02
RELATIVE = "relative only: one uniform material assumed"
_OWN = 1e-6  # |closure − 1| up to which a computed mode set is that of this very design
_RIGID = 1e-4  # share of kinetic energy beyond the rigid motion, below which a free mode is rigid


@dataclass(frozen=True, eq=False)
class Energies:
    """Energies of k modes by cell row. A mode j counts through ``indices``.

    indices        (k,) index of the mode in its set, from 0; freq_hz (k,) as given
    strain         (k, n_cells) J at the size of the shapes as given; 0 for cells that carry no stiffness
    kinetic        (k, n_cells) J at the frequency given
    springs        (k, n_springs) J strain energy, spring_names
    masses         (k, n_masses) J kinetic energy, mass_names
    volumes        (n_cells,) m³
    closure        (k,), NaN for rigid-body modes
    residual       (k,) share 0 … 1 (above for shapes that are no modes at all), NaN for rigid-body modes, for
                   modes computed from this very design, whose residual the eigen-solver has checked, and for models
                   too large to form it; from below in models too large to factorise
    residual_cells (k, n_cells) where the residual sits: share by cell, NaN as above
    trusted        (k,) bool, False for shapes that come with a caution
    formulations   names of the element formulations used
    cautions       what the model itself warns of
    relative       one uniform material was assumed (``relative.py``): strain and kinetic are shares of each mode's
                   whole instead of J, closure and residual NaN
    """

    indices: Array
    freq_hz: Array
    strain: Array
    kinetic: Array
    springs: Array
    masses: Array
    volumes: Array
    closure: Array
    residual: Array
    residual_cells: Array
    trusted: Array
    spring_names: tuple[str, ...]
    mass_names: tuple[str, ...]
    formulations: tuple[str, ...]
    cautions: tuple[str, ...]
    relative: bool = False

    def __post_init__(self) -> None:
        for item in fields(self):
            value = getattr(self, item.name)
            if isinstance(value, np.ndarray):
                object.__setattr__(self, item.name, frozen(value))

    @cached_property
    def total_strain(self) -> Array:
        """(k,) J, springs included."""
        return self.strain.sum(axis=1) + self.springs.sum(axis=1)

    @cached_property
    def total_kinetic(self) -> Array:
        """(k,) J, lumped masses included."""
        return self.kinetic.sum(axis=1) + self.masses.sum(axis=1)

    def density(self, j: int) -> Array:
        """(n_cells,) strain-energy density relative to the mean of the cells, (U/V)/(ΣU/ΣV); 0 where there is no
        volume or the cells hold no energy."""
        return _relative_density(self.strain[j], self.volumes)

    def spring_share(self, j: int) -> float:
        """Share of the strain energy that springs hold: no picture of densities shows it."""
        return _share(self.springs[j].sum(), self.total_strain[j])

    def mass_share(self, j: int) -> float:
        """Share of the kinetic energy that lumped masses hold."""
        return _share(self.masses[j].sum(), self.total_kinetic[j])

    def sentence(self, j: int) -> str:
        """Where the energy sits beside the cells, and whether it is to be trusted."""
        facts = self.to_dict(j)
        parts = []
        if facts["spring_share"]:
            parts.append(f"springs hold {facts['spring_share']:.1%} of the strain energy")
        if facts["mass_share"]:
            parts.append(f"lumped masses hold {facts['mass_share']:.1%} of the kinetic energy")
        head = f"Mode {facts['mode']} ({facts['frequency_hz']:.4g} Hz): "
        if self.relative:
            return head + ("energies are " + RELATIVE if self.total_strain[j] > 0 else "a rigid-body mode") + "."
        if facts["closure"] is None:
            return head + "; ".join([*parts, "a rigid-body mode, which has no strain energy"]) + "."
        figures = f"closure {facts['closure']:.3f}"
        if facts["residual"] is not None:
            figures += f", residual {facts['residual']:.1%}"
        verdict = "the energies are trusted" if facts["trusted"] else "the energies are NOT to be trusted"
        return head + "; ".join([*parts, f"{verdict} ({figures})"]) + "."

    def note(self, j: int) -> str:
        """Why energies of mode j are no absolute figures: a mark for whatever prints them; empty when they are."""
        if self.relative:
            return RELATIVE
        return "" if self.trusted[j] or np.isnan(self.closure[j]) else "not trusted: absolute figures do not hold"

    def to_dict(self, j: int) -> dict[str, Any]:
        """Every figure of mode j as plain numbers."""
        number = lambda value: None if np.isnan(value) else float(value)  # noqa: E731
        return {
            "mode": int(self.indices[j]) + 1,
            "frequency_hz": float(self.freq_hz[j]),
            "strain_energy": None if self.relative else float(self.total_strain[j]),
            "kinetic_energy": None if self.relative else float(self.total_kinetic[j]),
            "spring_share": self.spring_share(j),
            "springs": _named_shares(self.spring_names, self.springs[j], self.total_strain[j]),
            "mass_share": self.mass_share(j),
            "masses": _named_shares(self.mass_names, self.masses[j], self.total_kinetic[j]),
            "closure": number(self.closure[j]),
            "residual": number(self.residual[j]),
            "trusted": None if self.relative else bool(self.trusted[j]),
            "energy_note": self.note(j),
            "formulations": list(self.formulations),
        }


def energies(
    design: Design,
    modes: ModeSet,
    indices: Sequence[int] | None = None,
    progress: Progress = SILENT,
    *,
    formulations: Mapping[str, str] | None = None,
    judged: bool = True,
) -> Energies:
    """Energies of the modes ``indices`` (None: all), complex ones by φᴴKφ.

    formulations  cell kind → name of the formulation to take instead of the design's
    judged        False: no residual is formed (it takes the matrices), and unless computed nothing is trusted
    Shell shapes without rotations have them recovered first (``recovery.py``). Raises ``ModelError`` as
    ``assemble`` does, and when the modes are not on the design's nodes. Memory: two matrices (k, n_cells),
    (k, n_dof) and chunks of element matrices; for imported modes also the sparse matrices, or in large models
    what ``lean.py`` makes of them, 1.1 GB for a million 8-node hexahedra, and seven vectors at a time.
    """
    picked = np.arange(modes.count) if indices is None else np.asarray(indices, np.int64)
    if not np.array_equal(modes.node_ids, design.mesh.node_ids):
        raise ModelError(
            f"design '{design.name}': the modes are not given on the nodes of its mesh",
            file=modes.source or None,
            found=f"{len(modes.node_ids)} nodes",
            expected=f"{design.mesh.n_nodes} nodes with the same ids",
        )
    known = np.isfinite(modes.freq_hz[picked])
    if not known.all():
        raise ModelError(
            f"design '{design.name}': mode {picked[np.argmin(known)] + 1} has no frequency",
            file=modes.source or None,
            do="give every mode a frequency in Hz, 0 for rigid-body modes",
        )
    layout = lay_out(design, progress, formulations=formulations)
    vectors, doubts = shape_vectors(layout, modes, picked, progress)
    omega = 2 * np.pi * modes.freq_hz[picked]
    strain, moving = strain_and_kinetic(layout, vectors, progress)
    springs, masses = _attached(layout.springs, vectors), _attached(layout.masses, vectors)
    total, modal_mass = 2 * (strain.sum(axis=1) + springs.sum(axis=1)), 2 * (moving.sum(axis=1) + masses.sum(axis=1))
    if not (modal_mass > 0).all():
        raise ModelError(
            f"design '{design.name}': mode {picked[int(np.argmin(modal_mass))] + 1} moves no mass",
            file=modes.source or None,
            do="remove the empty mode from the set",
        )
    flexible = flexible_share(layout, vectors) >= _RIGID
    rigid = (omega <= 0) | (~flexible & (springs.sum(axis=1) <= 0.25 * np.abs(total)))
    with np.errstate(divide="ignore", invalid="ignore"):
        closure = np.where(rigid, np.nan, np.sqrt(total / modal_mass) / omega)
    own = (modes.origin == "computed") & (np.abs(closure - 1) < _OWN)
    residual, residual_cells = np.full(len(picked), np.nan), np.full(strain.shape, np.nan)
    unknown = np.nonzero(~rigid & ~own)[0]
    unsettled: tuple[str, ...] = ()
    missing = np.zeros(len(picked))
    if len(unknown) and judged:
        found = residuals(layout, vectors[unknown], omega[unknown], progress)
        residual[unknown], residual_cells[unknown], missing[unknown] = found.share, found.by_cell, found.missing
        unsettled = found.cautions(picked[unknown], RESIDUAL_BOUND)
    with np.errstate(invalid="ignore"):
        trusted = (np.abs(closure - 1) <= CLOSURE_BOUND) & (own | (residual + missing <= RESIDUAL_BOUND))
    trusted &= not modes.caution  # shapes made up from a basis close by themselves, whatever is missing in them
    return Energies(
        indices=picked,
        freq_hz=modes.freq_hz[picked],
        strain=strain,
        kinetic=moving * omega[:, None] ** 2,
        springs=springs,
        masses=masses * omega[:, None] ** 2,
        volumes=cell_volumes(layout),
        closure=closure,
        residual=residual,
        residual_cells=residual_cells,
        trusted=trusted,
        spring_names=tuple(item.name for item in layout.springs),
        mass_names=tuple(item.name for item in layout.masses),
        formulations=tuple(dict.fromkeys(group.formulation.name for group in layout.blocks)),
        cautions=modes.cautions + layout.cautions + doubts + unsettled,
    )


@dataclass(frozen=True)
class BestFormulation:
    """The formulations whose energies close best with given modes.

    names   cell kind → formulation name
    error   median over the elastic modes of |closure − 1|
    tried   every combination tried with its error, best first
    """

    names: Mapping[str, str]
    error: float
    tried: tuple[tuple[Mapping[str, str], float], ...]

    @property
    def sentence(self) -> str:
        chosen = ", ".join(self.names.values())
        if len(self.tried) == 1:
            return f"{chosen} is the only formulation on offer; closure is off by {self.error:.2%} (median)."
        others = ", ".join(f"{'/'.join(names.values())} {error:.2%}" for names, error in self.tried[1:])
        return f"{chosen} closes best: off by {self.error:.2%} (median); others: {others}."

    def to_dict(self) -> dict[str, Any]:
        return {
            "formulations": dict(self.names),
            "error": self.error,
            "tried": [{"formulations": dict(names), "error": error} for names, error in self.tried],
        }


def best_formulation(design: Design, modes: ModeSet, progress: Progress = SILENT) -> BestFormulation:
    """Try every combination of the formulations on offer for the kinds in use and take the one that closes best.

    Give its ``names`` to :func:`energies`. Raises ``RefusedError`` when there is no elastic mode to judge by.
    """
    layout = lay_out(design, progress)
    kinds = list(dict.fromkeys(group.kind for group in layout.blocks))
    offers = [[formulation.name for formulation in FORMULATIONS[kind]] for kind in kinds]
    tried = []
    for choice in product(*offers):
        names = dict(zip(kinds, choice, strict=True))
        progress.tick(f"closure with {', '.join(choice)}")
        tried.append((names, _closure_error(design, modes, names, progress)))
    tried.sort(key=lambda item: item[1])
    names, error = tried[0]
    if not np.isfinite(error):
        raise RefusedError(
            f"design '{design.name}': closure needs an elastic mode",
            found="rigid-body modes only",
            do="give more modes",
        )
    return BestFormulation(names, error, tuple(tried))


def _closure_error(design: Design, modes: ModeSet, names: Mapping[str, str], progress: Progress) -> float:
    layout = lay_out(design, progress, formulations=names)
    vectors, _ = shape_vectors(layout, modes, np.arange(modes.count), progress)
    strain, moving = strain_and_kinetic(layout, vectors, progress)
    total = strain.sum(axis=1) + _attached(layout.springs, vectors).sum(axis=1)
    mass = moving.sum(axis=1) + _attached(layout.masses, vectors).sum(axis=1)
    omega = 2 * np.pi * modes.freq_hz
    elastic = (omega > 0) & (flexible_share(layout, vectors) >= _RIGID)
    if not elastic.any():
        return np.inf
    return float(np.median(np.abs(np.sqrt(total[elastic] / mass[elastic]) / omega[elastic] - 1)))


def shape_vectors(
    layout: Layout, modes: ModeSet, picked: Array, progress: Progress = SILENT
) -> tuple[Array, tuple[str, ...]]:
    """(k, n_dof) shapes of the modes ``picked`` (indices from 0) as vectors, and cautions; shells whose shapes come
    without rotations have them recovered."""
    moved = np.stack([modes.shape(int(i)) for i in picked])
    if not layout.has_rotations:
        return layout.gather(moved), ()
    turned = [modes.rotations(int(i)) for i in picked]
    given = [values for values in turned if values is not None]
    if len(given) == len(turned):
        return layout.gather(moved, np.stack(given)), ()
    squares = (2 * np.pi * modes.freq_hz[picked]) ** 2
    if layout.n_dof > AT_ONCE:
        stage = "recovering rotations"
        recovered = in_child(examine, layout, moved, SILENT, squares, progress=progress, stage=stage)
    else:
        recovered = examine(layout, moved, progress, squares)
    return recovered.vectors, recovered.cautions


def _attached(items: tuple[Attachment, ...], vectors: Array) -> Array:
    """(k, number of items) ½ vᴴ A v of springs or lumped masses."""
    return np.stack([item.energy(vectors) for item in items], axis=1) if items else np.zeros((len(vectors), 0))


def _named_shares(names: tuple[str, ...], energy: Array, whole: float) -> dict[str, float]:
    """Entries of one name are added."""
    out = dict.fromkeys(names, 0.0)
    for name, value in zip(names, energy, strict=True):
        out[name] += _share(value, whole)
    return out


def _share(part: float, whole: float) -> float:
    return float(part / whole) if whole > 0 else 0.0


def _relative_density(energy: Array, volumes: Array) -> Array:
    there = volumes > 0
    mean = energy[there].sum() / volumes[there].sum() if there.any() else 0.0
    return np.divide(energy, volumes * mean, out=np.zeros_like(energy), where=there & (mean > 0))

"""How much of the body's mass each mode carries along a moving base, and how much of a mode is rigid motion.

Effective mass, for base motions along x, y, z and about them (``mechanics/base_motion.py``): modes with much of it
are the ones a shaking support excites. Rigid content: the mode's mass-weighted projection on the six rigid motions.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields
from typing import Any

import numpy as np

from viewer.errors import ModelError
from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import Layout
from viewer.mechanics.base_motion import MOTIONS, BaseMotion, Inertia, base_motion, mode_vectors, weigh
from viewer.model.arrays import Array, frozen
from viewer.model.design import Design
from viewer.model.modes import ModeSet

_KEYS = ("x", "y", "z", "about_x", "about_y", "about_z")
_NOTHING = 1e-9  # of the whole: below, a direction holds nothing and has no shares


@dataclass(frozen=True, eq=False)
class EffectiveMasses:
    """Of k modes; a mode j counts through ``indices``. Columns of (…, 6): along x y z, about x y z through ``about``.

    indices    (k,) index in the mode set, from 0; freq_hz (k,)
    about      (3,) m: the centre of mass unless stated
    values     (k, 6) effective masses, kg, and moments, kg·m²
    whole      (6,) of the body: its mass (three times) and its moments of inertia
    free       (6,) what all modes together hold; the rest, ``supports``, rides on the supports and moves with no mode
    modal_mass (k,) φᴴMφ, kg times the square of the shape's unit
    rigid      (k, 6) share of the mode that is rigid motion, by motion; sums to the whole rigid content.
               The six motions are made orthogonal in the mass symmetrically (Löwdin 1950): each keeps its name
    direction  (k, 4) share of the kinetic energy along x, y, z (the lumped masses' own motion included), and of
               turning (of the nodes of sheets and beams, and of lumped masses)
    cautions   what a reader must know
    relative   one uniform material was assumed: shares hold for that, figures in kg mean nothing
    """

    indices: Array
    freq_hz: Array
    about: Array
    values: Array
    whole: Array
    free: Array
    modal_mass: Array
    rigid: Array
    direction: Array
    cautions: tuple[str, ...] = ()
    relative: bool = False

    def __post_init__(self) -> None:
        for item in fields(self):
            value = getattr(self, item.name)
            if isinstance(value, np.ndarray):
                object.__setattr__(self, item.name, frozen(value))

    @property
    def supports(self) -> Array:
        """(6,) kg and kg·m² that ride on the supports, in no mode."""
        return np.maximum(self.whole - self.free, 0.0)

    @property
    def shares(self) -> Array:
        """(k, 6) effective masses as shares of the whole; 0 in a direction in which the body has none."""
        return _over(self.values, self.whole)

    def row(self, number: int) -> int | None:
        """Row of mode ``number`` (from 1), None when it is not here."""
        found = np.nonzero(self.indices == number - 1)[0]
        return int(found[0]) if len(found) else None

    @property
    def sentence(self) -> str:
        """What all these modes together hold."""
        facts = self.summary()
        if facts["mass_kg"] is None:
            return "Effective masses are not known: no masses are stated."
        parts = ", ".join(f"{facts['share_of_all'][key]:.0%} along {key}" for key in _KEYS[:3])
        rest = facts["support_share"]
        held = [f"{rest[key]:.1%} along {key}" for key in _KEYS[:3] if rest[key] >= 0.0005]
        words = f"The {facts['modes']} modes together carry {parts} of the {facts['mass_kg']:.3g} kg"
        return words + (f"; the supports hold {', '.join(held)}." if held else ".")

    def summary(self) -> dict[str, Any]:
        """Figures of the whole set."""
        absolute = not self.relative
        return {
            "modes": len(self.indices),
            "about_m": self.about.tolist(),
            "mass_kg": float(self.whole[:3].mean()) if absolute else None,
            "whole": _named(self.whole) if absolute else None,
            "all_modes_could_hold": _named(self.free) if absolute else None,
            "support_share": _named(_over(self.supports, self.whole)),
            "share_of_all": _named(self.shares.sum(axis=0)),
            "cautions": list(self.cautions),
        }

    def to_dict(self, j: int) -> dict[str, Any]:
        """Figures of mode j."""
        return {
            "mode": int(self.indices[j]) + 1,
            "frequency_hz": float(self.freq_hz[j]),
            "about_m": self.about.tolist(),
            "effective": None if self.relative else _named(self.values[j]),
            "effective_share": _named(self.shares[j]),
            "support_share": _named(_over(self.supports, self.whole)),
            "modal_mass": None if self.relative else float(self.modal_mass[j]),
            "rigid_share": float(self.rigid[j].sum()),
            "rigid_by_motion": _named(self.rigid[j]),
            "kinetic_share": dict(zip(("x", "y", "z", "turning"), self.direction[j].tolist(), strict=True)),
        }


def effective_masses(
    design: Design,
    modes: ModeSet,
    indices: Sequence[int] | None = None,
    progress: Progress = SILENT,
    *,
    about: Array | None = None,
    relative: bool = False,
) -> EffectiveMasses:
    """Of the modes ``indices`` (None: all), about ``about`` (m; None: the centre of mass).

    relative  the design's materials are assumed ones, see :class:`EffectiveMasses`
    Complex modes by |gᵀφ*|² and φᴴMφ. Raises ``ModelError`` when the design has no masses or a mode moves none.
    Memory: the mass matrix and (k + 18, n_dof) numbers.
    """
    if not np.array_equal(modes.node_ids, design.mesh.node_ids):
        raise ModelError(f"design '{design.name}': the modes are not given on the nodes of its mesh")
    picked = np.arange(modes.count) if indices is None else np.asarray(indices, np.int64)
    inertia = weigh(design, progress)
    layout = inertia.layout
    motion = base_motion(inertia, about, progress)
    values, modal = np.zeros((len(picked), 6)), np.zeros(len(picked))
    rigid, direction = np.zeros((len(picked), 6)), np.zeros((len(picked), 4))
    cautions = modes.cautions
    for j, index in enumerate(picked):  # one at a time: few modes in memory
        progress.tick("effective masses", j, len(picked))
        (vector,), doubts = mode_vectors(layout, modes, np.array([index]))
        cautions += doubts
        pulled = inertia.times(vector[None])[0]
        modal[j] = np.vdot(vector, pulled).real
        if not modal[j] > 0:
            raise ModelError(f"design '{design.name}': mode {index + 1} moves no mass", file=modes.source or None)
        values[j] = np.abs(motion.pull @ vector[layout.free]) ** 2 / modal[j]
        rigid[j] = _rigid_shares(motion, pulled) / modal[j]
        direction[j] = _directions(inertia, vector) / modal[j]
    return EffectiveMasses(
        indices=picked,
        freq_hz=modes.freq_hz[picked],
        about=motion.about,
        values=values,
        whole=motion.whole,
        free=motion.free,
        modal_mass=modal,
        rigid=rigid,
        direction=direction,
        cautions=tuple(dict.fromkeys(cautions)),
        relative=relative,
    )


def _rigid_shares(motion: BaseMotion, pulled: Array) -> Array:
    """(6,) |G^−½ rᵀMφ|² with G = rᵀMr, scaled to motions of equal inertia first."""
    gram = motion.fields @ motion.forces.T
    size = np.sqrt(np.maximum(np.diag(gram), 0))
    size = np.where(size > 1e-9 * size[:3].max() * max(_reach(motion), 1e-300), size, np.inf)
    strength, axes = np.linalg.eigh(gram / np.outer(size, size))
    root = np.where(strength > 1e-9, 1 / np.sqrt(np.maximum(strength, 1e-9)), 0.0)
    along = (motion.fields @ pulled) / size
    return np.abs(axes @ (root * (axes.T @ along))) ** 2


def _reach(motion: BaseMotion) -> float:
    return float(np.abs(motion.fields[3:]).max(initial=0.0))


def _directions(inertia: Inertia, vector: Array) -> Array:
    """(4,) φᴴMφ by direction of the motion: x, y, z, turning. What couples two directions goes half to each."""
    layout: Layout = inertia.layout
    own = (np.conj(vector) * (inertia.cells @ vector)).real
    out = np.zeros(4)
    for axis in range(6):
        rows = layout.dof[:, axis]
        out[min(axis, 3)] += own[rows[rows >= 0]].sum()
    for item in layout.masses:
        motion = item.operator @ vector[item.dofs]
        part = (np.conj(motion) * (item.core @ motion)).real
        out[:3] += part[:3]
        out[3] += part[3:].sum()
    return out


def _over(values: Array, whole: Array) -> Array:
    """Shares of the whole; 0 in a direction that holds nothing."""
    there = whole > np.append(np.full(3, _NOTHING * whole[:3].max()), np.full(3, _NOTHING * whole[3:].max()))
    return np.divide(values, whole, out=np.zeros(np.broadcast(values, whole).shape), where=there)


def _named(values: Array) -> dict[str, float]:
    return dict(zip(_KEYS, np.asarray(values, float).tolist(), strict=True))


__all__ = ["MOTIONS", "EffectiveMasses", "effective_masses"]

"""A shape with noise, smoothed by the model it belongs to, so that energies and rotations can be formed from it.

``noise_estimate`` and ``needs_smoothing`` tell whether that is needed, before anything is solved; ``smoothed`` does
it (see ``mechanics.smooth`` for the method). What is taken out is what the model could not follow at the mode's
frequency: the noise, but also whatever the part has and the model has not, so the share is stated.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from viewer.errors import RefusedError
from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import System, assemble_layout, lay_out
from viewer.mechanics.closure import FACTOR_LIMIT
from viewer.mechanics.given_matrices import given_system
from viewer.mechanics.relative import assume_material, states_no_material
from viewer.mechanics.smooth import low_pass, noise_of
from viewer.model.arrays import Array, frozen
from viewer.model.design import Design
from viewer.model.modes import ArrayShapes, ModeSet

NOISE_BOUND = 0.004  # share of noise from which a shape is smoothed whatever its energies say
NOISE_SEEN = 5e-5  # share of noise, above that of files with six digits, from which it may be what spoils energies
_SPOILED = 1.02  # closure from which energies hold 4 % too much
_EXCESS, _SPARE = 1.3, 0.003  # the noise seen beforehand is known within 25 %: beyond, what was taken is not noise


@dataclass(frozen=True, eq=False)
class Smoothed:
    """One mode without its noise.

    mode       number from 1
    shape      (n_nodes, 3) translations, at the size of those given; rotations (n_nodes, 3), None for solids
    noise      share taken out: rms of the difference ÷ rms of the shape, over the nodes that move
    expected   the share of noise seen beforehand (``noise_estimate``), NaN where nothing could tell
    modes      the same as a mode set of one mode, at the frequency given (0 where there was none), for energies
    """

    mode: int
    shape: Array
    rotations: Array | None
    noise: float
    expected: float
    modes: ModeSet

    def __post_init__(self) -> None:
        object.__setattr__(self, "shape", frozen(self.shape))
        if self.rotations is not None:
            object.__setattr__(self, "rotations", frozen(self.rotations))

    @property
    def foreign(self) -> bool:
        """Whether clearly more went away than there was noise: the shape is not one of this model."""
        return bool(self.noise > _EXCESS * self.expected + _SPARE)

    @property
    def caution(self) -> str:
        """What a reader of figures formed from the smoothed shape must know."""
        facts = self.to_dict()
        words = f"{facts['noise']:.1%} of the shape was taken for noise and taken out by the model before looking"
        if facts["foreign"]:
            words += ", more than the noise seen in it: the model does not follow this shape well"
        return words

    def to_dict(self) -> dict[str, Any]:
        return {
            "mode": self.mode,
            "noise": self.noise,
            "expected_noise": None if np.isnan(self.expected) else self.expected,
            "foreign": self.foreign,
        }


def noise_estimate(design: Design, shape: Array, progress: Progress = SILENT) -> float:
    """Share of noise in translations ``shape`` (n_nodes, 3): rms of the noise ÷ rms of the shape, NaN where the
    design has no cells to tell by (given matrices, no thickness of sheets).

    Cheap: nothing is assembled as a whole or factorised. Noise of sheets along their normal alone is not seen.
    """
    if design.physics.matrices is not None:
        return float("nan")
    try:
        layout = lay_out(_material(design), progress)
    except RefusedError:
        return float("nan")
    return noise_of(layout, shape, progress)


def needs_smoothing(noise: float, closure: float) -> bool:
    """Whether energies of a shape with this share of noise (``noise_estimate``) want smoothing first.

    ``closure`` of the energies formed from the shape as it is, NaN where there is none. In the lowest modes of thin
    parts 0.01 % of noise adds a fifth to the strain energy, in high ones 0.4 % adds as much; closure tells.
    """
    return bool(noise > NOISE_BOUND or (noise > NOISE_SEEN and not closure <= _SPOILED))


def smoothed(design: Design, modes: ModeSet, number: int, progress: Progress = SILENT) -> Smoothed:
    """Mode ``number`` (from 1) of ``modes`` on the nodes of ``design``, smoothed by the design's own matrices.

    Without materials a uniform one is assumed; then, and without a frequency, the shape's place in the spectrum is
    found from the shape. Rotations given take part by their inertia only: missing ones follow from the translations.
    Raises ``RefusedError`` beyond 200 000 free directions and where no matrices can be formed, ``ModelError`` as
    ``assemble`` does, ``SolveError`` when memory runs out.
    """
    index = modes.index_of(number, design.name)
    system = _system(design, progress)
    if len(system.free) > FACTOR_LIMIT:
        raise RefusedError(
            f"design '{design.name}': the noise in mode {number} cannot be taken out of so large a model",
            found=f"{len(system.free)} free directions",
            expected=f"at most {FACTOR_LIMIT}",
            do="give the mode on a coarser mesh, or a shape without noise",
        )
    moved, turned = modes.shape(index), modes.rotations(index)
    expected = float("nan") if design.physics.matrices is not None else noise_of(system, moved, progress)
    omega = float(np.nan_to_num(modes.omega(index)))
    square = omega**2 if omega > 0 and not states_no_material(design) else None
    absent = np.zeros(system.n_dof, bool)
    if turned is None:
        absent[system.dof[:, 3:][system.dof[:, 3:] >= 0]] = True
    vector = system.gather(moved, turned)
    found = low_pass(system, vector, square, float(np.nan_to_num(expected)), absent, progress)
    shape, rotations = system.spread(found.vector)
    there = (system.dof[:, :3] >= 0).any(axis=1)
    rest = float(np.linalg.norm(moved[there]))
    noise = float(np.linalg.norm((moved - shape)[there])) / rest if rest > 0 else 0.0
    one = ModeSet(
        node_ids=modes.node_ids,
        freq_hz=np.nan_to_num(modes.freq_hz[index : index + 1]),
        shapes=ArrayShapes(shape[None], None if rotations is None else rotations[None]),
        origin="measured" if modes.origin == "measured" else "imported",
        source=modes.source,
        caution=modes.caution,
    )
    return Smoothed(number, shape, rotations, noise, expected, one)


def _material(design: Design) -> Design:
    """The design, of one uniform material where it states none, held and joined as it is."""
    if not states_no_material(design):
        return design
    assumed, given = assume_material(design), design.physics
    held = replace(assumed.physics, supports=given.supports, links=given.links, ties=given.ties)
    return assumed.with_(physics=held)


def _system(design: Design, progress: Progress) -> System:
    if design.physics.matrices is not None:
        return given_system(design)
    return assemble_layout(lay_out(_material(design), progress), progress)

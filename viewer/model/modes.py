"""Mode sets: frequencies and shapes, with shapes held by a picklable source so that one is read alone."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Protocol

import numpy as np

from viewer.errors import InputError
from viewer.model.arrays import Array, frozen


class ShapeSource(Protocol):
    """Where shapes come from: an array, or a file and an offset. Picklable."""

    @property
    def count(self) -> int:
        """Number of modes."""

    @property
    def has_rotations(self) -> bool:
        """Whether every mode has rotations."""

    @property
    def is_complex(self) -> bool:
        """Whether shapes are complex."""

    def translations(self, index: int) -> Array:
        """(n_nodes, 3) float64 or complex128, read-only."""

    def rotations(self, index: int) -> Array | None:
        """(n_nodes, 3) rotations in rad per unit of the translations, or None when the set has none."""


@dataclass(frozen=True, eq=False)
class ArrayShapes:
    """Shapes in memory: ``moved`` (modes, nodes, 3) and optional ``turned`` of the same shape."""

    moved: Array
    turned: Array | None = None

    def __post_init__(self) -> None:
        dtype = np.complex128 if np.iscomplexobj(self.moved) else np.float64
        object.__setattr__(self, "moved", frozen(self.moved, dtype, shape=(None, None, 3)))
        if self.turned is not None:
            object.__setattr__(self, "turned", frozen(self.turned, dtype, shape=self.moved.shape))

    @property
    def count(self) -> int:
        return len(self.moved)

    @property
    def has_rotations(self) -> bool:
        return self.turned is not None

    @property
    def is_complex(self) -> bool:
        return np.iscomplexobj(self.moved)

    def translations(self, index: int) -> Array:
        return self.moved[index]

    def rotations(self, index: int) -> Array | None:
        return None if self.turned is None else self.turned[index]


@dataclass(frozen=True, eq=False)
class ModeSet:
    """Modes of one design on the nodes ``node_ids``.

    Modes are addressed by index from 0 in code and by number from 1 in everything a user sees; never by
    frequency, since frequencies repeat.

    freq_hz        (m,) Hz, ascending as the source gave them
    damping        (m,) damping ratios (1 = critical) or None when unknown
    normalisation  "mass" (unit modal mass, shapes in m/√kg), "unknown"
    origin         "computed", "imported", "measured"
    cell_energy    (m, n_cells) strain energy by cell row that the source of the modes gave along, in its own unit and
                   at the size of its shapes, NaN where it gave none; None: nothing given
    caution        what every figure and picture of these shapes must say, empty when nothing: "expanded from …"
    """

    node_ids: Array
    freq_hz: Array
    shapes: ShapeSource
    damping: Array | None = None
    normalisation: str = "unknown"
    origin: str = "imported"
    source: str = ""
    cell_energy: Array | None = None
    caution: str = ""

    def __post_init__(self) -> None:
        object.__setattr__(self, "node_ids", frozen(self.node_ids, np.int64, shape=(None,)))
        object.__setattr__(self, "freq_hz", frozen(self.freq_hz, np.float64, shape=(self.shapes.count,)))
        if self.damping is not None:
            object.__setattr__(self, "damping", frozen(self.damping, np.float64, shape=(self.shapes.count,)))
        if self.cell_energy is not None:
            energy = frozen(self.cell_energy, np.float64, shape=(self.shapes.count, None))
            object.__setattr__(self, "cell_energy", energy)

    @property
    def count(self) -> int:
        return self.shapes.count

    def __len__(self) -> int:
        return self.count

    @property
    def is_complex(self) -> bool:
        return self.shapes.is_complex

    @property
    def cautions(self) -> tuple[str, ...]:
        """The caution alone, or nothing: to go before the cautions of whatever is found about these shapes."""
        return (self.caution,) if self.caution else ()

    def shape(self, index: int) -> Array:
        """(n_nodes, 3) translations of mode ``index`` (from 0), read-only, rows as in ``node_ids``."""
        return self.shapes.translations(self._checked(index))

    def rotations(self, index: int) -> Array | None:
        """(n_nodes, 3) rotations of mode ``index`` or None."""
        return self.shapes.rotations(self._checked(index))

    def omega(self, index: int) -> float:
        """Circular frequency, rad/s."""
        return float(2 * np.pi * self.freq_hz[self._checked(index)])

    def index_of(self, number: int, design: str) -> int:
        """Index of mode ``number`` (from 1); ``InputError``, which names the ``design``, when it is not there."""
        if not 1 <= number <= self.count:
            raise InputError(
                f"design '{design}' has no mode {number}",
                expected=f"1 to {self.count}",
                do="choose another mode, or raise solve in the dossier",
            )
        return number - 1

    def with_(self, **changes) -> ModeSet:
        """A copy with some fields replaced."""
        return replace(self, **changes)

    def _checked(self, index: int) -> int:
        if not 0 <= index < self.count:
            raise IndexError(f"mode index {index} of {self.count}")
        return index

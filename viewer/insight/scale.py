"""How big it really is: the drawn magnification and the real size of a mode (DESIGN §6 "True scale").

A mode shape has no size of its own. A size comes only from a stated amplitude at a point that really moves;
without one, true scale is refused with a sentence that says what to give.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from viewer.cells import measures
from viewer.errors import RefusedError
from viewer.mechanics.patch import RigidPatch
from viewer.mechanics.turning import cell_rotations
from viewer.model.arrays import Array
from viewer.model.cycle import cycle_peaks, steadiest_turn
from viewer.model.design import Design, FunctionalPoint, LumpedMass
from viewer.model.dossier import StatedAmplitude

DRAWN_PEAK = 0.08  # drawn peak ÷ diagonal of the body (DESIGN §7 rule 5)
DRAWN_TURN = np.radians(12.0)  # no region turns more than this as drawn (same rule)
TURN_SHARE = 0.005  # share of the body that may turn further: a single distorted cell is no region
_SMALL_GROUP = 0.05  # share of the nodes up to which a group's name says enough about where
_WHOLE_BODY = 0.95  # share of the nodes above which a group's name says nothing about where
LEAST_MOTION = 0.05  # a stated point must move at least this share of the peak (DESIGN §6)


@dataclass(frozen=True, eq=False)
class Scale:
    """How one mode of one design is drawn, and what is known about its real size.

    mode            number from 1
    factor          drawn metres per unit of the shape
    turn            unit complex factor that the shape is multiplied by before drawing: at phase 0 the stated
                    point (or, without one, the whole shape) is at its extreme
    magnification   drawn ÷ real; 1.0 at true scale; None when the real size is unknown
    largest_real    m, largest real displacement, in the same statistic as stated; None when unknown
    largest_row     node row of the largest displacement, −1 when a named point off the mesh moves most
    largest_place   words for that place ("camera lens", "top, node 1204")
    largest_at      (3,) m, where it is at rest
    largest_motion  (3,) its displacement at phase 0 in units of the turned shape, real part
    largest_word    direction words ("down")
    drawn_percent   drawn peak in % of the body's diagonal
    limited_by      "peak" (8 % of the diagonal), "turn" (12° as drawn), "true scale", "given"
    statistic       "peak", "rms" or "3 sigma" of every real figure here
    """

    mode: int
    factor: float
    magnification: float | None
    largest_real: float | None
    largest_row: int
    largest_place: str
    largest_word: str
    drawn_percent: float
    limited_by: str
    statistic: str = "peak"
    relative: bool = False
    condition: str = ""
    turn: complex = 1.0 + 0.0j
    largest_at: tuple[float, float, float] = (0.0, 0.0, 0.0)
    largest_motion: tuple[float, float, float] = (0.0, 0.0, 0.0)

    @property
    def real_per_shape(self) -> float | None:
        """Real metres per unit of the shape, or None."""
        return None if self.magnification is None else self.factor / self.magnification

    def enlarged(self, factor: float) -> Scale:
        """The same mode drawn ``factor`` times as large."""
        return replace(
            self,
            factor=self.factor * factor,
            magnification=None if self.magnification is None else self.magnification * factor,
            drawn_percent=self.drawn_percent * factor,
            limited_by=self.limited_by if factor == 1.0 else "given",
        )

    @property
    def sentence(self) -> str:
        if self.largest_real is None:
            return (
                f"Mode {self.mode} has no known size: it is drawn with its peak at {self.drawn_percent:.2g} % of the "
                f"diagonal; a measured point or a service condition would give it one."
            )
        base = "relative to the base" if self.relative else "absolute"
        return (
            f"Mode {self.mode} really moves {self.largest_real:.3g} m ({self.statistic}, {base}) at "
            f"{self.largest_place}, {self.largest_word}; it is drawn {self.magnification:.3g} times larger."
        )

    def to_dict(self) -> dict[str, object]:
        return {
            "mode": self.mode,
            "drawn_m_per_shape_unit": self.factor,
            "magnification": self.magnification,
            "largest_real_m": self.largest_real,
            "largest_place": self.largest_place,
            "largest_direction": self.largest_word,
            "statistic": self.statistic if self.largest_real is not None else None,
            "relative_to_base": self.relative if self.largest_real is not None else None,
            "condition": self.condition or None,
            "drawn_peak_percent_of_diagonal": self.drawn_percent,
            "limited_by": self.limited_by,
        }


@dataclass(frozen=True, eq=False)
class CarriedPoint:
    """A named point that follows the best rigid motion of its footprint: a lumped mass or a functional point."""

    name: str
    rows: Array
    position: Array
    patch: RigidPatch
    item: LumpedMass | FunctionalPoint

    def motion(self, shape: Array) -> Array:
        """(6,) translation of the point and rotation, in units of ``shape``."""
        return self.patch.motion(shape[self.rows])


def carried_points(design: Design) -> tuple[CarriedPoint, ...]:
    """Lumped masses, then functional points, with the patches that carry them."""
    found = []
    items: tuple[LumpedMass | FunctionalPoint, ...] = (*design.physics.masses, *design.points)
    for item in items:
        rows = item.where.rows(design.mesh, f"'{item.name}'")
        points = design.mesh.points[rows]
        position = points.mean(axis=0) if item.position is None else item.position
        found.append(CarriedPoint(item.name, rows, position, RigidPatch(points, position), item))
    return tuple(found)


def scale_mode(
    design: Design,
    shape: Array,
    mode: int,
    amplitude: StatedAmplitude | None = None,
    *,
    true_scale: bool = False,
    peak_percent: float | None = None,
) -> Scale:
    """The scale at which ``shape`` (n_nodes, 3) of mode number ``mode`` is drawn, and its real size if stated.

    true_scale     draw at ×1; ``RefusedError`` without a stated amplitude
    peak_percent   draw the peak at this share of the diagonal instead of the automatic choice
    """
    carried = carried_points(design)
    peak = _peak(design, shape, carried)
    if not peak.size > 0:
        raise RefusedError(f"mode {mode} of '{design.name}' does not move at all", do="check the mode set")
    real_per_shape: float | None = None
    turn = steadiest_turn(shape)
    if amplitude is not None:
        stated = _stated_motion(design, shape, amplitude, carried)
        if abs(stated) < LEAST_MOTION * peak.size:
            raise RefusedError(
                f"the stated point of mode {mode} of '{design.name}' hardly moves, so it says little about the mode",
                found=f"{100 * abs(stated) / peak.size:.2g} % of the mode's largest motion",
                expected=f"at least {100 * LEAST_MOTION:.0f} %",
                do="state the amplitude at a point that takes part in this mode, along the way it moves",
            )
        real_per_shape = amplitude.value / abs(stated)
        turn = complex(np.exp(-1j * np.angle(stated)))
    elif true_scale:
        raise RefusedError(
            f"mode {mode} of '{design.name}' cannot be drawn at true scale: a mode shape has no size of its own",
            do="state a measured amplitude in the dossier ([[amplitudes]]: design, mode, point, direction, value)",
        )
    if true_scale:
        factor, limited = float(real_per_shape or 0.0), "true scale"
    elif peak_percent is not None:
        factor, limited = peak_percent / 100 * design.mesh.diagonal / peak.size, "given"
    else:
        factor, limited = _automatic_factor(design, shape, peak.size)
    real_turned = (peak.motion * turn).real
    at, motion = peak.at.tolist(), real_turned.tolist()
    return Scale(
        mode=mode,
        factor=factor,
        magnification=None if real_per_shape is None else factor / real_per_shape,
        largest_real=None if real_per_shape is None else peak.size * real_per_shape,
        largest_row=peak.row,
        largest_place=peak.place,
        largest_word=direction_word(real_turned),
        drawn_percent=100 * factor * peak.size / design.mesh.diagonal,
        limited_by=limited,
        statistic="peak" if amplitude is None else amplitude.statistic,
        relative=amplitude is not None and amplitude.relative,
        condition="" if amplitude is None else amplitude.condition,
        turn=turn,
        largest_at=(at[0], at[1], at[2]),
        largest_motion=(motion[0], motion[1], motion[2]),
    )


def common_scale(
    scales: Sequence[Scale], modal_masses: Sequence[float] = (), turns: Sequence[complex] = ()
) -> tuple[Scale, ...]:
    """The scales of compared designs, made comparable (DESIGN §7 rule 3).

    All sizes known: one magnification for all, the smallest of theirs. Otherwise no size is shown for any:
    all take equal modal mass (``modal_masses`` in shape units), and the first one's factor limited by the rest;
    ``turns`` (unit complex, from the modal scale factor onto the first) set sign and phase.
    """
    if all(s.magnification is not None for s in scales):
        magnification = min(s.magnification for s in scales if s.magnification is not None)
        return tuple(
            replace(
                s,
                factor=s.real_per_shape * magnification,  # type: ignore[operator]
                magnification=magnification,
                drawn_percent=s.drawn_percent * magnification / s.magnification,  # type: ignore[operator]
            )
            for s in scales
        )
    unit = [s.factor * np.sqrt(m) for s, m in zip(scales, modal_masses, strict=True)]
    shared = min(unit)
    return tuple(
        replace(
            s,
            factor=shared / np.sqrt(m),
            magnification=None,
            largest_real=None,
            drawn_percent=s.drawn_percent * shared / u,
            turn=scales[0].turn * turn,
        )
        for s, m, u, turn in zip(scales, modal_masses, unit, turns, strict=True)
    )


def direction_word(vector: Array) -> str:
    """Plain words for a direction; z is up. Within 25° of an axis that axis is named, else the components."""
    size = float(np.linalg.norm(vector))
    if size == 0:
        return "nowhere"
    unit = np.asarray(vector) / size
    axis = int(np.argmax(np.abs(unit)))
    if abs(unit[axis]) >= np.cos(np.radians(25)):
        if axis == 2:
            return "up" if unit[2] > 0 else "down"
        return f"along {'+' if unit[axis] > 0 else '−'}{'xy'[axis]}"
    return "along ({})".format(", ".join(f"{c:.1f}".replace("-", "−") for c in unit))


@dataclass(frozen=True)
class _Peak:
    size: float
    row: int
    place: str
    at: Array
    motion: Array


def _peak(design: Design, shape: Array, carried: Sequence[CarriedPoint]) -> _Peak:
    """The largest motion over the cycle among the used nodes and the carried points, with words for the place."""
    used = design.mesh.used_nodes
    moves = np.concatenate([shape[used], *(c.motion(shape)[None, :3] for c in carried)])
    sizes = cycle_peaks(moves)
    # A named point off the mesh wins a near tie, since its name says more than a node number.
    winner = int(np.argmax(sizes))
    if carried:
        best_named = len(used) + int(np.argmax(sizes[len(used) :]))
        if sizes[best_named] >= 0.98 * sizes[winner]:
            winner = best_named
    if winner >= len(used):
        point = carried[winner - len(used)]
        return _Peak(float(sizes[winner]), -1, point.name, point.position, moves[winner])
    row = int(used[winner])
    return _Peak(float(sizes[winner]), row, _place_words(design, row), design.mesh.points[row], moves[winner])


def _place_words(design: Design, row: int) -> str:
    mesh = design.mesh
    words = f"node {mesh.node_ids[row]}"
    holders = {name: rows for name, rows in mesh.node_groups.items() if row in rows}
    for name, cells in mesh.cell_groups.items():
        nodes = mesh.nodes_of_cells(cells)
        if row in nodes:
            holders[name] = nodes
    holders = {name: rows for name, rows in holders.items() if len(rows) <= _WHOLE_BODY * len(mesh.used_nodes)}
    if not holders:
        return words
    name = min(holders, key=lambda name: len(holders[name]))
    # A small group says where by itself; in a large one the node is needed too.
    return name if len(holders[name]) <= _SMALL_GROUP * mesh.n_nodes else f"{name}, {words}"


def _stated_motion(
    design: Design, shape: Array, amplitude: StatedAmplitude, carried: Sequence[CarriedPoint]
) -> complex:
    """Motion of the stated place along the stated direction, in units of the shape."""
    if amplitude.point:
        for point in carried:
            if point.name == amplitude.point:
                return complex(point.motion(shape)[:3] @ amplitude.direction)
        raise RefusedError(
            f"the stated amplitude of mode {amplitude.mode} names the point '{amplitude.point}', "
            f"which '{design.name}' does not have",
            expected=", ".join(c.name for c in carried) or "no point is declared",
        )
    if amplitude.where is None:
        raise RefusedError(f"the stated amplitude of mode {amplitude.mode} names no place", do="give point or where")
    rows = amplitude.where.rows(design.mesh, f"stated amplitude of mode {amplitude.mode}")
    return complex(shape[rows].mean(axis=0) @ amplitude.direction)


def _automatic_factor(design: Design, shape: Array, peak: float) -> tuple[float, str]:
    mesh = design.mesh
    by_peak = DRAWN_PEAK * mesh.diagonal / peak
    turns = cycle_peaks(cell_rotations(mesh, shape))
    sizes = np.concatenate([np.abs(measures(b.kind, mesh.points[b.nodes])) for b in mesh.blocks] or [np.empty(0)])
    if sizes.sum() > 0:
        order = np.argsort(turns)
        reached = np.cumsum(sizes[order]) / sizes.sum()
        turn = float(turns[order][min(int(np.searchsorted(reached, 1 - TURN_SHARE)), len(order) - 1)])
        if turn * by_peak > DRAWN_TURN:
            return float(DRAWN_TURN / turn), "turn"
    return by_peak, "peak"

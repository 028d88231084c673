"""What a picture shows, as plain data: the one thing that scene makes and stage draws. Picklable, SI.

A picture is one mode of one design ("single"), or two designs "side" by side or "overlay"; it is drawn at any
phase. Drawn displacement of a body at phase p is ``factor * Re(shape * exp(1j * p))`` in metres.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np

from viewer.cells import Skin
from viewer.model.arrays import Array, frozen
from viewer.model.mesh import Mesh
from viewer.scene.motion import is_standing


@dataclass(frozen=True, eq=False)
class SupportMark:
    """Held nodes: drawn as pegs that bite the held edge."""

    name: str
    rows: Array


@dataclass(frozen=True, eq=False)
class MassMark:
    """A lumped mass: a bead with three great circles and dashed legs to its footprint.

    motion  (6,) translation of the centre and rotation, in units of the shape (complex for complex shapes)
    """

    name: str
    mass: float
    position: Array
    footprint: Array
    motion: Array


@dataclass(frozen=True, eq=False)
class PointMark:
    """A functional point with its sensitive direction: ring and double arrow, with a label.

    footprint  node rows that carry it, when known: the mark goes where none of them is shown
    """

    label: str
    position: Array
    direction: Array
    motion: Array
    footprint: Array | None = None


@dataclass(frozen=True, eq=False)
class NodeLines:
    """Lines are drawn where a standing mode does not move along ``direction`` (3,) unit; None: along the surface's
    own normal."""

    direction: Array | None


@dataclass(frozen=True, eq=False)
class HingeMark:
    """Where a part folds: drawn as a pin through the part along its axis, a fan at its near end, and a label.

    title   "hinge 1"; ``lines`` are what its label says below
    axis    (k, 3) m at rest, k ≥ 2 for a line; (1, 3) for a joint, which has a place but no length
    motion  (k, 3) of these points in units of the shape
    fold    (3,) rad per unit of the shape: rotation of the folding side relative to the other
    arm     (3,) unit, from the axis into the folding side; ``reach`` m, how far that side goes
    width   m, of the band across the axis: the pin leaves its glow in sight
    cells   cell rows of the band: the mark goes where none of them is shown
    chosen  set off from other hinges; sure: False for a weak or undecided one, whose pin is slim and soft
    """

    title: str
    lines: tuple[str, ...]
    axis: Array
    motion: Array
    fold: Array
    arm: Array
    reach: float
    width: float
    cells: Array
    chosen: bool = False
    sure: bool = True


@dataclass(frozen=True, eq=False)
class FlapMark:
    """A region that swings as one piece: tinted, outlined, its border with the rest dashed.

    title   "flap 1"; ``lines`` are what its label says below
    cells   cell rows
    """

    title: str
    lines: tuple[str, ...]
    cells: Array


@dataclass(frozen=True, eq=False)
class RegionMark:
    """A region that only this one of two overlaid designs has: filled deeper and outlined in the design's colour.

    title   "only in modified"; ``lines`` are what its label says below; an empty title: no label
    cells   cell rows
    """

    title: str
    lines: tuple[str, ...]
    cells: Array


@dataclass(frozen=True, eq=False)
class StrutMark:
    """A strut on trial: a dashed bar between two places of the body.

    title   "strut"; ``lines`` are what its label says below
    ends    (2, 3) m at rest
    motion  (2, 3) of the ends in units of the shape
    """

    title: str
    lines: tuple[str, ...]
    ends: Array
    motion: Array


@dataclass(frozen=True, eq=False)
class CallOut:
    """Words about one place of a coloured body; ``sign`` +1 or −1 is marked so that it can be told without colour.

    motion  (3,) of the place in units of the shape
    """

    lines: tuple[str, ...]
    position: Array
    motion: Array
    sign: int
    cells: Array


@dataclass(frozen=True, eq=False)
class TestCall:
    """Words about one point of a test; ``ringed`` sets the point off with a ring.

    row     of the point
    lines   the first is a title; "" as a title: the point's label alone
    target  (3,) m at rest of another place that the words speak of: a dashed line leads there, or None
    """

    row: int
    lines: tuple[str, ...]
    ringed: bool = False
    target: Array | None = None

    __test__ = False  # not a test case of pytest's


@dataclass(frozen=True, eq=False)
class TraceMark:
    """A test on a body: beads at its points, trace lines between them, ticks along its channels.

    name     in the title key; ``freq_hz`` stands beside it
    labels   (p,) of the points
    points   (p, 3) m at rest, in the mesh's axes
    lines    (l, 2) rows of points
    motion   (p, 3) in units of the body's shape, complex for phases that are kept
    sensor   (c,) row of the point that each channel sits on; points without one are drawn hollow
    ticks    (c, 3) unit vectors, the way each channel measures as plus, drawn as arrows; (0, 3): not drawn
    weights  (p,) 0 … 1: a figure that sizes and darkens the beads; NaN: unknown, an empty ring; None: all alike
    stems    lines from where points rest to where they are; at_rest: the resting trace lines too, dashed
    calls    words about points
    """

    name: str
    labels: tuple[str, ...]
    points: Array
    lines: Array
    motion: Array
    freq_hz: float | None = None
    sensor: Array = field(default_factory=lambda: np.empty(0, np.int64))
    ticks: Array = field(default_factory=lambda: np.empty((0, 3)))
    weights: Array | None = None
    stems: bool = False
    at_rest: bool = False
    calls: tuple[TestCall, ...] = ()

    def __post_init__(self) -> None:
        count = len(self.labels)
        object.__setattr__(self, "points", frozen(self.points, float, shape=(count, 3)))
        object.__setattr__(self, "lines", frozen(np.reshape(self.lines, (-1, 2)), np.int64, shape=(None, 2)))
        object.__setattr__(self, "motion", frozen(self.motion, shape=(count, 3)))
        object.__setattr__(self, "sensor", frozen(self.sensor, np.int64, shape=(None,)))
        object.__setattr__(self, "ticks", frozen(self.ticks, float, shape=(len(self.ticks) and len(self.sensor), 3)))
        if self.weights is not None:
            object.__setattr__(self, "weights", frozen(self.weights, float, shape=(count,)))


@dataclass(frozen=True, eq=False)
class Body:
    """One design in one mode.

    shape    (n_nodes, 3) float64 or complex128, rows as in ``mesh.points``
    factor   drawn metres per unit of the shape
    density  (n_cells,) strain-energy density ÷ the body's mean by cell row, or None: plain body
    form     "solid", or "ghost": the undeformed contour alone, for what moves on it
    gain     (n_cells,) Hz per kg put into the cell, NaN where none, in place of the density, or None
    skin     what is drawn, over rows of ``mesh.points``; None: the skin of the whole mesh (see ``drawn``)
    """

    name: str
    mesh: Mesh
    shape: Array
    factor: float
    freq_hz: float
    density: Array | None = None
    supports: tuple[SupportMark, ...] = ()
    masses: tuple[MassMark, ...] = ()
    points: tuple[PointMark, ...] = ()
    skin: Skin | None = None
    node_lines: NodeLines | None = None
    hinges: tuple[HingeMark, ...] = ()
    flaps: tuple[FlapMark, ...] = ()
    struts: tuple[StrutMark, ...] = ()
    gain: Array | None = None
    call_outs: tuple[CallOut, ...] = ()
    traces: tuple[TraceMark, ...] = ()
    regions: tuple[RegionMark, ...] = ()
    form: str = "solid"

    @property
    def standing(self) -> bool:
        """Whether everything moves in phase, so that the second half of a cycle mirrors the first."""
        return is_standing(self.shape) and all(is_standing(trace.motion) for trace in self.traces)

    @property
    def drawn(self) -> Skin:
        """The skin that is drawn."""
        return self.mesh.skin if self.skin is None else self.skin

    def __post_init__(self) -> None:
        object.__setattr__(self, "shape", frozen(self.shape, shape=(self.mesh.n_nodes, 3)))
        if self.density is not None:
            object.__setattr__(self, "density", frozen(self.density, np.float64, shape=(self.mesh.n_cells,)))
        if self.gain is not None:
            object.__setattr__(self, "gain", frozen(self.gain, np.float64, shape=(self.mesh.n_cells,)))


@dataclass(frozen=True)
class Note:
    """The scale note's texts. ``drawing`` is set in ink, ``condition`` in soft text; each item is one statement,
    joined by " · " and broken into lines by the layout. ``below_pixel``: the statement added when true-scale
    motion is smaller than a pixel is made by the layout itself, since only it knows the size of a pixel."""

    title: str
    frequency: str
    drawing: tuple[str, ...]
    condition: tuple[str, ...] = ()


@dataclass(frozen=True, eq=False)
class Magnified:
    """What the magnifier disc of a true-scale picture shows: one place's motion along its own line."""

    place: str
    position: Array
    direction: Array
    amplitude: float  # m, half swing


@dataclass(frozen=True, eq=False)
class View:
    """A parallel camera: unit vectors from the focus to the eye, and up. Fitting is done by the stage."""

    toward_eye: tuple[float, float, float] = (-0.55, -0.75, 0.42)
    up: tuple[float, float, float] = (0.0, 0.0, 1.0)


@dataclass(frozen=True, eq=False)
class Picture:
    """Everything needed to draw one mode, or one pair of modes, at any phase.

    magnification  drawn ÷ real, 1.0 at true scale, None when the size is arbitrary (no second ruler line)
    energy_top     top of the colour scale (a perfect square), one for all bodies; None: no colour bar
    gain_top       the same for bodies coloured by gain, from −gain_top to +gain_top
    energy_words   title of the colour bar
    roles          names of the ``Tokens`` in whose colours the title keys of compared bodies are set
    bead_scale     what the sizes of test points mean: (words, ((weight 0 … 1 or NaN, words), …)), or None
    """

    bodies: tuple[Body, ...]
    note: Note
    layout: str = "single"  # "single", "side", "overlay"
    magnification: float | None = None
    energy_top: float | None = None
    energy_words: str = "strain energy density ÷ mean"
    gain_top: float | None = None
    energy_caution: str = ""  # one short line under the bar when energies are not trusted
    magnified: Magnified | None = None
    view: View = View()
    theme: str = "light"
    width: int = 960
    height: int = 720
    ghost: bool = True
    mesh_edges: bool = False
    roles: tuple[str, str] = ("baseline", "modified")
    bead_scale: tuple[str, tuple[tuple[float, str], ...]] | None = None

    def with_(self, **changes) -> Picture:
        """A copy with some fields replaced."""
        return replace(self, **changes)

"""Where labels stand: beside the body, off each other and off everything else on the sheet; the same every time.

A label is placed once, from the rest position, clear of all that the body sweeps over in a cycle. It stands still;
only the leader's far end follows the mark.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from viewer.model.arrays import Array
from viewer.scene import hinge_marks, marks, trace_marks
from viewer.scene.cover import CELL, Cover
from viewer.scene.figures import kilograms
from viewer.scene.motion import displacement
from viewer.scene.picture import Body, Picture, TraceMark
from viewer.scene.primitives import Box, Disc, Frame, Line, Point, Primitive, Ring, Text, bounds, grown
from viewer.scene.tokens import THEMES, Tokens
from viewer.scene.typeface import text_width

SIZE, LEADING = 15.0, 20.5  # label text, distance of its lines
EDGE = 14.0  # least distance to the frame's edge
NEAR = 34.0  # wished distance from the rim of the mark
_STEP = 6  # px, grain of the places tried
_SHORT_LIST = 400  # places whose leaders are looked at
_PAD = 5.0  # free border of a label
_LEADER = 1.3
DOT = 3.0  # radius of the dot in which a leader to an area ends
SIGN = 8.5  # radius of the disc that holds a sign
TAG, TAG_PULL = 5.0, 6.0  # wished distance of a test point's bare label from its bead, and how much it matters
TAG_REACH = 90.0  # no bare label stands farther from its bead
AROUND, RING_LINE = 5.5, 2.6  # a ring stands so far out from a bead; its line


@dataclass(frozen=True, eq=False)
class Anchor:
    """The point of a mark that a label belongs to.

    body   index of the body
    at     (3,) m at rest; ``move`` its drawn displacement as an amplitude (3,), m
    clear  px from there to the rim of the mark
    """

    body: int
    at: Array
    move: Array
    clear: float

    def seen(self, frame: Frame, phase: float) -> Point:
        """Where it is in the picture at a phase."""
        x, y = frame.project((self.at + displacement(self.move, 1.0, phase))[None], self.body)[0]
        return float(x), float(y)

    def rest(self, frame: Frame) -> Point:
        x, y = frame.project(np.asarray(self.at, float)[None], self.body)[0]
        return float(x), float(y)


@dataclass(frozen=True, eq=False)
class Label:
    """Lines of (words, bold) that belong to an anchor.

    colour   of the first line and the leader; ``further`` of the other lines, empty: the same
    end      what the leader ends in: "" nothing, "dot", "ring" around the mark, or the sign "+" or "−" in a disc
    near     wished distance from the rim of the mark, px; ``pull``: how much more than usual it matters
    """

    lines: tuple[tuple[str, bool], ...]
    colour: str
    anchor: Anchor
    further: str = ""
    end: str = ""
    near: float = NEAR
    pull: float = 1.0

    @property
    def size(self) -> tuple[float, float]:
        width = max(text_width(words, SIZE, bold) for words, bold in self.lines)
        return width, SIZE + LEADING * (len(self.lines) - 1)


@dataclass(frozen=True, eq=False)
class Placed:
    """A label with its place; ``start`` is the fixed end of its leader."""

    label: Label
    box: Box
    start: Point

    def texts(self) -> list[Primitive]:
        """The label's lines, set flush left."""
        left, top, label = self.box[0], self.box[1], self.label
        colours = (label.colour, *(label.further or label.colour for _ in label.lines[1:]))
        return [
            Text(left, top + 0.8 * SIZE + LEADING * k, words, colour, SIZE, bold)
            for k, ((words, bold), colour) in enumerate(zip(label.lines, colours, strict=True))
        ]

    def moving(self, frame: Frame, phase: float, halo: str) -> list[Primitive]:
        """The leader and what it ends in, at a phase."""
        line = self.leader(frame, phase)
        return [*([line] if line is not None else []), *_end(self.label, frame, phase, halo)]

    def leader(self, frame: Frame, phase: float) -> Line | None:
        """From the label to the rim of the mark at a phase; None when the mark is beside the label."""
        return leader(self.start, self.label.anchor.seen(frame, phase), self.label.anchor.clear, self.label.colour)


def leader(start: Point, end: Point, clear: float, colour: str, width: float = _LEADER) -> Line | None:
    """A line from ``start`` toward ``end`` that stops ``clear`` px before it."""
    away = np.subtract(end, start)
    long = float(np.hypot(*away))
    if long < clear + 6:
        return None
    x, y = np.asarray(start) + away * (1 - clear / long)
    return Line((start, (float(x), float(y))), colour, width)


def _end(label: Label, frame: Frame, phase: float, halo: str) -> list[Primitive]:
    if not label.end:
        return []
    x, y = label.anchor.seen(frame, phase)
    if label.end == "dot":
        return [Disc(x, y, DOT, label.colour)]
    if label.end == "ring":
        size = label.anchor.clear - RING_LINE
        return [Ring(x, y, size, halo, RING_LINE + 2.6), Ring(x, y, size, label.colour, RING_LINE)]
    arm, thick = 0.55 * SIGN, 2.4
    bars = [Line(((x - arm, y), (x + arm, y)), halo, thick)]
    if label.end == "+":
        bars.append(Line(((x, y - arm), (x, y + arm)), halo, thick))
    return [Disc(x, y, SIGN + 1.6, halo), Disc(x, y, SIGN, label.colour), *bars]


def picture_labels(picture: Picture, frame: Frame) -> list[Label]:
    """Flaps, hinges, struts, call-outs, tests and regions of every body; functional points, then masses, of two
    compared bodies only the first's, or in an overlay of the one in front."""
    tokens = THEMES[picture.theme]
    diagonal = max(b.mesh.diagonal for b in picture.bodies)
    unit = diagonal / frame.metres_per_pixel
    found = [
        label for k, body in enumerate(picture.bodies) for label in _found_labels(body, k, frame, diagonal, tokens)
    ]
    index = 1 if picture.layout == "overlay" else 0
    body = picture.bodies[index]
    found += [
        Label(
            ((mark.label, False),),
            tokens.point,
            Anchor(index, mark.position, body.factor * mark.motion[:3], (marks.RING + marks.RING_TUBE) * unit),
        )
        for mark in body.points
    ]
    heaviest = max((mark.mass for b in picture.bodies for mark in b.masses), default=0.0)
    for mass in body.masses if picture.layout == "single" else ():
        clear = marks.bead_radius(mass.mass, heaviest, unit)
        anchor = Anchor(index, mass.position, body.factor * mass.motion[:3], clear)
        found.append(Label(((mass.name, True), (kilograms(mass.mass), False)), tokens.ink, anchor))
    return found


def _found_labels(body: Body, index: int, frame: Frame, diagonal: float, tokens: Tokens) -> list[Label]:
    """Labels of what was found about a body, or is tried on it."""
    found = []
    for flap in body.flaps:
        row = _middle_node(body, flap.cells)
        anchor = Anchor(index, body.mesh.points[row], body.factor * body.shape[row], 0.0)
        found.append(Label(_lines(flap.title, flap.lines), tokens.accent, anchor, tokens.ink, "dot"))
    for hinge in body.hinges:
        at, move = hinge_marks.near_head(hinge, body.factor, diagonal, frame.toward_eye)
        anchor = Anchor(index, at, move, hinge_marks.head_radius(hinge, diagonal) / frame.metres_per_pixel)
        colour = tokens.accent if hinge.chosen else tokens.ink
        found.append(Label(_lines(hinge.title, hinge.lines), colour, anchor, tokens.ink))
    for strut in body.struts:
        anchor = Anchor(index, strut.ends.mean(axis=0), body.factor * strut.motion.mean(axis=0), 6.0)
        found.append(Label(_lines(strut.title, strut.lines), tokens.modified, anchor, tokens.ink))
    for call in body.call_outs:
        anchor = Anchor(index, call.position, body.factor * call.motion, SIGN + 1.6)
        colour, end = (tokens.gain[-1], "+") if call.sign > 0 else (tokens.gain[0], "−")
        found.append(Label(_lines(call.lines[0], call.lines[1:]), colour, anchor, tokens.ink, end))
    own = tokens.baseline if index == 0 else tokens.modified
    for region in body.regions:
        row = _middle_node(body, region.cells)
        anchor = Anchor(index, body.mesh.points[row], body.factor * body.shape[row], 0.0)
        if region.title:
            found.append(Label(_lines(region.title, region.lines), own, anchor, tokens.ink, "dot"))
    for trace in body.traces:
        found += _test_labels(trace, body.factor, index, frame, diagonal, tokens)
    return found


def _test_labels(
    trace: TraceMark, factor: float, index: int, frame: Frame, diagonal: float, tokens: Tokens
) -> list[Label]:
    """Words about points of a test: those set off with a ring first, bare labels last, since they fit anywhere."""
    radii = trace_marks.bead_radii(trace, diagonal) / frame.metres_per_pixel
    found = []
    for call in sorted(trace.calls, key=lambda call: (not call.ringed, len(call.lines) < 2)):
        clear = float(radii[call.row]) + (AROUND + RING_LINE if call.ringed else 0.0)
        anchor = Anchor(index, trace.points[call.row], factor * trace.motion[call.row], clear)
        colour = tokens.ink if call.ringed else tokens.test
        bare = len(call.lines) < 2 and not call.ringed
        found.append(
            Label(
                _lines(call.lines[0], call.lines[1:]),
                colour,
                anchor,
                tokens.ink,
                "ring" if call.ringed else "",
                *((TAG, TAG_PULL) if bare else ()),
            )
        )
    return found


def marked_lines(picture: Picture, frame: Frame) -> list[Line]:
    """Lines on the sheet that labels and leaders should not run over: pins, struts and arrows at rest."""
    diagonal = max(b.mesh.diagonal for b in picture.bodies)
    found = []
    for index, body in enumerate(picture.bodies):
        paths = [hinge_marks.middle_line(mark, diagonal) for mark in body.hinges]
        paths += [mark.ends for mark in body.struts]
        paths += [trace.points[line] for trace in body.traces for line in trace.lines]
        for point in body.points:
            tip = diagonal * marks.ARROW * np.asarray(point.direction) / np.linalg.norm(point.direction)
            paths += [point.position + sign * np.array([[0.5], [1.0]]) * tip for sign in (-1, 1)]
        for path in paths:
            at = frame.project(path, index)
            found += [Line(((a[0], a[1]), (b[0], b[1])), "#000000") for a, b in pairwise(at.tolist())]
    return found


def _lines(title: str, further: Sequence[str]) -> tuple[tuple[str, bool], ...]:
    return ((title, True), *((words, False) for words in further))


def _middle_node(body: Body, cells: Array) -> int:
    """The drawn node of the cells that is nearest to their middle."""
    rows = np.intersect1d(body.mesh.nodes_of_cells(cells), body.drawn.nodes)
    points = body.mesh.points[rows]
    return int(rows[np.argmin(np.linalg.norm(points - points.mean(axis=0), axis=1))])


# ---- choosing places


@dataclass(frozen=True, eq=False)
class Wish:
    """A box of ``size`` px to be placed near ``target``.

    hub    where in the box the leader starts, as shares of its size; None: the nearest point of its border
    near   wished distance from the target; ``clear`` px of it are the mark itself; ``pull``: its weight
    """

    size: tuple[float, float]
    target: Point
    clear: float
    near: float = NEAR
    hub: Point | None = None
    pull: float = 1.0


def choose_place(wish: Wish, region: Box, covered: Cover, taken: Sequence[Box], leaders: Sequence[Line]) -> Box:
    """The best box inside ``region``: off taken boxes before all, then off the body, then near its mark, below
    rather than above, with a leader that crosses little. Ties go to the place further left, then further up."""
    width, height = wish.size
    xs = np.arange(region[0] + EDGE, region[2] - EDGE - width + 1e-6, _STEP)
    ys = np.arange(region[1] + EDGE, region[3] - EDGE - height + 1e-6, _STEP)
    if not len(xs) or not len(ys):
        xs, ys = np.array([max(region[0], 0.0)]), np.array([max(region[1], 0.0)])
    x, y = (v.ravel() for v in np.meshgrid(xs, ys, indexing="ij"))
    boxes = np.stack([x, y, x + width, y + height], axis=1)
    padded = boxes + np.array([-_PAD, -_PAD, _PAD, _PAD])
    start = leader_start(boxes, wish.target, wish.hub)
    away = np.hypot(start[:, 0] - wish.target[0], start[:, 1] - wish.target[1])
    cost = wish.pull * np.abs(away - wish.clear - wish.near)
    cost += 60.0 * (away < wish.clear + min(8, wish.near - 1))
    cost += 12.0 * covered.cells(padded)
    cost += 10.0 * (y + height / 2 < wish.target[1])
    for box in taken:
        wide = np.minimum(padded[:, 2], box[2]) - np.maximum(padded[:, 0], box[0])
        high = np.minimum(padded[:, 3], box[3]) - np.maximum(padded[:, 1], box[1])
        cost += np.where((wide > 0) & (high > 0), 1e4 + wide * high, 0.0)
    short = np.argsort(np.round(cost, 6), kind="stable")[:_SHORT_LIST]
    cost, boxes, start = cost[short], boxes[short], start[short]
    cost += _crossings(start, wish, covered, taken, leaders)
    for line in leaders:
        cost += 400.0 * _touches(padded[short], np.array(line.points))
    best = int(np.argmin(np.round(cost, 6)))
    left, top, right, foot = (float(v) for v in boxes[best])
    return left, top, right, foot


def leader_start(boxes: Array, target: Point, hub: Point | None = None) -> Array:
    """(n, 2) where leaders leave boxes (n, 4): at the point nearest to the target, a little outside the box and not
    at its very corner."""
    low, high = boxes[:, :2], boxes[:, 2:]
    if hub is not None:
        return low + np.asarray(hub) * (high - low)
    inset = np.minimum(10.0, (high - low) / 2)
    point = np.clip(np.asarray(target, float), low + inset, high - inset)
    beyond = np.asarray(target) - point
    # leave through the side that faces the target
    level = np.abs(beyond[:, 0]) * (high - low)[:, 1] > np.abs(beyond[:, 1]) * (high - low)[:, 0]
    x = np.where(level, np.where(beyond[:, 0] > 0, high[:, 0] + 4, low[:, 0] - 4), point[:, 0])
    y = np.where(level, point[:, 1], np.where(beyond[:, 1] > 0, high[:, 1] + 4, low[:, 1] - 4))
    return np.stack([x, y], axis=1)


def _crossings(start: Array, wish: Wish, covered: Cover, taken: Sequence[Box], leaders: Sequence[Line]) -> Array:
    """(n,) cost of what leaders from ``start`` run over: the body a little, labels and other leaders a lot."""
    share = np.linspace(0.02, 0.98, 25)[None, :, None]
    away = np.asarray(wish.target) - start
    long = np.maximum(np.hypot(away[:, 0], away[:, 1]), 1e-9)
    line = start[:, None] + share * (away * np.maximum(1 - wish.clear / long, 0.0)[:, None])[:, None]
    grid = covered.map
    column = np.clip((line[..., 0] / CELL).astype(int), 0, grid.shape[1] - 1)
    row = np.clip((line[..., 1] / CELL).astype(int), 0, grid.shape[0] - 1)
    cost = 0.35 * grid[row, column].mean(axis=1) * long
    for box in taken:
        inside = (line[..., 0] > box[0]) & (line[..., 0] < box[2]) & (line[..., 1] > box[1]) & (line[..., 1] < box[3])
        cost += 500.0 * inside.any(axis=1)
    for other in leaders:
        cost += 200.0 * _cross(start, np.asarray(wish.target, float), *np.array(other.points))
    return cost


def _cross(a: Array, b: Array, c: Array, d: Array) -> Array:
    """(n,) whether the segments from a (n, 2) to b cross the one from c to d."""

    def side(p: Array, q: Array, r: Array) -> Array:
        along, across = q - p, r - p
        return along[..., 0] * across[..., 1] - along[..., 1] * across[..., 0]

    return (side(a, b, c) * side(a, b, d) < 0) & (side(c, d, a) * side(c, d, b) < 0)


def _touches(boxes: Array, line: Array) -> Array:
    """(n,) whether a segment (2, 2) runs through boxes (n, 4)."""
    points = line[0] + np.linspace(0, 1, 60)[:, None] * (line[1] - line[0])
    x, y = points[:, 0], points[:, 1]
    inside = (x >= boxes[:, :1]) & (x <= boxes[:, 2:3]) & (y >= boxes[:, 1:2]) & (y <= boxes[:, 3:])
    return inside.any(axis=1)


def _near(region: Box, target: Point, label: Label) -> Box:
    """The part of ``region`` in which a label is sought: near its mark for those that matter there alone."""
    if label.pull <= 1:
        return region
    reach = label.anchor.clear + TAG_REACH
    wide, high = reach + label.size[0], reach + label.size[1]
    near = target[0] - wide, target[1] - high, target[0] + wide, target[1] + high
    left, top = max(region[0], near[0]), max(region[1], near[1])
    right, foot = min(region[2], near[2]), min(region[3], near[3])
    return (left, top, right, foot) if right - left > label.size[0] and foot - top > label.size[1] else region


def place_label(
    label: Label,
    frame: Frame,
    region: Box,
    covered: Cover,
    taken: list[Box],
    leaders: list[Line],
    others: Sequence[Label] = (),
) -> Placed:
    """Place one label, off the marks of ``others`` too, and note its box and leader among those taken."""
    marked = [bounds((other.anchor.rest(frame),), other.anchor.clear) for other in others if other is not label]
    target = label.anchor.rest(frame)
    wish = Wish(label.size, target, label.anchor.clear, label.near, pull=label.pull)
    box = choose_place(wish, _near(region, target, label), covered, [*taken, *marked], leaders)
    x, y = leader_start(np.array([box]), target)[0]
    placed = Placed(label, box, (float(x), float(y)))
    line = leader(placed.start, target, label.anchor.clear, label.colour)
    if line is not None:
        leaders.append(line)
    taken.append(grown(box, _PAD))
    return placed

"""Showing part of a body: groups hidden or shown alone, and a plane cut. Nothing else about the picture changes: the
energy scale, the drawn size of the motion and the sizes of marks stay those of the whole body."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from viewer.cells import Skin, skin
from viewer.errors import InputError
from viewer.model.arrays import Array
from viewer.model.mesh import Mesh
from viewer.scene import section
from viewer.scene.figures import length
from viewer.scene.picture import Body


@dataclass(frozen=True)
class Showing:
    """Which part of the bodies is shown: cell groups to ``hide``, the ``only`` ones to show (none: all), a plane
    whose side nearer to the eye is taken away."""

    hide: tuple[str, ...] = ()
    only: tuple[str, ...] = ()
    plane: section.Plane | None = None

    def __post_init__(self) -> None:
        for name in ("hide", "only"):
            value = getattr(self, name)
            object.__setattr__(self, name, (value,) if isinstance(value, str) else tuple(value))

    @property
    def words(self) -> tuple[str, ...]:
        """What the scale note says about it."""
        said = []
        if self.only:
            said.append(f"shown: only {', '.join(self.only)}")
        if self.hide:
            said.append(f"hidden: {', '.join(self.hide)}")
        if self.plane is not None:
            said.append(self.plane.words)
        return tuple(said)

    def parts(self, bodies: Sequence[Body], toward_eye: Array) -> tuple[Body, ...]:
        """What is shown of each body. ``InputError`` for a group that no body has, a plane that misses all bodies, or
        when nothing is left of one."""
        if not self.words:
            return tuple(bodies)
        known = list(dict.fromkeys(name for body in bodies for name in body.mesh.cell_groups))
        for name in (*self.hide, *self.only):
            if name not in known:
                raise InputError(
                    f"no cell group named '{name}' to show or hide", expected=f"one of: {', '.join(known) or 'none'}"
                )
        if self.plane is not None:
            _check_crossing(self.plane, bodies)
        return tuple(self._part(body, np.asarray(toward_eye, float)) for body in bodies)

    def _part(self, body: Body, toward_eye: Array) -> Body:
        mesh = body.mesh
        kept = _cells(mesh, self.only) if self.only else np.ones(mesh.n_cells, bool)
        kept &= ~_cells(mesh, self.hide)
        found = _skin_of(mesh, kept)
        alive = np.zeros(mesh.n_nodes, bool)
        alive[mesh.nodes_of_cells(np.flatnonzero(kept))] = True
        shown = replace(body, skin=found)
        if self.plane is not None:
            heights = section.snapped(self.plane.heights(mesh.points, toward_eye), mesh.diagonal)
            cut = section.cut(found, _by_block(mesh, kept), heights)
            alive &= heights <= 0
            ids = np.concatenate([mesh.node_ids, np.full(len(cut.share), -1)])
            shown = replace(
                body,
                mesh=mesh.with_(points=cut.extended(mesh.points), node_ids=ids),
                shape=cut.extended(body.shape),
                skin=cut.skin,
            )
        if not len(shown.drawn.faces) and not len(shown.drawn.edges):
            raise InputError(
                f"nothing of '{body.name}' is left to draw",
                found=", ".join(self.words),
                do="hide fewer groups, or move the cut",
            )
        return _marked(shown, alive, kept)


def _check_crossing(plane: section.Plane, bodies: Sequence[Body]) -> None:
    reaches = []
    for body in bodies:
        along = body.mesh.points[body.mesh.used_nodes] @ np.array(plane.normal)
        reaches.append((along.min(initial=np.inf), along.max(initial=-np.inf)))
    if not any(low < plane.offset < high for low, high in reaches):
        low, high = min(low for low, _ in reaches), max(high for _, high in reaches)
        raise InputError(
            "the cut misses the body",
            found=plane.words,
            expected=f"a place between {length(low, 4)} and {length(high, 4)}",
        )


def _cells(mesh: Mesh, groups: Iterable[str]) -> Array:
    """(n_cells,) bool: in any of the groups that the mesh has."""
    found = np.zeros(mesh.n_cells, bool)
    for name in groups:
        if name in mesh.cell_groups:
            found[mesh.cell_groups[name]] = True
    return found


def _by_block(mesh: Mesh, kept: Array) -> list[tuple[str, Array, Array]]:
    """By block: kind, nodes and cell rows of the kept cells."""
    found = []
    for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
        here = kept[start : start + len(block)]
        found.append((block.kind, block.nodes[here], start + np.flatnonzero(here)))
    return found


def _skin_of(mesh: Mesh, kept: Array) -> Skin:
    if kept.all():
        return mesh.skin
    found = skin([(kind, nodes) for kind, nodes, _ in _by_block(mesh, kept)])
    rows = np.flatnonzero(kept)
    return replace(found, cell=rows[found.cell], edge_cell=rows[found.edge_cell])


def _marked(body: Body, alive: Array, kept: Array) -> Body:
    """Marks stay where something they hold, are held by or tell about is shown: nodes ``alive``, cells ``kept``."""
    cells = kept.copy()
    for _, nodes, rows in _by_block(body.mesh, kept):
        cells[rows] = alive[nodes].any(axis=1)
    flaps = [replace(mark, cells=mark.cells[cells[mark.cells]]) for mark in body.flaps]
    regions = [replace(mark, cells=mark.cells[cells[mark.cells]]) for mark in body.regions]
    supports = [replace(mark, rows=mark.rows[alive[mark.rows]]) for mark in body.supports]
    masses = [replace(mark, footprint=mark.footprint[alive[mark.footprint]]) for mark in body.masses]
    return replace(
        body,
        supports=tuple(mark for mark in supports if len(mark.rows)),
        masses=tuple(mark for mark in masses if len(mark.footprint)),
        points=tuple(mark for mark in body.points if mark.footprint is None or alive[mark.footprint].any()),
        hinges=tuple(mark for mark in body.hinges if cells[mark.cells].any()),
        flaps=tuple(mark for mark in flaps if len(mark.cells)),
        regions=tuple(mark for mark in regions if len(mark.cells)),
        call_outs=tuple(mark for mark in body.call_outs if cells[mark.cells].any()),
    )

"""Which triangles and edges of a drawn surface belong to marked regions: flaps, and what one design has alone."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from viewer.model.arrays import Array
from viewer.scene.picture import FlapMark, RegionMark
from viewer.scene.surface import Surface


@dataclass(frozen=True, eq=False)
class FlapOutline:
    """Flaps on a surface.

    inside  (t,) bool: triangles of flaps; ``lines`` (l,) bool: line cells of flaps
    owned   (e,) bool: edges of the surface that belong to a flap alone: its own outline is chosen among them
    border  (b, 2) skin nodes: edges between a flap and the rest, where it hangs
    """

    inside: Array
    lines: Array
    owned: Array
    border: Array


def flap_outline(surface: Surface, flaps: Sequence[FlapMark | RegionMark]) -> FlapOutline:
    """The outline of all ``flaps``, or other regions, on ``surface``."""
    cells = np.concatenate([np.empty(0, np.int64), *(flap.cells for flap in flaps)])
    inside = np.isin(surface.cells, cells)
    faces = surface.edges.faces
    mine = np.where(faces >= 0, inside[faces], False) if len(inside) else np.zeros(faces.shape, bool)
    some, single = mine.any(axis=1), faces[:, 1] < 0
    border = some & ~mine.all(axis=1) & ~single
    return FlapOutline(inside, np.isin(surface.line_cells, cells), some & ~border, surface.edges.nodes[border])

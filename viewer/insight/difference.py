"""How far the motion of one design departs from that of another, place by place."""

from __future__ import annotations

import numpy as np

from viewer.insight.common_support import carried_over
from viewer.model.arrays import Array
from viewer.model.cycle import cycle_peaks
from viewer.model.mesh import Mesh


def difference_by_cell(first: Mesh, second: Mesh, one: Array, two: Array) -> Array:
    """(cells of second,) mean over a cell's nodes of the largest |u₂ − u₁| over the cycle, NaN where a cell has a
    node outside ``first``; shapes ``one`` and ``two`` (nodes, 3) share unit, sign and phase."""
    operator, shared = carried_over(first, second)
    apart = np.where(shared, cycle_peaks(two - operator @ one), np.nan)
    return np.concatenate([apart[block.nodes].mean(axis=1) for block in second.blocks] or [np.empty(0)])

"""What a body is coloured by: strain energy or gain, and where its values stand on their bar."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from viewer.model.arrays import Array
from viewer.scene.palette import energy_ramp, energy_share, gain_ramp, gain_share
from viewer.scene.picture import Body, Picture


@dataclass(frozen=True, eq=False)
class Colouring:
    """Values (n_cells,) by cell row, the ramp (n, 3) uint8 and where on it (0 … 1) a value stands."""

    values: Array
    ramp: Array
    share: Callable[[Array], Array]


def colouring(picture: Picture, body: Body) -> Colouring | None:
    """How ``body`` is coloured in ``picture``; None: plain."""
    energy, gain = picture.energy_top, picture.gain_top
    if body.gain is not None and gain:
        return Colouring(body.gain, gain_ramp(picture.theme), lambda values: gain_share(values, gain))
    if body.density is not None and energy:
        return Colouring(body.density, energy_ramp(picture.theme), lambda values: energy_share(values, energy))
    return None

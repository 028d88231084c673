"""What a mode does: which parts move, how and where to; whether it is rigid motion, bending, twisting or spreading.

Every statement carries its figure (DESIGN §6 "Character"). Without materials one uniform material is assumed, and
shares hold for that; springs, lumped masses, links and ties are then left out.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

from viewer.insight.character_parts import (
    Concentration,
    GroupShare,
    PointMotion,
    SheetMotion,
    concentration,
    group_shares,
    point_motions,
    sheet_motion,
)
from viewer.insight.character_words import MOST, MOVES, sentence_of, suggestion
from viewer.insight.effective_mass import EffectiveMasses
from viewer.insight.facing import FacingPair, FacingSurfaces, facing_surfaces
from viewer.insight.moving_mass import masses_of, moving_mass, weighed_points
from viewer.insight.scale import Scale
from viewer.insight.twisting import LongAxis, long_axis
from viewer.jobs import SILENT, Progress
from viewer.mechanics.energy import Energies
from viewer.model.design import Design
from viewer.model.modes import ModeSet

__all__ = ["Character", "describe", "facing_surfaces", "masses_of"]


@dataclass(frozen=True, eq=False)
class Character:
    """What one mode does.

    mode       number from 1; freq_hz as given; name: the user's, empty when none was given
    held       whether supports hold anything
    masses     effective masses and shares of kinetic energy and rigid motion (a dictionary of figures), None when
               no mass is known
    groups     energy by cell group; springs and lumped masses hold the shares ``springs`` and ``lumped`` by name
    facing     the largest pairs of facing surfaces; long: sections along the long axis, None for a stocky body
    local      how local the mode is; sheets: how sheets move, None for a body of solids
    points     the functional points
    assumed    what was assumed for want of materials, in words; shares hold for that; empty when nothing was
    """

    mode: int
    freq_hz: float
    name: str
    held: bool
    masses: Mapping[str, Any] | None
    groups: tuple[GroupShare, ...]
    springs: Mapping[str, float]
    lumped: Mapping[str, float]
    facing: tuple[FacingPair, ...]
    long: LongAxis | None
    local: Concentration | None
    sheets: SheetMotion | None
    points: tuple[PointMotion, ...]
    assumed: str = ""
    cautions: tuple[str, ...] = ()
    scale: Scale | None = None

    def with_scale(self, scale: Scale | None) -> Character:
        """The same, its real motions at another scale."""
        return replace(self, scale=scale)

    def with_name(self, name: str) -> Character:
        """The same under the user's name."""
        return replace(self, name=name)

    @property
    def spreads(self) -> bool:
        """Whether two facing surfaces move apart and together: what a strut between them can hold."""
        return any(pair.motion >= MOVES and pair.opens >= MOST for pair in self.facing)

    @property
    def suggested_name(self) -> str | None:
        """A name that the figures suggest, None when they suggest none; only ever a suggestion."""
        return suggestion(self._figures())[0]

    @property
    def sentence(self) -> str:
        return sentence_of(self.to_dict())

    def to_dict(self) -> dict[str, Any]:
        facts = self._figures()
        name, reason = suggestion(facts)
        return {**facts, "suggested_name": name, "suggested_because": reason}

    def _figures(self) -> dict[str, Any]:
        real = None if self.scale is None else self.scale.real_per_shape
        return {
            "mode": self.mode,
            "frequency_hz": self.freq_hz,
            "name": self.name or None,
            "held": self.held,
            "assumed": self.assumed or None,
            **{key: None if self.masses is None else self.masses[key] for key in _MASS_KEYS},
            "groups": [group.to_dict() for group in self.groups],
            "springs_strain_share": dict(self.springs),
            "lumped_kinetic_share": dict(self.lumped),
            "facing": [pair.to_dict() for pair in self.facing],
            "long_axis": None if self.long is None else self.long.to_dict(),
            "half_of_kinetic_in_mass_share": None if self.local is None else self.local.half_in,
            "participation": None if self.local is None else self.local.participation,
            "out_of_plane_share": None if self.sheets is None else self.sheets.out_of_plane,
            "flat_sheet": None if self.sheets is None else self.sheets.flat,
            "fields": None if self.sheets is None else self.sheets.fields,
            "points": [point.to_dict(real) for point in self.points],
            "cautions": list(self.cautions),
        }


_MASS_KEYS = (
    "about_m",
    "effective",
    "effective_share",
    "support_share",
    "modal_mass",
    "rigid_share",
    "rigid_by_motion",
    "kinetic_share",
)


def describe(
    design: Design,
    modes: ModeSet,
    number: int,
    energies: Energies | None = None,
    scale: Scale | None = None,
    progress: Progress = SILENT,
    *,
    effective: EffectiveMasses | None = None,
    facing: FacingSurfaces | None = None,
) -> Character:
    """The character of mode ``number`` (from 1).

    energies   of a set that holds the mode, formed here when None
    effective  of a set that holds the mode (:func:`masses_of`), facing (:func:`facing_surfaces`): give both when
               several modes are described, since most of the work is the same for all
    scale      gives motions in m where the real size is known
    Raises ``InputError`` for a mode that is not there. What cannot be known is None, with a caution that says why.
    """
    index = modes.index_of(number, design.name)
    shape = modes.shape(index)
    moving, cautions = moving_mass(design, modes, index, energies, progress)
    cautions = [*modes.cautions, *cautions]
    if effective is None or effective.row(number) is None:
        effective = masses_of(design, modes, progress, indices=[number - 1])
    row = None if effective is None else effective.row(number)
    if effective is not None:
        cautions += effective.cautions
    if facing is None:
        facing = facing_surfaces(design.mesh, progress)
    physics = design.physics
    return Character(
        mode=number,
        freq_hz=float(modes.freq_hz[number - 1]),
        name=design.mode_names.get(number, ""),
        held=bool(physics.supports) or any(spring.other is None for spring in physics.springs),
        masses=None if effective is None or row is None else effective.to_dict(row),
        groups=() if moving is None else group_shares(design.mesh, moving),
        springs={} if moving is None else moving.springs,
        lumped={} if moving is None else moving.lumped_shares,
        facing=facing.pair_motions(shape),
        long=None if moving is None else long_axis(*weighed_points(design, moving, shape)),
        local=None if moving is None else concentration(moving),
        sheets=None if moving is None else sheet_motion(design.mesh, shape, moving.masses),
        points=point_motions(design, shape),
        assumed="" if moving is None else moving.assumed,
        cautions=tuple(dict.fromkeys(cautions)),
        scale=scale,
    )

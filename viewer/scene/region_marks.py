"""What only one of two overlaid designs has: marks with words for it."""

from __future__ import annotations

from collections.abc import Sequence

from viewer.insight.common_support import OneSided
from viewer.scene.figures import GAP, digits
from viewer.scene.picture import RegionMark

NAMED = 4  # regions of both designs, from the heaviest share of a design's mass, that have a label
SAID = "bold outline: in one design only"


def region_marks(regions: Sequence[OneSided], design: str) -> tuple[RegionMark, ...]:
    """The marks of ``design`` among the ``regions`` that either of two designs has alone."""
    named = sorted(regions, key=lambda region: -region.mass_share)[:NAMED]
    found = []
    for region in regions:
        if region.design != design:
            continue
        share = f"{digits(100 * region.mass_share)}{GAP}% of its mass"
        told = any(region is one for one in named)
        title, lines = (f"only in {design}", (region.place, share)) if told else ("", ())
        found.append(RegionMark(title, lines, region.cells))
    return tuple(found)

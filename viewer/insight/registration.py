"""What was found about the place of a test on a mesh, and what it lets the channels see."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.sparse as sp

from viewer.cells.locate import Places
from viewer.errors import RefusedError
from viewer.insight.placement_words import UnitSlip, placement_line
from viewer.insight.placing import FAR
from viewer.model.arrays import Array, frozen
from viewer.model.testset import Placement, TestSet
from viewer.model.written import GAP, digits

LISTED = 12  # placements written out at most
STATED, NAMED, GEOMETRY = "stated placement", "named points", "geometry"


@dataclass(frozen=True, eq=False)
class Alternative:
    """Another placement that fits as well: root mean square distance ``rms``, m; how it differs from the first."""

    placement: Placement
    rms: float
    facts: dict[str, Any]

    @property
    def words(self) -> str:
        return str(self.facts["words"])


@dataclass(frozen=True, eq=False)
class Registration:
    """A test laid onto a mesh.

    how                "stated placement", "named points" or "geometry"
    rms                root mean square distance to the surface of the points that are not far, m
    distances          (p,) m from each point, as placed, to the surface
    places             the element that each point lies in or nearest to
    normal_angles_deg  (c,) between each channel's direction and the surface's normal, 0 … 90; NaN on lines
    far                labels of points farther than ``FAR`` of the part's size from it; their channels are not used
    pair_misses        for named points: label and distance to its place, m
    alternatives       other placements that fit equally well
    free               in words, what can be changed by a few per cent of the part's size without harm to the fit
    unit_slip          proposed, and already part of ``placement``, which is not settled then
    used               (c,) bool: channels that may be compared; none unless ``settled``
    sensing            (c, 3 n_nodes) nodal motion (x, y, z of the first node, …) to motion along each channel
    """

    test: TestSet
    placement: Placement
    how: str
    size: float  # of the part, m
    rms: float
    distances: Array
    places: Places
    normal_angles_deg: Array
    far: tuple[str, ...]
    sensing: sp.csr_array
    used: Array
    pair_misses: tuple[tuple[str, float], ...] = ()
    alternatives: tuple[Alternative, ...] = ()
    free: tuple[str, ...] = ()
    unit_slip: UnitSlip | None = None

    def __post_init__(self) -> None:
        for name in ("distances", "normal_angles_deg", "used"):
            object.__setattr__(self, name, frozen(getattr(self, name), shape=(None,)))

    @property
    def settled(self) -> bool:
        """Whether nothing is left to the user."""
        return not (self.alternatives or self.free or self.unit_slip)

    @property
    def points(self) -> Array:
        """(p, 3) m: the points as placed."""
        return self.placement.points(self.test.points)

    @property
    def directions(self) -> Array:
        """(c, 3) directions of the channels in the mesh's axes."""
        return self.placement.directions(self.test.directions)

    def seen(self, shape: Array) -> Array:
        """(c,) what the channels see of a shape (n_nodes, 3)."""
        return self.sensing @ np.asarray(shape).reshape(-1)

    def lines(self, length_unit: float = 1.0) -> tuple[str, ...]:
        """The dossier's lines that would settle the placement: one for each that fits, the first one first. Its
        shift is in units of ``length_unit`` m."""
        fitting = [self.placement, *(a.placement for a in self.alternatives[:LISTED])]
        return tuple(placement_line(p, length_unit) for p in fitting)

    def require(self, length_unit: float = 1.0) -> Registration:
        """Itself when settled; else ``RefusedError`` that lists what fits and the lines to write."""
        if self.settled:
            return self
        name = f"the place of test '{self.test.name}' on the mesh is not settled"
        if self.unit_slip is not None:
            raise RefusedError(
                name,
                found=f"points {digits(1 / self.unit_slip.factor, 4, trim=True)} times the part's size, "
                f"as of {self.unit_slip.words}",
                do=f"give the test its length_unit, or accept what was found: {self.lines(length_unit)[0]}",
            )
        lines = self.lines(length_unit)
        listed = [f"[1] {lines[0]}"]
        for number, (other, line) in enumerate(zip(self.alternatives, lines[1:], strict=False), start=2):
            listed.append(f"[{number}] {other.words}: {line}")
        hidden = len(self.alternatives) + 1 - len(listed)
        ways = f"{len(self.alternatives) + 1} placements that fit equally well" if self.alternatives else ""
        loose = f"points that can be {' or '.join(self.free)}" if self.free else ""
        raise RefusedError(
            name,
            found=", and ".join(part for part in (ways, loose) if part),
            do="name landmarks (three points or more with their places), or write one of these lines into the test: "
            + "; ".join(listed)
            + (f"; and {hidden} more" if hidden else ""),
        )

    @property
    def sentence(self) -> str:
        return sentence_of(self.to_dict())

    def to_dict(self) -> dict[str, Any]:
        test = self.test
        return {
            "test": test.name,
            "how": self.how,
            "settled": self.settled,
            "points": len(test.points),
            "named_points": len(self.pair_misses),
            "channels": test.n_channels,
            "channels_used": int(self.used.sum()),
            "rms_m": self.rms,
            "largest_distance_m": float(self.distances.max()),
            "part_size_m": self.size,
            "far_limit_m": FAR * self.size,
            "far_points": list(self.far),
            "ways": 1 + len(self.alternatives),
            "rotation": self.placement.rotation.tolist(),
            "shift_m": self.placement.shift.tolist(),
            "scale": self.placement.scale,
            "alternatives": [
                {
                    "rms_m": a.rms,
                    **a.facts,
                    "rotation": a.placement.rotation.tolist(),
                    "shift_m": a.placement.shift.tolist(),
                }
                for a in self.alternatives
            ],
            "free": list(self.free),
            "unit_slip": None if self.unit_slip is None else self.unit_slip.to_dict(),
            "named": [{"point": label, "miss_m": miss} for label, miss in self.pair_misses],
            "point_list": [
                {"point": label, "distance_m": float(d), "far": label in self.far}
                for label, d in zip(test.labels, self.distances, strict=True)
            ],
            "channel_list": [
                {
                    "channel": test.channel_words(c),
                    "used": bool(self.used[c]),
                    "normal_angle_deg": None if np.isnan(angle) else float(angle),
                }
                for c, angle in enumerate(self.normal_angles_deg)
            ],
        }


def sentence_of(facts: dict[str, Any]) -> str:
    """The plain sentence made of the figures of ``Registration.to_dict``."""
    who = f"The {facts['points']} points of test {facts['test']}"
    if facts["unit_slip"]:
        slip = facts["unit_slip"]
        large = slip["times_too_large"]
        times = f"{digits(large, 4, trim=True)} times too large" if large > 1 else ""
        times = times or f"{digits(slip['factor'], 4, trim=True)} times too small"
        return f"{who} seem to be {times} for the part ({slip['words']}); nothing is compared until that is settled."
    if not facts["settled"]:
        words = f"{who} can be laid onto the part "
        words += f"in {facts['ways']} ways that fit equally well" if facts["ways"] > 1 else "in one way only roughly"
        if facts["alternatives"]:
            listed = [a["words"] for a in facts["alternatives"][:3]]
            words += f" (the others: {', '.join(listed)}{', …' if facts['ways'] > 4 else ''})"
        if facts["free"]:
            words += f"; they can be {' or '.join(facts['free'])} without fitting worse"
        return words + "; nothing is compared until one of them is chosen."
    how = {
        STATED: "where the dossier places them",
        NAMED: f"placed by {facts['named_points']} named points and the surface",
        GEOMETRY: "placed by their shape alone, and no other placement fits as well",
    }[facts["how"]]
    words = f"{who} lie on the part to within {_millimetres(facts['rms_m'])} (root mean square), {how}"
    if facts["far_points"]:
        listed, many = facts["far_points"], len(facts["far_points"]) > 1
        named = f"points {', '.join(listed[:-1])} and {listed[-1]}" if many else f"point {listed[0]}"
        words += f"; {named} {'are' if many else 'is'} more than {_millimetres(facts['far_limit_m'])} away from it "
        words += "and left out"
    return words + "."


def _millimetres(value: float) -> str:
    return f"{digits(1000 * value)}{GAP}mm"

"""What a strut trial answers: frozen findings, their figures and one sentence. Every figure of a sentence is one of
``to_dict()``, rounded."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from viewer.insight.facing_points import Candidates, Footprint
from viewer.model.arrays import frozen_map
from viewer.model.design import Selector, Strut
from viewer.model.mesh import Mesh

MIXED = 0.5  # share of a mode's motion below which no single mode carries it on
HOLDS = 0.8  # share of its motion below which the sentence says where the rest went
WORTH = 0.01  # relative rise below which a strut does nothing worth while
ESTIMATE = "An estimate: joints are softer than this."


@dataclass(frozen=True)
class Followed:
    """Where the motion of one mode is found after a change.

    number, freq_hz, share     of the new mode that holds most of it: its number from 1, and the share it holds (MAC
                               weighted by mass)
    rest_number, rest_freq_hz, rest_share   of the new mode that holds most of what is left
    lowest_freq_hz             of the lowest new mode
    """

    number: int
    freq_hz: float
    share: float
    rest_number: int
    rest_freq_hz: float
    rest_share: float
    lowest_freq_hz: float

    @property
    def mixed(self) -> bool:
        return self.share < MIXED

    def to_dict(self) -> dict[str, Any]:
        return {
            "frequency_hz": self.freq_hz,
            "mode": self.number,
            "share": self.share,
            "mixed": self.mixed,
            "rest": {"mode": self.rest_number, "frequency_hz": self.rest_freq_hz, "share": self.rest_share},
            "lowest_frequency_hz": self.lowest_freq_hz,
        }


@dataclass(frozen=True, eq=False)
class TrialStrut:
    """One strut between the footprints ``first`` and ``other``.

    stiffness   N/m, ∞ for a rigid one; facing: whether the line leaves both surfaces outward
    predicted   by the secular equation; rigid the same with a rigid strut; bound with the known modes alone
    resolved    by a new solution of the design with the strut, None when that was not done
    """

    first: Footprint
    other: Footprint
    stiffness: float
    facing: bool
    predicted: Followed
    rigid: Followed
    bound: Followed
    resolved: Followed | None = None

    @property
    def length(self) -> float:
        """m, between the centres."""
        return float(np.linalg.norm(self.other.centre - self.first.centre))

    def strut(self, name: str, mesh: Mesh) -> Strut:
        """The same as an entry of a design. Not for a rigid one."""
        first, other = (Selector(nodes=mesh.node_ids[each.nodes]) for each in (self.first, self.other))
        return Strut(name, first, other, self.stiffness)

    def to_dict(self) -> dict[str, Any]:
        return {
            "from": _place(self.first),
            "to": _place(self.other),
            "length_m": self.length,
            "stiffness_n_per_m": self.stiffness if np.isfinite(self.stiffness) else None,
            "facing": self.facing,
            "predicted": self.predicted.to_dict(),
            "rigid": self.rigid.to_dict(),
            "bound": self.bound.to_dict(),
            "resolved": None if self.resolved is None else self.resolved.to_dict(),
        }


@dataclass(frozen=True, eq=False)
class StrutTrial:
    """The best struts for one mode of a design.

    mode, freq_hz    number from 1, as given
    model_freq_hz    the mode's frequency by the design's own model, when re-solved; of imported modes it differs
    struts           best first: those solved again by their re-solved frequency, then the others by the predicted one
    residual         whether the modes left out were accounted for; if not, every prediction is an upper bound
    stiffness_words  where the stiffness comes from; rod: diameter m, Young's modulus Pa, mass kg/m, when it is one
    weighed          pairs for which the modes left out were accounted for; known: modes the prediction rests on
    """

    mode: int
    freq_hz: float
    model_freq_hz: float | None
    struts: tuple[TrialStrut, ...]
    candidates: Candidates
    residual: bool
    stiffness_words: str
    rod: Mapping[str, float]
    weighed: int
    known: int
    cautions: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        object.__setattr__(self, "rod", frozen_map(self.rod))

    @property
    def sentence(self) -> str:
        return sentence_of(self.to_dict())

    def to_dict(self) -> dict[str, Any]:
        left_out = self.candidates.left_out
        return {
            "mode": self.mode,
            "frequency_hz": self.freq_hz,
            "model_frequency_hz": self.model_freq_hz,
            "residual_flexibility": self.residual,
            "stiffness_from": self.stiffness_words,
            "rod": dict(self.rod),
            "footprints": len(self.candidates.footprints),
            "footprint_radius_m": self.candidates.radius,
            "pairs": len(self.candidates.pairs),
            "pairs_weighed": self.weighed,
            "modes_known": self.known,
            "pairs_facing": int(self.candidates.facing.sum()),
            "left_out": dict(left_out),
            "pairs_left_out": sum(left_out.values()),
            "struts": [{"rank": rank, **each.to_dict()} for rank, each in enumerate(self.struts, 1)],
            "cautions": list(self.cautions),
        }


def _place(footprint: Footprint) -> dict[str, Any]:
    numbers = ", ".join(_coordinate(value) for value in footprint.centre)
    return {
        "words": f"{footprint.group} at ({numbers}) mm" if footprint.group else f"({numbers}) mm",
        "centre_m": footprint.centre.tolist(),
        "group": footprint.group or None,
        "nodes": len(footprint.nodes),
    }


def _coordinate(metres: float) -> str:
    text = f"{1e3 * metres:.0f}" if abs(metres) >= 0.01 else f"{1e3 * metres:.1f}"
    return "0" if float(text) == 0 else text.replace("-", "−")


def sentence_of(facts: Mapping[str, Any]) -> str:
    """The sentence of ``StrutTrial.to_dict()``, made of its figures alone."""
    head, before = f"Mode {facts['mode']}: ", facts["frequency_hz"]
    if not facts["struts"]:
        return head + (
            f"no two places of the part see each other along a clear line, so that no strut was tried at its "
            f"{_hertz(before)} Hz ({facts['pairs_left_out']} lines were left out)."
        )
    best = facts["struts"][0]
    final = best["resolved"] or best["predicted"]
    own = facts["model_frequency_hz"] if best["resolved"] and facts["model_frequency_hz"] else before
    if final["frequency_hz"] < (1 + WORTH) * own and not final["mixed"]:
        return head + (
            f"no strut within the part raises it noticeably; the best of {facts['pairs']} tried takes it from "
            f"{_hertz(own)} to {_hertz(final['frequency_hz'])} Hz."
        )
    most = "" if facts["residual_flexibility"] else "at most "
    parts = [
        f"{_strut_words(best)} between {best['from']['words']} and {best['to']['words']} is predicted to raise it "
        f"from {_hertz(before)} to {most}{_hertz(best['predicted']['frequency_hz'])} Hz"
    ]
    if best["resolved"]:
        solved = f"re-solved {_hertz(best['resolved']['frequency_hz'])} Hz"
        if facts["model_frequency_hz"] and _hertz(facts["model_frequency_hz"]) != _hertz(before):
            solved += f", from {_hertz(facts['model_frequency_hz'])} Hz by the model itself"
        parts.append(solved)
    return head + ". ".join(["; ".join(parts), *_order_words(facts["mode"], final)]) + f". {ESTIMATE}"


def _order_words(mode: int, final: Mapping[str, Any]) -> list[str]:
    """What became of the mode's place in the order, and of its motion."""
    words, rest = [], final["rest"]
    if final["mixed"]:
        words.append(
            f"No single mode carries its motion on: the closest, at {_hertz(final['frequency_hz'])} Hz, holds "
            f"{final['share']:.0%} of it, another at {_hertz(rest['frequency_hz'])} Hz {rest['share']:.0%}"
        )
    elif final["share"] < HOLDS:
        words.append(
            f"It then holds {final['share']:.0%} of its former motion, another mode {rest['share']:.0%}, at "
            f"{_hertz(rest['frequency_hz'])} Hz"
        )
    if final["mode"] != mode:
        words.append(f"It is then mode {final['mode']}")
        if mode == 1:
            words[-1] += f", and another mode, at {_hertz(final['lowest_frequency_hz'])} Hz, is the lowest"
    return words


def _strut_words(best: Mapping[str, Any]) -> str:
    stiffness = best["stiffness_n_per_m"]
    if stiffness is None:
        return "a rigid strut"
    value, unit = (stiffness / 1e6, "kN/mm") if stiffness >= 1e6 else (stiffness / 1e3, "N/mm")
    return f"a strut of {value:.2g} {unit}" if value < 100 else f"a strut of {value:.0f} {unit}"


def _hertz(value: float) -> str:
    return f"{value:.0f}" if value >= 999.5 else f"{value:.1f}" if value >= 9.95 else f"{value:.2f}"

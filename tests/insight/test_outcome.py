"""What became of a mode in words: every number one of the figures, no powers of ten, hinges matched by place."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.meshes import plate_mesh
from tests.scene.findings import finding, hinge
from tests.sentences import unfounded
from viewer.insight.outcome import HingeChange, Outcome, hinge_changes
from viewer.insight.pairing import ModePair

PAIR = ModePair("paired", 1, 3, 23.25, 133.6, 0.461)


def outcome(pair, hinges=None, names=("twists", ""), characters=("", "")):
    return Outcome("plain", "strapped", pair, names, characters, hinges)


CASES = {
    "stiffer": (outcome(PAIR), "becomes mode 3 of strapped at 133.6 Hz (+470 %), a changed shape (agreement 46%)"),
    "as it was": (outcome(replace(PAIR, second_hz=23.2501, mac=0.998)), "(±0 %), the same shape (agreement 100%)"),
    "softer": (outcome(replace(PAIR, second_hz=20.0, mac=0.9)), "(−14 %), much the same shape"),
    "far up": (outcome(replace(PAIR, second_hz=123456.7)), "at 123 457 Hz (+530 000 %)"),
    "rigid": (outcome(replace(PAIR, first_hz=0.0, second_hz=0.0)), "0 Hz, becomes mode 3 of strapped at 0 Hz, a"),
    "group": (
        outcome(replace(PAIR, subspace=0.987, group=((1, 2), (3, 4)))),
        "the same shape (agreement 99%, modes 1 and 2 against 3 and 4 as a group)",
    ),
    "vanished": (
        outcome(ModePair("vanished", 5, None, 258.4, None, 0.07)),
        "Mode 5 of plain (twists), 258.4 Hz, has no counterpart among the modes of strapped (best agreement 7%)",
    ),
    "new": (outcome(ModePair("new", None, 2, None, 99.0, 0.2)), "Mode 2 of strapped, 99.0 Hz, is new"),
    "beyond": (outcome(ModePair("beyond", None, 6, None, 99.0, 0.2)), "its counterpart in plain may lie beyond them"),
    "merged": (outcome(ModePair("merged", 2, None, 9.5, None, 0.36, into=1)), "is taken up by mode 1 of strapped"),
    "hinge weaker": (
        outcome(PAIR, (HingeChange("the cable window", 1, 2, 0.5, 0.1),)),
        "hinge 1 at the cable window lost 80% of its share of the energy (50% to 10%)",
    ),
    "hinge stronger": (outcome(PAIR, (HingeChange("", 1, 1, 0.2, 0.31),)), "hinge 1 gained 55% of its share"),
    "hinge stays": (outcome(PAIR, (HingeChange("", 1, 1, 0.50, 0.52),)), "hinge 1 stays"),
    "hinge gone": (outcome(PAIR, (HingeChange("", 2, None, 0.333, None),)), "which held 33% of the energy, is gone"),
    "hinge new": (outcome(PAIR, (HingeChange("the root", None, 1, None, 0.28),)), "a new hinge at the root with 28%"),
    "no energies": (outcome(PAIR, (HingeChange("", 1, None, None, None),)), "; hinge 1 is gone"),
    "character": (outcome(PAIR, None, ("", ""), ("arm sways", "arm nods")), "what was “arm sways” is now “arm nods”"),
}  # fmt: skip


@pytest.mark.parametrize("case", CASES)
def test_sentence(case):
    found, words = CASES[case]
    sentence = found.sentence.replace("\u00a0", " ").replace("\u202f", " ")
    assert words in sentence, sentence
    assert not unfounded(found.sentence, found.to_dict())
    assert "e+" not in sentence and "None" not in sentence and sentence.endswith(".") and sentence.count("..") == 0


def test_hinges_are_matched_by_place_and_direction():
    mesh = plate_mesh("quad4", (2, 1), (0.4, 0.1))

    def at(number, x, way=(0, 1, 0)):
        return hinge(mesh, number=number, position=np.array([x, 0, 0]), direction=np.array(way, float))

    first = at(1, 0.0), at(2, 0.5), at(3, 1.0)
    second = at(1, 0.51), at(2, 0.02, (0, -1, 0)), at(3, 1.0, (1, 0, 0)), at(4, 0.04)
    changes = hinge_changes(finding(mesh, *first), finding(mesh, *second), 0.05)
    assert [(c.first, c.second) for c in changes] == [(1, 2), (2, 1), (3, None), (None, 3), (None, 4)]

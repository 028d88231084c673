"""The sentences that stand beside the README's pictures are those that the samples give.

``<!-- says: SAMPLE DESIGN MODE QUESTION -->`` in README.md is followed, to the end of its cell or line, by the
sentence; QUESTION is character, hinges, gain or pair. With a hammer test in place of DESIGN it is faults; or, with
all that is proposed accepted, accepted, or measured for one of its modes.
"""

from __future__ import annotations

import re
from dataclasses import replace
from functools import cache
from pathlib import Path

import pytest

from viewer.insight.pair_words import pair_sentence
from viewer.workspace import Study, Workspace
from viewer.workspace.comparison import compare
from viewer.workspace.testing import TestStudy, lay_beside, with_accepted

ROOT = Path(__file__).resolve().parents[2]
_SAID = re.compile(r"<!-- says: (\w+) (\w+) (\d+) (\w+) -->\s*(.*?)\s*(?:<br>|\||$)", re.M)
SAID = _SAID.findall((ROOT / "README.md").read_text(encoding="utf-8"))


@cache
def opened(sample: str):
    return Workspace(cache=None).open(ROOT / "sample_meshes" / sample)


@cache
def study(sample: str, design: str) -> Study:
    return opened(sample).study(design)


@cache
def compared(sample: str):
    first, second = opened(sample).names
    return compare(study(sample, first), study(sample, second), opened(sample).stated_pairs(first, second))


@cache
def hammer_of(sample: str, name: str) -> tuple[TestStudy, TestStudy]:
    """The test as it is, and with everything accepted that is proposed."""
    raw = opened(sample).test(name)
    accepted = with_accepted(raw, [p.number for p in raw.faults().proposals])
    plan = replace(raw.plan, corrections=accepted)
    return raw, lay_beside(raw.study, plan, raw.recorded, raw.length_unit)


def sentence(sample: str, name: str, number: int, question: str) -> str:
    if question == "pair":
        (found,) = [o for o in compared(sample).outcomes if o.pair.first == number]
        return found.sentence
    if question == "faults":
        return hammer_of(sample, name)[0].faults().sentence
    if question == "accepted":
        return hammer_of(sample, name)[1].correlation().sentence
    if question == "measured":
        (pair,) = [p for p in hammer_of(sample, name)[1].correlation().paired if p.test == number]
        return pair_sentence(pair.to_dict())
    return getattr(study(sample, name), question)(number - 1).sentence


def test_each_sample_is_there():
    assert {sample for sample, *_ in SAID} == {"boom", "fork", "trough"}


@pytest.mark.parametrize(("sample", "design", "mode", "question", "said"), SAID)
def test_the_readme_says_what_the_sample_gives(sample, design, mode, question, said):
    assert " ".join(said.split()) == " ".join(sentence(sample, design, int(mode), question).split())

"""The sentences that stand beside the README's pictures are those that the samples give.

``<!-- says: SAMPLE DESIGN MODE QUESTION -->`` in README.md is followed, to the end of its cell or line, by the
sentence; QUESTION is character, hinges, gain or pair.
"""

from __future__ import annotations

import re
from functools import cache
from pathlib import Path

import pytest

from viewer.workspace import Study, Workspace
from viewer.workspace.comparison import compare

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


def test_each_sample_is_there():
    assert {sample for sample, *_ in SAID} == {"boom", "fork", "trough"}


@pytest.mark.parametrize(("sample", "design", "mode", "question", "said"), SAID)
def test_the_readme_says_what_the_sample_gives(sample, design, mode, question, said):
    if question == "pair":
        (found,) = [o for o in compared(sample).outcomes if o.pair.first == int(mode)]
    else:
        found = getattr(study(sample, design), question)(int(mode) - 1)
    assert " ".join(said.split()) == " ".join(found.sentence.split())

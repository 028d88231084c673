"""Bad files of every format, each with the class of its fault: what the reader must survive and say.

A case writes its files into an empty folder and says what is to happen: an error whose words match ``says``, or,
where ``may`` allows it, a reading that equals that of the whole file (``"equal"``) or of a part of it that nothing
can tell from a whole one (``"part"``). Cases run in :mod:`tests.loaders.corpus_child`, never in the test process.
"""

from __future__ import annotations

import shutil
from collections import Counter
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path

from tests.loaders import corpus_arrays, corpus_cuts, corpus_text, corpus_vtu

# Classes of fault. The smallest number of cases that each must have stands in test_corpus.py.
CUT = "cut short"
EMPTY = "empty, folder, none"
SUFFIX = "content of another format"
NUMBER = "not finite or no number"
INDEX = "index outside"
SHAPE = "offsets, sizes, types that do not fit"
COUNT = "count that the file cannot hold"
BOMB = "inflation and entity bombs"
REFERENCE = "reference outside, missing, in a circle"
IDS = "ids"
MODES = "modes"
TEXT = "text that is another"
MEANING = "legal but not understood"


@dataclass(frozen=True)
class Case:
    """``make(folder)`` returns the file to read; ``whole``, if it wrote one, is the file without the fault."""

    name: str
    fault: str
    make: Callable[[Path], Path]
    says: str = ""
    may: str = ""

    @staticmethod
    def whole(folder: Path) -> Path | None:
        return next((path for path in sorted(folder.glob("whole/*")) if path.name.startswith("a.")), None)


def _vtu() -> Iterator[Case]:
    faults = corpus_vtu.FAULTS
    for name, (old, new, says) in corpus_vtu.BAD_VTU.items():

        def make(folder: Path, old: str = old, new: str = new) -> Path:
            assert old in corpus_vtu.VTU
            _text(folder / "whole" / "a.vtu", corpus_vtu.VTU)
            return _text(folder / "a.vtu", corpus_vtu.VTU.replace(old, new, 1))

        yield Case(f"vtu: {name}", globals()[faults[name]], make, says)
    for name, fault, make, says in corpus_vtu.MADE:
        yield Case(f"vtu: {name}", globals()[fault], make, says)


def _others() -> Iterator[Case]:
    for module in (corpus_arrays, corpus_text, corpus_cuts):
        for name, fault, make, says, *more in module.made():
            yield Case(name, globals()[fault], make, says, *more)


def _door() -> Iterator[Case]:
    suffixes = (*corpus_cuts.SUFFIXES, ".exo", ".cgns", ".mesh")
    for suffix in suffixes:
        yield Case(f"empty{suffix}", EMPTY, lambda f, s=suffix: _bytes(f / f"a{s}", b""), "is empty")
        yield Case(f"none{suffix}", EMPTY, lambda f, s=suffix: f / f"a{s}", "there is no such file")
        yield Case(f"folder{suffix}", EMPTY, lambda f, s=suffix: _folder(f / f"a{s}"), "is a folder")
        yield Case(f"zeros{suffix}", SUFFIX, lambda f, s=suffix: _bytes(f / f"a{s}", bytes(5000)))
    yield Case("no suffix", SUFFIX, lambda f: _text(f / "mesh", "x"), "unknown format; found: no suffix")
    yield Case("unknown suffix", SUFFIX, lambda f: _text(f / "a.qqq", "x"), r"unknown format; found: \.qqq.*\.vtu")
    for real in corpus_cuts.WRITTEN:
        for claimed in suffixes:
            if claimed != real:

                def make(folder: Path, real: str = real, claimed: str = claimed) -> Path:
                    whole = corpus_cuts.write(folder / "whole", real)
                    shutil.copy(whole, folder / f"a{claimed}")
                    return folder / f"a{claimed}"

                yield Case(f"{real} called {claimed}", SUFFIX, make)


def cases() -> list[Case]:
    """All of them; names are unique."""
    found = [*_door(), *_vtu(), *_others()]
    twice = [name for name, count in Counter(case.name for case in found).items() if count > 1]
    assert not twice, twice
    return found


def _text(path: Path, text: str) -> Path:
    return _bytes(path, text.encode())


def _bytes(path: Path, data: bytes) -> Path:
    path.parent.mkdir(exist_ok=True)
    path.write_bytes(data)
    return path


def _folder(path: Path) -> Path:
    path.mkdir()
    return path

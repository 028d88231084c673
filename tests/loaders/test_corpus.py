"""Every bad file ends in one clear error or a right reading: no crash, no hang, no garbage, nothing left behind.

The cases run in one child process with short limits, started again when it dies (which fails the case).

========================================  =====
class of fault                            cases
========================================  =====
cut short                                   157
content of another format                   133
offsets, sizes, types that do not fit        61
empty, folder, none                          57
index outside                                35
modes                                        34
not finite or no number                      26
reference outside, missing, in a circle      25
text that is another                         23
legal but not understood                     23
count that the file cannot hold              21
ids                                          17
inflation and entity bombs                   10
========================================  =====

The test below counts; more may come, fewer fail.
"""

import json
import os
import queue
import re
import subprocess
import sys
import threading
from collections import Counter
from pathlib import Path

import pytest

from tests.loaders.corpus import Case, cases
from viewer.loaders import write_interchange

CASES = cases()
_SECONDS = 60.0
_MEMORY = 1_500_000_000
LIBRARY = (".vtk", ".vtp", ".msh", ".med", ".mesh")


class Child:
    """The process that reads; restarted after a death or a hang."""

    def __init__(self):
        self.process = None

    def ask(self, case: Case, folder: Path) -> dict:
        if self.process is None or self.process.poll() is not None:
            self.start()
        self.process.stdin.write(json.dumps({"case": case.name, "folder": str(folder)}) + "\n")
        self.process.stdin.flush()
        try:
            line = self.answers.get(timeout=_SECONDS)
        except queue.Empty:
            self.stop()
            pytest.fail(f"{case.name}: no answer in {_SECONDS:.0f} s")
        if line is None:
            code = self.process.wait()
            self.stop()
            pytest.fail(f"{case.name}: the process died, exit code {code}")
        return json.loads(line)

    def start(self):
        self.process = subprocess.Popen(
            [sys.executable, str(Path(__file__).with_name("corpus_child.py"))],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=subprocess.DEVNULL,
            text=True,
            encoding="utf-8",
            env={**os.environ, "OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1"},
        )
        self.answers: queue.Queue = queue.Queue()
        threading.Thread(target=self._listen, args=(self.process.stdout, self.answers), daemon=True).start()

    @staticmethod
    def _listen(stream, answers):
        for line in stream:
            answers.put(line)
        answers.put(None)

    def stop(self):
        if self.process is not None:
            self.process.kill()
            self.process.wait()
            self.process.stdin.close()
            self.process = None


@pytest.fixture(scope="module")
def child():
    child = Child()
    yield child
    child.stop()


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)
def test_bad_file(child, tmp_path, case):
    answer = child.ask(case, tmp_path)
    assert "crash" not in answer, answer
    assert answer["left"] == [], "reading writes nothing"
    assert answer.get("peak", 0) < _MEMORY
    if "read" in answer:
        assert answer["read"] == case.may, answer
        return
    text = answer["error"]
    assert re.search(case.says, text), text
    assert tmp_path.name in text, "names the file"
    assert "Traceback" not in text
    assert "\n" not in text
    assert len(text) < 1000
    # where a library reads, its own words may be all there is to say
    assert Path(text.split(":", 1)[0].split(",", 1)[0]).suffix in LIBRARY or "cannot be read; found" not in text, text


def test_counts_by_class_of_fault():
    """The table at the top of this file is true."""
    told = {name.strip(): int(count) for name, count in re.findall(r"^(\w.*?\S)  +(\d+)$", __doc__, re.M)}
    counts = Counter(case.fault for case in CASES)
    assert set(told) == set(counts)
    assert all(counts[fault] >= told[fault] for fault in counts), counts
    assert sum(counts.values()) >= 150


@pytest.mark.parametrize(
    "name",
    [
        "vtu: index 2**40",
        ".npz: pickle",
        ".xdmf: HDF5 anywhere",
        ".inp: include in a circle",
        ".ply: points 2e9 ",
        ".vtkhdf: 2e9 steps",
    ],
)
def test_from_the_command_line(tmp_path, name):
    """Exit code 1, one line of words, no traceback, nothing written."""
    case = next(case for case in CASES if case.name == name)
    path = case.make(tmp_path)
    before = sorted(tmp_path.rglob("*"))
    modes = [str(path)] if path.suffix == ".vtkhdf" else []
    done = subprocess.run(
        [sys.executable, "-m", "viewer", "check", str(path), *modes],
        cwd=Path(__file__).parents[2],
        capture_output=True,
        text=True,
        timeout=300,
    )
    said = " ".join((done.stdout + done.stderr).split())
    assert done.returncode == 1, said
    assert "Traceback" not in said
    assert re.search(case.says, said.replace("- ", "-")), said
    assert sorted(tmp_path.rglob("*")) == before


def test_a_good_file_passes_through_the_same_door(tmp_path, mesh, modes):
    """The child is no door that refuses everything."""
    from tests.loaders.corpus_child import _read

    path = write_interchange(tmp_path / "a.vtu", mesh, modes)
    assert _read(path, path, "equal") == {"read": "equal"}

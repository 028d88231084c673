"""Hammer tests in universal files, with points in systems of their own and two runs in one. See :mod:`harness`."""

import tempfile
from pathlib import Path

from harness import fuzz, instrumented, read_hammer_test, small_tests


def write(place, data):
    (place / "input.unv").write_bytes(data)
    return place / "input.unv"


def seeds(folder):
    import numpy as np

    from viewer.loaders import write_test

    for test in small_tests():
        half = np.sqrt(0.5)
        oblique = test.with_(directions=[[1, 0, 0], [half, half, 0], [-half, half, 0]])
        for each in (test, oblique):
            data = write_test(folder / "input.unv", each).read_bytes()
            yield data
            yield data + data[data.index(b"    -1\n    55") :]  # every mode once more: a second run


if __name__ == "__main__":
    instrumented()
    with tempfile.TemporaryDirectory() as folder:
        start = list(seeds(Path(folder)))
    fuzz(read_hammer_test, write, start)
